"""Every key a recipe may hold, read off the settings classes: for the terminal, the docs and the faults."""

from __future__ import annotations

import types
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, Literal, Union, get_args, get_origin

from pydantic.fields import FieldInfo

from gridcarb.figures import FIGURES
from gridcarb.figures.settings import FigureSettings
from gridcarb.recipe.model import Recipe
from gridcarb.recipe.text import KeyPath
from gridcarb.settings import Settings

WORDS: dict[object, str] = {str: "text", int: "whole number", float: "number", bool: "true or false", type(None): ""}


@dataclass(frozen=True)
class Row:
    """One key: its dotted path, the kind of value, the default as it would be written ('' if none), what it means."""

    key: str
    type: str
    default: str
    description: str
    required: bool


def reference() -> Iterator[Row]:
    """All keys in the order of a recipe. Keys of a figure of one kind begin with ``figures[kind].``"""
    yield from _rows(Recipe, "")


def section_at(path: KeyPath, data: object) -> type[Settings] | None:
    """The settings class that says which keys are allowed at `path` of `data`; None if nothing does."""
    section: type[Settings] | None = Recipe
    for part in path:
        data = _step(data, part)
        if isinstance(part, str):
            field = section.model_fields.get(part) if section else None
            section = section_of(field.annotation) if field else None
        if section is FigureSettings and isinstance(data, Mapping):
            kind = FIGURES.get(str(data.get("kind")))
            section = kind.settings if kind else FigureSettings
    return section


def field_at(path: KeyPath, data: object) -> tuple[str, FieldInfo] | None:
    """Name and declaration of the key at `path`; of the list or mapping if the path leads into one."""
    for length in range(len(path), 0, -1):
        name = path[length - 1]
        section = section_at(path[: length - 1], data) if isinstance(name, str) else None
        if section and name in section.model_fields:
            return str(name), section.model_fields[str(name)]
    return None


def section_of(annotation: object) -> type[Settings] | None:
    """The settings class inside an annotation, if there is one."""
    if isinstance(annotation, type) and issubclass(annotation, Settings):
        return annotation
    inner = (section_of(part) for part in get_args(annotation))
    return next((section for section in inner if section), None)


def choices(annotation: object) -> list[str]:
    """The words an annotation lists as literals."""
    if get_origin(annotation) is Literal:
        return [str(word) for word in get_args(annotation)]
    return [word for part in get_args(annotation) for word in choices(part)]


def _step(data: object, part: str | int) -> object:
    try:
        return data[part]  # type: ignore[index]
    except (TypeError, KeyError, IndexError):
        return None


def _rows(section: type[Settings], prefix: str) -> Iterator[Row]:
    for name, field in section.model_fields.items():
        inner = section_of(field.annotation)
        if inner is FigureSettings:
            yield _row(prefix + name, "list of sections", field)
            for kind, entry in FIGURES.items():
                yield from _rows(entry.settings, f"{prefix}{name}[{kind}].")
        elif inner:
            yield _row(prefix + name, "section", field, _first_sentence(inner))
            yield from _rows(inner, f"{prefix}{name}.")
        else:
            yield _row(prefix + name, _type(field.annotation), field)


def _row(key: str, words: str, field: FieldInfo, description: str = "") -> Row:
    default = "" if words == "section" or field.is_required() else _written(field.get_default(call_default_factory=True))
    return Row(key, words, default, description or field.description or "", field.is_required())


def _first_sentence(section: type[Settings]) -> str:
    return (section.__doc__ or "").strip().split("\n")[0].rstrip(".")


def _written(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, Mapping):
        return "{}" if not value else str(dict(value))
    return str(list(value)) if isinstance(value, tuple) else str(value)


def _type(annotation: Any) -> str:
    if annotation in WORDS:
        return WORDS[annotation]
    origin, parts = get_origin(annotation), get_args(annotation)
    if origin is Literal:
        return " | ".join(str(word) for word in parts)
    if origin in {Union, types.UnionType}:
        return " | ".join(word for word in dict.fromkeys(_type(part) for part in parts) if word)
    if origin is tuple:
        return _several([part for part in parts if part is not Ellipsis], fixed=Ellipsis not in parts)
    if origin is dict:
        return f"mapping of {_type(parts[0])} to {_type(parts[1])}"
    return _type(parts[0]) if parts else "value"  # Annotated: what is annotated


def _several(parts: list[Any], *, fixed: bool) -> str:
    words = " | ".join(dict.fromkeys(_type(part) for part in parts))
    return f"list of {len(parts)} x {words}" if fixed else f"list of {words}"
