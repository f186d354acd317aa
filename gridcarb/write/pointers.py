"""Which attributes name other variables, and how the names stand in them (CF 1.11, appendix A; UGRID 1.0)."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping
from typing import Any

Reader = Callable[[str], list[str]]


def _after_colons(text: str) -> list[str]:
    return re.findall(r":\s*(\S+)", text)


def _before_and_between_colons(text: str) -> list[str]:
    return text.replace(":", " ").split()


_READERS: dict[str, Reader] = {
    "bounds": str.split, "climatology": str.split, "formula_terms": _after_colons, "cell_measures": _after_colons,
    "grid_mapping": _before_and_between_colons, "mesh": str.split, "location_index_set": str.split,
}
_POSITIONS = ("node_coordinates", "edge_coordinates", "face_coordinates", "volume_coordinates")
"""Attributes of a mesh topology that name coordinates, which fields at such places list as their own."""


def names_in(key: str, value: object) -> list[str]:
    """The variables that the attribute `key` names; none for an attribute that names no variables."""
    reader = str.split if key in _POSITIONS or key.endswith("_connectivity") else _READERS.get(key)
    return reader(str(value)) if reader else []


def pointed_at(attributes: Iterable[Mapping[Any, object]]) -> set[str]:
    """The variables that attributes such as `bounds` and `formula_terms` name."""
    return {word for attrs in attributes for key, value in attrs.items() for word in names_in(str(key), value)}


def helpers(attributes: Iterable[Mapping[Any, object]]) -> set[str]:
    """The same without the positions of a mesh: what is named by others only and is no coordinate of a field itself."""
    return pointed_at({key: value for key, value in attrs.items() if key not in _POSITIONS} for attrs in attributes)
