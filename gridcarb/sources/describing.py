"""What travels with the fields because it describes their grid: axes, bounds, formula terms, meshes, measures."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from gridcarb.sources.collection import ArraySource
from gridcarb.sources.coordinates import carried
from gridcarb.sources.headers import Header
from gridcarb.sources.parts import Part, array_of, joined_times

_INLINE = 100_000
"""Coordinates up to so many values travel inside the collection; larger ones are read from their file when needed."""


def names_kept(part: Part) -> list[str]:
    """Names of what describes the grid; of what changes with time only that which all files hold."""
    names = carried(part.headers[0], part.variable, part.axes)
    joined = joined_times(part)
    return [
        name for name in names
        if not _changes(part, name) or name in joined or _everywhere(name, part.headers)
    ]


def _changes(part: Part, name: str) -> bool:
    return part.axes.time in part.headers[0].heads[name].dims or name in part.spread


def _everywhere(name: str, headers: Sequence[Header]) -> bool:
    """Whether all files hold a variable, in the same units."""
    heads = [header.heads.get(name) for header in headers]
    return all(head and head.attrs.get("units") == (heads[0] and heads[0].attrs.get("units")) for head in heads)


def coordinates_of(part: Part, names: Sequence[str]) -> dict[str, ArraySource]:
    """The variables `names` of the files of `part`, small ones with their values."""
    first, joined, found = part.headers[0], joined_times(part), {}
    own = first.heads[part.variable].dims
    for name in names:
        head = first.heads[name]
        edges = [dim for dim in head.dims if dim not in own and dim not in part.axes.order]
        source = array_of(part, name, (*part.axes.order, *edges), names)
        if name in joined:
            values, units = joined[name]
            attrs = {**source.attrs, "units": units.units} if "units" in source.attrs else source.attrs
            found[name] = replace(source, dtype=str(values.dtype), values=values, attrs=attrs)
        else:
            values = _few(first, name, source)
            found[name] = replace(source, dtype=source.dtype if values is None else str(values.dtype), values=values)
    return found


def _few(header: Header, name: str, source: ArraySource) -> Any:
    """Values that are few enough to travel, in canonical order; None: they are many, or change with time."""
    values = header.whole(name)
    if values is None or source.time_axis is not None or math.prod(source.shape) > _INLINE:
        return None
    kept = sorted(source.file_axes)
    values = values[tuple(slice(None) if axis in kept else 0 for axis in range(source.file_rank))]
    return values.transpose([kept.index(axis) for axis in source.file_axes])
