"""What lies in the input files and what each variable can be: everything found, and every fault, without raising.

`gather` gives the collection or the first fault; the survey gives all that can be known when something is wrong.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from gridcarb.errors import GridcarbError
from gridcarb.sources.collection import Collection, FileRecord
from gridcarb.sources.settings import InputsSettings

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
    collection : None if a role that is needed has no variable or does not fit the others; if `faults` is not empty, it is
        made of what is left without the faulty files, to look at, not to run.
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
    from gridcarb.sources.gather import gather

    try:
        return Survey((), (), gather(settings, base))
    except GridcarbError as error:
        return Survey((), (error,), None)
