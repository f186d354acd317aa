"""What lies in the input files and what each variable can be: everything found, and every fault, without raising.

`gather` gives the collection or the first fault; the survey gives all that can be known when something is wrong.
"""

from __future__ import annotations

from collections.abc import Container, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from gridcarb.errors import Faults, GridcarbError
from gridcarb.sources.collection import Collection, FileRecord
from gridcarb.sources.conventions import MEASURES
from gridcarb.sources.gather import Explored, explore
from gridcarb.sources.headers import Header
from gridcarb.sources.roles import roles_of
from gridcarb.sources.settings import InputsSettings
from gridcarb.sources.stored import Head

Part = Literal["field", "coordinate", "bounds", "measure", "other"]


@dataclass(frozen=True)
class Chance:
    """A role (or cell measure) that a variable can play.

    role : a role of `fields.ROLES`, or a kind of `MEASURES` (area, volume, thickness, sea_fraction, basin,
        sea_floor_depth).
    how : how it is known: 'by standard_name', 'by name (CMIP)', 'as told'.
    taken : whether it is used in this role.
    why : the reason, in words.
    """

    role: str
    how: str
    taken: bool
    why: str


@dataclass(frozen=True, eq=False)
class VariableSurvey:
    """One variable of one file.

    dims : dimension -> size, in the order of the file.
    part : what it is in its file.
    chances : the roles it can play; none: `why_none` says why.
    chunks : chunk shape in the file, None if contiguous; compression : in words, '' if none.
    """

    name: str
    dims: Mapping[str, int]
    dtype: str
    units: str
    standard_name: str
    long_name: str
    attrs: Mapping[str, Any]
    chunks: tuple[int, ...] | None
    compression: str
    part: Part
    chances: tuple[Chance, ...]
    why_none: str

    @property
    def taken_as(self) -> tuple[str, ...]:
        """The roles it is used in."""
        return tuple(chance.role for chance in self.chances if chance.taken)


@dataclass(frozen=True, eq=False)
class FileSurvey:
    """One file or store: its variables, or the error that kept it from being read.

    path : with the group, as in `ocean.nc#model`. record : None if the file failed.
    """

    path: str
    form: Literal["netcdf", "zarr", ""]
    record: FileRecord | None
    attrs: Mapping[str, Any]
    variables: tuple[VariableSurvey, ...]
    error: GridcarbError | None = None


@dataclass(frozen=True, eq=False)
class Survey:
    """All files, all faults, and the collection as far as one can be made.

    faults : everything that would make `gather` raise, in the order it would; empty if all is well.
    collection : the roles that fit together, None if none does; if `faults` is not empty, roles and files may be lacking
        in it: it is there to be looked at, not to be run.
    """

    files: tuple[FileSurvey, ...]
    faults: tuple[GridcarbError, ...]
    collection: Collection | None


def survey(settings: InputsSettings, base: Path) -> Survey:
    """Look at the headers of all inputs; a bad file, role, grid or time axis is noted, never raised.

    Parameters
    ----------
    settings : the `inputs` section of a recipe.
    base : the folder its relative paths start from.
    """
    faults = Faults()
    found = explore(settings, base, faults)
    taken: dict[str, str] = {role: one.variable for role, one in found.chosen.items()}
    taken |= {kind: part.variable for kind, part in found.measures.parts.items()}
    how = {role: one.how for role, one in found.chosen.items()} | {
        kind: part.how for kind, part in found.measures.parts.items()
    }
    open_to = {key: {header.path for header in headers} for key, headers in found.looked.groups.items()}
    files = tuple(
        _file(path, header, found, {key for key, paths in open_to.items() if _path(header) in paths}, taken, how)
        for path, header in found.looked.files.items()
    )
    return Survey(files, tuple(faults.found), found.collection)


def _path(header: Header | GridcarbError) -> str:
    return header.path if isinstance(header, Header) else ""


def _file(
    path: str, header: Header | GridcarbError, found: Explored, open_to: Container[str], taken: Mapping[str, str],
    how: Mapping[str, str],
) -> FileSurvey:
    if isinstance(header, GridcarbError):
        return FileSurvey(path, "", None, {}, (), header)
    coordinates = set(found.collection.coordinates if found.collection else ())
    variables = tuple(
        _variable(head, _part(head, header, coordinates), open_to, taken, how) for head in header.heads.values()
        if not head.origin
    )
    return FileSurvey(header.path, header.kind, header.record, header.attrs, variables)


def _variable(
    head: Head, part: Part, open_to: Container[str], taken: Mapping[str, str], how: Mapping[str, str]
) -> VariableSurvey:
    known = {role: match[1] for role, match in roles_of(head).items() if part in ("field", "measure")}
    known |= {role: how[role] for role, name in taken.items() if name == head.name}
    chances = tuple(_chance(role, said, head.name, taken.get(role), role in open_to) for role, said in known.items())
    standard_name = str(head.attrs.get("standard_name", "")).strip()
    return VariableSurvey(
        head.name, dict(zip(head.dims, head.shape, strict=True)), str(head.dtype), str(head.attrs.get("units", "")),
        standard_name, str(head.attrs.get("long_name", "")), head.attrs, head.chunks, head.compression,
        "measure" if any(chance.role in MEASURES for chance in chances) else part, chances,
        "" if chances else _why_none(head, part, standard_name),
    )


def _chance(role: str, how: str, name: str, taken: str | None, searched: bool) -> Chance:
    if not searched:
        return Chance(role, how, False, f"the recipe names other files for the {role}")
    if taken == name:
        return Chance(role, how, True, "taken")
    if taken is not None:
        return Chance(role, how, False, f"'{taken}' is taken: told, known better, or with the levels of the other roles")
    return Chance(role, how, False, f"not settled: several can be the {role}, or it does not fit")


def _part(head: Head, header: Header, coordinates: Container[str]) -> Part:
    """What a variable is in its file, whatever role it may play."""
    if head.name in header.edges:
        return "bounds"
    placing = head.attrs.get("standard_name") in ("latitude", "longitude", "time")
    if head.name in header.pointed or head.name in head.dims or placing:
        return "coordinate"
    if head.dtype.kind not in "iuf" or not head.dims:
        return "other"
    return "field" if head.name not in coordinates or roles_of(head) else "coordinate"


def _why_none(head: Head, part: Part, standard_name: str) -> str:
    """Why a variable plays no role."""
    if part in ("coordinate", "bounds"):
        return f"it is {'bounds' if part == 'bounds' else 'a coordinate'}"
    if head.dtype.kind not in "iuf":
        return "it holds no numbers"
    if standard_name:
        return f"its standard_name '{standard_name}' is none that gridcarb reads"
    return "it has no standard_name, and no convention knows its name"
