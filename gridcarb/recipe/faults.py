"""The faults of a recipe in plain English: every one, with its line."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from pydantic import ValidationError
from pydantic_core import ErrorDetails

from gridcarb.errors import Fault, GridcarbError, did_you_mean, near_words
from gridcarb.recipe.reference import choices, field_at, reference, section_at, section_of
from gridcarb.recipe.text import KeyPath, Parsed, dotted

# The kind of value asked for, by the word pydantic has for its absence.
_ASKED: dict[str, str] = {
    "string_type": "text",
    "int_type": "a whole number", "int_parsing": "a whole number", "int_from_float": "a whole number",
    "int_parsing_size": "a smaller whole number",
    "float_type": "a number", "float_parsing": "a number", "finite_number": "a finite number",
    "bool_type": "true or false", "bool_parsing": "true or false",
    "tuple_type": "a list", "list_type": "a list",
    "dict_type": "a section of keys and values", "model_type": "a section of keys and values",
    "model_attributes_type": "a section of keys and values",
    "literal_error": "one of the words known here",
}

# What a bound broken means, with the number that pydantic keeps in the context of the error.
_BOUNDS: dict[str, tuple[str, str]] = {
    "greater_than_equal": ("at least", "ge"), "greater_than": ("more than", "gt"),
    "less_than_equal": ("at most", "le"), "less_than": ("less than", "lt"),
}


def explain(error: ValidationError, parsed: Parsed) -> list[Fault]:
    """The faults behind a failed check, one for each key, in the order pydantic found them."""
    grouped: dict[KeyPath, list[ErrorDetails]] = {}
    for detail in error.errors(include_url=False):
        if detail["type"] == "too_short" and len(detail["input"]) >= detail["ctx"]["min_length"]:
            continue  # only short of the entries that have faults of their own
        grouped.setdefault(_written_path(detail, parsed.data), []).append(detail)
    return [_fault(path, details, parsed) for path, details in grouped.items()]


def _written_path(detail: ErrorDetails, data: Any) -> KeyPath:
    """The part of the error's place that is a key path; the rest names branches of a union, which nobody wrote."""
    path: list[str | int] = []
    for part in detail["loc"]:
        entry = isinstance(data, list) and isinstance(part, int) and part < len(data)
        if not entry and not (isinstance(data, Mapping) and part in data):
            lacking = detail["type"] == "missing" and isinstance(part, str) and part == detail["loc"][-1]
            return (*path, part) if lacking else tuple(path)
        data = data[part]
        path.append(part)
    return tuple(path)


def _fault(path: KeyPath, details: list[ErrorDetails], parsed: Parsed) -> Fault:
    """One fault of possibly several complaints: a union complains once for each of its branches."""
    told = [detail for detail in details if detail["type"] not in _ASKED]
    if told:
        what, mend = _tell(path, told[0], parsed.data)
    else:
        what, mend = _wrong_kind(path, details, parsed.data)
    return Fault(parsed.line(path), dotted(path), what, mend)


def _tell(path: KeyPath, detail: ErrorDetails, data: object) -> tuple[str, str]:
    kind, value, context = detail["type"], detail["input"], detail.get("ctx", {})
    if kind in _BOUNDS:
        words, name = _BOUNDS[kind]
        return f"{_shown(value)} is out of range: it must be {words} {context[name]}", _meaning(path, data)
    tellers: dict[str, Callable[[], tuple[str, str]]] = {
        "missing": lambda: _missing(path, detail["loc"][-1], data),
        "extra_forbidden": lambda: _unknown_key(path, data),
        "string_pattern_mismatch": lambda: (f"{_shown(value)} cannot be understood here", _meaning(path, data)),
        "string_too_short": lambda: (f"{_shown(value)} is too short", _meaning(path, data)),
        "too_short": lambda: (_count(value, context["min_length"], "at least"), _meaning(path, data)),
        "too_long": lambda: (_count(value, context["max_length"], "at most"), _meaning(path, data)),
        "value_error": lambda: _raised(context["error"], path, data),
    }
    teller = tellers.get(kind)
    return teller() if teller else (f"{_shown(value)} is not accepted here", _meaning(path, data))


