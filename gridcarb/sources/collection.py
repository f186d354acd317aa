"""What was found in the input files: plain data, small enough to travel to every worker."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.axes import Axes, GridKind
from gridcarb.errors import Notice


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

    file_axes : for each dimension, its place among the dimensions of the file; axes of the file that are not named
        here have one step.
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


@dataclass(frozen=True, eq=False)
class Collection:
    """Everything known of the inputs from their headers.

    roles : role -> source, in the order of `fields.ROLES`; absent nutrients are absent.
    coordinates : name -> source of everything that describes the grid: axes, bounds, 2-D positions, scalars, measures.
    axes, kind, sizes : the reference grid, that of the temperature.
    attributes : global attributes of the first file of the temperature.
    """

    roles: Mapping[str, RoleSource]
    coordinates: Mapping[str, ArraySource]
    axes: Axes
    kind: GridKind
    sizes: Mapping[str, int]
    files: tuple[FileRecord, ...]
    attributes: Mapping[str, Any]
    notices: tuple[Notice, ...]

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
