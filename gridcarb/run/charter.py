"""The charter of a run: what its numbers follow from. Two runs of one charter leave the same store."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass, field
from datetime import UTC, datetime
from functools import cache, cached_property
from importlib.metadata import version
from pathlib import Path
from typing import TYPE_CHECKING, Any

import gridcarb
from gridcarb.recipe import Recipe
from gridcarb.recipe.model import Origin
from gridcarb.run.blocks import Layout

if TYPE_CHECKING:
    from gridcarb.run.plan import Plan

_NUMERIC = ("gridcarb", "numpy", "numba", "gsw", "zarr", "numcodecs")
"""What decides the last bit of a number, and the bytes it is stored in."""

_ROOMS = ("sources", "harmonise", "chemistry", "write")
_FREE = {"engine": True, "figures": True, "output": {"folder", "replace", "zarr", "netcdf", "netcdf_files"}}
"""What a recipe may change between a run and its resumption: how fast, where to, and what is made of the finished store."""


@dataclass(frozen=True)
class Charter:
    """What a run is made of, as plain data.

    settings : the whole recipe as checked, command line included.
    base : the folder its paths are relative to.
    files : path -> size, time of change and fingerprint of each input.
    versions : of what makes the numbers and their bytes.
    layout : how the grid is cut; a resumed run keeps it.
    begun : when the run first began (ISO 8601), as the store's history says.
    fixed : file inside the store -> checksum, for metadata and coordinates.
    derived : file inside the result -> checksum, for what is made of the finished store.
    """

    settings: Mapping[str, Any]
    base: str
    files: Mapping[str, Mapping[str, Any]]
    versions: Mapping[str, str]
    layout: Mapping[str, Mapping[str, int]]
    begun: str
    fixed: Mapping[str, str] = field(default_factory=dict)
    derived: Mapping[str, str] = field(default_factory=dict)

    @classmethod
    def of(cls, plan: Plan, begun: datetime) -> Charter:
        """The charter of a plan that begins now."""
        files = {each.path: {"bytes": each.size, "mtime_ns": each.mtime_ns, "fingerprint": each.fingerprint}
                 for each in plan.collection.files}  # fmt: skip
        layout = plan.layout
        return cls(
            plan.recipe.model_dump(mode="json"), str(plan.recipe.base), files, numeric_versions(),
            {"sizes": dict(layout.sizes), "block": dict(layout.block), "chunks": dict(layout.chunks)},
            begun.isoformat(timespec="seconds"),
        )

    @classmethod
    def read(cls, content: Mapping[str, Any]) -> Charter:
        """From what `as_dict` gave; KeyError or TypeError if it is something else."""
        return cls(**content)

    def as_dict(self) -> dict[str, Any]:
        """Only what JSON knows."""
        return asdict(self)

    @property
    def began(self) -> datetime:
        """When the run first began."""
        return datetime.fromisoformat(self.begun)

    @cached_property
    def recipe_digest(self) -> str:
        """SHA-256 of what in the recipe and the program decides the numbers, and of how the grid is cut."""
        return _digest({"recipe": _binding(self.settings), "versions": self.versions, "layout": self.layout})

    @cached_property
    def inputs_digest(self) -> str:
        """SHA-256 of paths, sizes, times and fingerprints of the inputs."""
        return _digest(self.files)

    def recipe(self) -> Recipe:
        """The recipe, as it was."""
        return Recipe.model_validate(dict(self.settings), context=Origin(Path(self.base)))

    def grid_layout(self) -> Layout:
        """How the grid is cut, in the order of its dimensions."""
        return Layout(*(dict(self.layout[part]) for part in ("sizes", "block", "chunks")))

    def differences(self, now: Charter) -> list[str]:
        """In what `now` differs, one sentence each; empty if it may go on where this one ended."""
        then, today = _flat(_binding(self.settings)), _flat(_binding(now.settings))
        found = [f"recipe: `{key}` was {then.get(key, 'not there')}, is {today.get(key, 'not there')}"
                 for key in dict.fromkeys([*then, *today]) if then.get(key) != today.get(key)]  # fmt: skip
        if self.base != now.base and not found and self.files.keys() != now.files.keys():
            found.append(f"recipe: its folder was {self.base}, is {now.base}")
        return found + self.input_differences(now.files) + self.version_differences()

    def input_differences(self, now: Mapping[str, Mapping[str, Any]]) -> list[str]:
        """In what the inputs `now` differ, one sentence a file."""
        return [text for path in sorted({*self.files, *now})
                if (text := _file_difference(path, self.files.get(path), now.get(path)))]  # fmt: skip

    def version_differences(self) -> list[str]:
        """In what the program differs that is installed now."""
        today = numeric_versions()
        return [f"program: {name} was {self.versions.get(name, 'not there')}, is {today.get(name, 'not there')}"
                for name in sorted({*self.versions, *today}) if self.versions.get(name) != today.get(name)]  # fmt: skip


@cache
def numeric_versions() -> dict[str, str]:
    """Versions of what makes the numbers, and a digest of our own sources: an edit without a new version counts as well."""
    digest = hashlib.sha256()
    root = Path(gridcarb.__file__).parent
    for room in _ROOMS:
        for source in sorted((root / room).rglob("*.py")):
            digest.update(source.read_bytes())
    return {name: version(name) for name in _NUMERIC} | {"sources of gridcarb": digest.hexdigest()[:16]}


def _binding(settings: Mapping[str, Any]) -> dict[str, Any]:
    kept: dict[str, Any] = {}
    for key, value in settings.items():
        free = _FREE.get(key)
        if isinstance(free, set):
            kept[key] = {name: each for name, each in value.items() if name not in free}
        elif not free:
            kept[key] = value
    return kept


def _flat(value: Mapping[str, Any], above: str = "") -> dict[str, str]:
    """Dotted key -> value as JSON."""
    found: dict[str, str] = {}
    for key, each in value.items():
        if isinstance(each, Mapping) and each:
            found |= _flat(each, f"{above}{key}.")
        else:
            found[f"{above}{key}"] = json.dumps(each, ensure_ascii=False)
    return found


def _file_difference(path: str, then: Mapping[str, Any] | None, now: Mapping[str, Any] | None) -> str:
    if then is None:
        return f"input: {path} was not among the inputs"
    if now is None:
        return f"input: {path} is no longer among the inputs"
    found = []
    if then["bytes"] != now["bytes"]:
        found.append(f"had {then['bytes']:,} bytes, has {now['bytes']:,}")
    if then["fingerprint"] != now["fingerprint"]:
        found.append("has another head (SHA-256)")
    if then["mtime_ns"] != now["mtime_ns"]:
        found.append(f"was last changed {_moment(then['mtime_ns'])}, now {_moment(now['mtime_ns'])}")
    return f"input: {path} {'; '.join(found)}" if found else ""


def _moment(nanoseconds: int) -> str:
    return datetime.fromtimestamp(nanoseconds / 1e9, UTC).isoformat(timespec="milliseconds")


def _digest(content: object) -> str:
    return hashlib.sha256(json.dumps(content, sort_keys=True, ensure_ascii=True).encode()).hexdigest()