def _wrong_kind(path: KeyPath, details: list[ErrorDetails], data: object) -> tuple[str, str]:
    value = details[0]["input"]
    declared = field_at(path, data)
    listed = any(detail["type"] == "literal_error" for detail in details)
    words = choices(declared[1].annotation) if declared and listed else []
    asked = list(dict.fromkeys(_ASKED[detail["type"]] for detail in details if detail["type"] != "literal_error"))
    if "a number" in asked and "a whole number" in asked:
        asked.remove("a whole number")
    wanted = " or ".join([*(f"'{word}'" for word in words), *asked])
    if value is None:
        return "nothing is written here", f"write {wanted}, or remove the line. {_meaning(path, data)}"
    if not asked:
        return f"{_shown(value)} is not accepted here", _suggest(str(value), words)
    if asked == ["text"] and not words and not isinstance(value, (list, dict)):
        return f"{_shown(value)} is not text", f'put it in quotes: "{_shown(value)}"'
    if wanted == "a list":
        return f"{_shown(value)} is not a list", "begin each entry with '- ', or put the entries in brackets [ ]"
    return f"{_shown(value)} is not {wanted}", _meaning(path, data)


def _suggest(word: str, words: list[str]) -> str:
    suggestion = f"{did_you_mean(word, words)} " if near_words(word, words) else ""
    return f"{suggestion}accepted: {', '.join(words)}"


def _missing(path: KeyPath, name: str | int, data: object) -> tuple[str, str]:
    if isinstance(name, int):
        return "the list has too few entries", _meaning(path, data)
    section = section_at(path, data)
    what = f"'{name}' is missing in {dotted(path[:-1]) or 'the recipe'}"
    if section:
        needed = [name for name, field in section.model_fields.items() if field.is_required()]
        return what, f"write the section `{name}:` with at least: {', '.join(needed)}"
    return what, f"write `{name}: ...`, {_meaning(path, data).partition(': ')[2]}"


def _unknown_key(path: KeyPath, data: object) -> tuple[str, str]:
    """Near words of the same section first; else the same word where it is known."""
    name, section = str(path[-1]), section_at(path[:-1], data)
    known = list(section.model_fields) if section else []
    what = f"there is no key '{name}' in {dotted(path[:-1]) or 'a recipe'}"
    elsewhere = [row.key for row in reference() if row.key.rpartition(".")[2] == name]
    if elsewhere and not near_words(name, known):
        return what, "it belongs elsewhere: did you mean " + " or ".join(f"`{key}`" for key in elsewhere[:3]) + "?"
    return what, did_you_mean(name, known)


def _count(value: Any, bound: int, words: str) -> str:
    return f"{len(value)} entries are given, {words} {bound} asked"


def _raised(error: Exception, path: KeyPath, data: object) -> tuple[str, str]:
    """What a settings class said itself: with the mend if it used an error of the family."""
    if isinstance(error, GridcarbError):
        return error.what, error.mend or _meaning(path, data)
    return str(error), _meaning(path, data)


def _meaning(path: KeyPath, data: object) -> str:
    """What the key is for, in the words of its declaration."""
    declared = field_at(path, data)
    if not declared:
        return ""
    name, field = declared
    section = section_of(field.annotation)
    keys = f"its keys are {', '.join(section.model_fields)}" if section else "see `gridcarb keys`"
    return f"{name}: {field.description or keys}"


def _shown(value: object) -> str:
    if isinstance(value, Mapping):
        return "a section of keys and values"
    if isinstance(value, (list, tuple)):
        return "a list"
    if isinstance(value, bool):
        return str(value).lower()
    text = str(value)
    return f"'{text if len(text) <= 60 else text[:57] + '...'}'" if isinstance(value, str) else text
