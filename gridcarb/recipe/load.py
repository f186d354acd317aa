"""From a file or a text to a checked recipe, or to all its faults at once."""

from __future__ import annotations

import hashlib
import json
import os
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from gridcarb.errors import Fault, RecipeError, did_you_mean
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.recipe.across import disagreements
from gridcarb.recipe.engine import spoken_engine
from gridcarb.recipe.faults import explain
from gridcarb.recipe.model import Origin, Recipe
from gridcarb.recipe.text import KeyPath, Parsed, dotted, parse
from gridcarb.settings import Settings

COMMAND_LINE = " (from the command line)"


def load(
    path: Path, *, inputs: Sequence[str] = (), folder: str | None = None, replace: bool = False,
    workers: int | None = None, memory: str | None = None, engine: str | None = None,
) -> Recipe:
    """Read the recipe at `path`.

    What is given here goes before what is written there. `inputs` take the place of ``inputs.files``; they and
    `folder` are relative to the working directory, while paths in the recipe are relative to the recipe.

    Raises RecipeError with every fault, each with its line.
    """
    spoken: dict[KeyPath, object] = {}
    if inputs:
        spoken["inputs", "files"] = [_from_here(name) for name in inputs]
    if folder is not None:
        spoken["output", "folder"] = _from_here(folder)
    if replace:
        spoken["output", "replace"] = True
    if workers is not None:
        spoken["engine", "workers"] = workers
    if memory is not None:
        spoken["engine", "memory"] = memory
    if engine is not None:
        spoken |= {("engine", key): value for key, value in spoken_engine(engine).items()}
    return _checked(_read(path), str(path), Path(os.path.abspath(path)), spoken)


def check(text: str, where: str = "recipe") -> Recipe:
    """Check a recipe held in memory; its paths are relative to the working directory. Raises RecipeError."""
    return _checked(text, where, None, {})


class _Reading(Settings):
    reading: ReadingSettings


def check_reading(words: Mapping[str, object]) -> ReadingSettings:
    """Check a `reading` section given as a mapping. Raises RecipeError with every fault."""
    parsed = Parsed({"reading": dict(words)}, {}, [])
    try:
        return _Reading.model_validate(parsed.data).reading
    except ValidationError as error:
        raise _error("reading", explain(error, parsed)) from None


def _checked(text: str, where: str, path: Path | None, spoken: dict[KeyPath, object]) -> Recipe:
    parsed = parse(text)
    if parsed.data is None:
        raise _error(where, parsed.faults)
    base = path.parent if path else Path.cwd()
    for key, value in spoken.items():
        _lay_over(parsed, key, value)
    recipe, faults = None, list(parsed.faults)
    try:
        recipe = Recipe.model_validate(parsed.data, context=Origin(base, path, text, _digest(text, spoken)))
    except ValidationError as error:
        faults += explain(error, parsed)
    faults += disagreements(parsed, base)
    if recipe is None or faults:
        raise _error(where, _marked(faults, spoken))
    return recipe


def _read(path: Path) -> str:
    try:
        return path.read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        what, mend = "there is no such recipe", _neighbours(path)
    except IsADirectoryError:
        what, mend = "this is a folder, not a recipe", _neighbours(path / "recipe.yaml")
    except UnicodeDecodeError:
        what, mend = "this is not a text file (UTF-8)", "name the recipe, not a data file: gridcarb run RECIPE --input DATA"
    except OSError as error:
        what, mend = f"the recipe cannot be read ({error.strerror})", "look at its permissions"
    raise RecipeError("no recipe was read", where=str(path), faults=(Fault(0, "", what, mend),))


def _neighbours(path: Path) -> str:
    found = sorted(entry.name for pattern in ("*.yaml", "*.yml") for entry in path.parent.glob(pattern))
    return did_you_mean(path.name, found) if found else "name a YAML file that holds a recipe"


def _from_here(name: str) -> str:
    """A path given on the command line, made absolute; an address such as scheme://... stays as it is."""
    return name if "://" in name else os.path.abspath(name)


def _lay_over(parsed: Parsed, key: KeyPath, value: object) -> None:
    """Write a word of the command line into the data, unless its section is not a section (a fault of its own)."""
    *sections, name = key
    data: Any = parsed.data
    for section in sections:
        if data.get(section) is None:
            data[section] = {}
        data = data[section]
        if not isinstance(data, dict):
            return
    data[name] = value


def _digest(text: str, spoken: dict[KeyPath, object]) -> str:
    """What makes the result: `replace` and the engine's words change when and how fast, not what."""
    said = {dotted(key): value for key, value in spoken.items() if key in {("inputs", "files"), ("output", "folder")}}
    whole = text + (json.dumps(said, sort_keys=True) if said else "")
    return hashlib.sha256(whole.encode("utf-8", "surrogatepass")).hexdigest()


def _marked(faults: list[Fault], spoken: dict[KeyPath, object]) -> list[Fault]:
    """One fault for each key and line, by line; what the command line said has no line."""
    said = {dotted(key) for key in spoken}
    kept: dict[tuple[str, int], Fault] = {}
    for fault in faults:
        here = Fault(0, fault.key + COMMAND_LINE, fault.what, fault.mend) if fault.key in said else fault
        kept.setdefault((here.key, here.line), here)
    return sorted(kept.values(), key=lambda fault: fault.line)


def _error(where: str, faults: list[Fault]) -> RecipeError:
    count = f"{len(faults)} faults" if len(faults) > 1 else "one fault"
    return RecipeError(f"the recipe has {count}", where=where, faults=tuple(faults))
