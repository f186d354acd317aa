"""What was found in the input files: plain data, small enough to travel to every worker."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.axes import Axes, GridKind
from gridcarb.errors import Notice
from gridcarb.sources.dates import Stamps


@dataclass(frozen=True)
class FileRecord:
    """One input: path, bytes, time of the last change (ns), SHA-256 of its head.

    For a Zarr store the bytes, time and fingerprint are those of its metadata files; chunks are not looked at.
    """

    path: str
    size: int
    mtime_ns: int
    fingerprint: str


@dataclass(frozen=True)
class Segment:
    """A stretch of the time axis, [start, stop), that lies in one file; (0, 1) for what has no time."""

    path: str
    variable: str
    start: int
    stop: int


@dataclass(frozen=True, eq=False)
class ArraySource:
    """One variable across its files, in the dimensions of the reference grid and in canonical order.

    file_axes : for each dimension, its place among the dimensions of the file, -1 if each file is one step of it; axes of
        the file that are not named here have one step.
    file_rank : number of dimensions in the file.
    chunks : chunk shape of the source in canonical order, None if it is contiguous.
    segments : its files, in the order of time.
    values : the numbers themselves where they are few (coordinates); None: read them from the segments.
    """

    dims: tuple[str, ...]
    shape: tuple[int, ...]
    dtype: str
    attrs: Mapping[str, Any]
    file_axes: tuple[int, ...]
    file_rank: int
    chunks: tuple[int, ...] | None
    segments: tuple[Segment, ...]
    time_axis: int | None
    values: npt.NDArray[Any] | None = None

    @property
    def nbytes(self) -> int:
        """Bytes of all its numbers as stored, before compression."""
        return int(np.prod(self.shape, dtype=np.int64)) * np.dtype(self.dtype).itemsize


@dataclass(frozen=True, eq=False)
class RoleSource:
    """Which variable plays a role, and how it was recognised: 'by standard_name', 'by name (CMIP)', 'as told'."""

    role: str
    variable: str
    how: str
    array: ArraySource


@dataclass(frozen=True)
class TimeReading:
    """What the time axis says; nothing of it is ever changed, save months that the recipe says how to read.

    name, dim : the coordinate ('' if there is none) and its dimension (None: one moment, or one of each place).
    first, last : dates in words. bounds : whether intervals are given. climatological : whether they span many years.
    stamps : where in their intervals the times lie. told_in : units in the files, where others are used here.
    """

    name: str
    dim: str | None
    units: str
    calendar: str
    steps: int
    first: str
    last: str
    bounds: bool
    climatological: bool
    stamps: Stamps
    told_in: str


@dataclass(frozen=True, eq=False)
class Collection:
    """Everything known of the inputs from their headers.

    roles : role -> source, in the order of `fields.ROLES`; absent nutrients are absent.
    coordinates : name -> source of everything that describes the grid: axes, bounds, 2-D positions, scalars, measures.
    axes, kind, sizes : the reference grid, that of the temperature.
    attributes : global attributes of the first file of the temperature.
    measures : kind of `MEASURES` -> name among the coordinates.
    time : what the time axis says, None if there is none.
    """

    roles: Mapping[str, RoleSource]
    coordinates: Mapping[str, ArraySource]
    axes: Axes
    kind: GridKind
    sizes: Mapping[str, int]
    files: tuple[FileRecord, ...]
    attributes: Mapping[str, Any]
    notices: tuple[Notice, ...]
    measures: Mapping[str, str] = field(default_factory=dict)
    time: TimeReading | None = None

    def describe(self) -> list[dict[str, Any]]:
        """One plain row a role, for people and for JSON."""
        return [
            {
                "role": role,
                "variable": source.variable,
                "match": source.how,
                "files": len(source.array.segments),
                "first_file": source.array.segments[0].path,
                "units": str(source.array.attrs.get("units", "")),
                "dims": dict(zip(source.array.dims, source.array.shape, strict=True)),
                "dtype": source.array.dtype,
                "chunks": list(source.array.chunks) if source.array.chunks else None,
                "bytes": source.array.nbytes,
            }
            for role, source in self.roles.items()
        ]
