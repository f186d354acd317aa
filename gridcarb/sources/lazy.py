"""Arrays that read a slice when asked for it, from whichever files it lies in."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr
from xarray.backends import BackendArray
from xarray.core.indexing import ExplicitIndexer, IndexingSupport, LazilyIndexedArray, explicit_indexing_adapter

from gridcarb.sources.collection import ArraySource, Collection, Segment
from gridcarb.sources.kept_chunks import read


class SegmentedArray(BackendArray):
    """One variable across its files, in canonical order; holds paths and numbers only, never a file."""

    def __init__(self, source: ArraySource) -> None:
        self.source = source
        self.shape = source.shape
        self.dtype = np.dtype(source.dtype)

    def __getitem__(self, key: ExplicitIndexer) -> Any:
        return explicit_indexing_adapter(key, self.shape, IndexingSupport.OUTER, self._read)

    def _read(self, key: tuple[Any, ...]) -> npt.NDArray[Any]:
        """`key` holds one integer, slice or 1-D array for each dimension."""
        time = self.source.time_axis
        if time is None or not isinstance(key[time], (slice, np.ndarray)):
            step = 0 if time is None else int(key[time])
            segment = self._segment_at(step)
            return self._read_segment(segment, _with(key, time, step - segment.start))
        steps = np.arange(self.shape[time])[key[time]]
        parts = [self._read_segment(segment, _with(key, time, local)) for segment, local in self._stretches(steps)]
        if not parts:
            return self._read_segment(self.source.segments[0], _with(key, time, slice(0, 0)))
        place = sum(isinstance(part, (slice, np.ndarray)) for part in key[:time])
        return parts[0] if len(parts) == 1 else np.concatenate(parts, axis=place)

    def _segment_at(self, step: int) -> Segment:
        return next(segment for segment in self.source.segments if segment.start <= step < segment.stop)

    def _stretches(self, steps: npt.NDArray[np.int64]) -> Iterator[tuple[Segment, slice | npt.NDArray[np.int64]]]:
        """Runs of steps that lie in one file, as positions in that file."""
        starts = np.array([segment.start for segment in self.source.segments])
        owners = np.searchsorted(starts, steps, side="right") - 1
        cuts = np.flatnonzero(np.diff(owners)) + 1
        for run in np.split(np.arange(len(steps)), cuts) if len(steps) else ():
            segment = self.source.segments[int(owners[run[0]])]
            yield segment, _as_slice(steps[run] - segment.start)

    def _read_segment(self, segment: Segment, key: tuple[Any, ...]) -> npt.NDArray[Any]:
        """Ask the file in its own order of dimensions, then bring the answer into ours."""
        source = self.source
        asked: list[Any] = [0] * source.file_rank
        pairs = [(part, axis) for part, axis in zip(key, source.file_axes, strict=True) if axis >= 0]
        for part, axis in pairs:
            asked[axis] = part
        found = read(segment.path, segment.variable, tuple(asked))
        kept = [axis for part, axis in pairs if isinstance(part, (slice, np.ndarray))]
        found = found.transpose([sorted(kept).index(axis) for axis in kept])
        if -1 in source.file_axes:
            found = self._spread(found, key)
        return found.astype(self.dtype, copy=False)


    def _spread(self, found: npt.NDArray[Any], key: tuple[Any, ...]) -> npt.NDArray[Any]:
        """The one step of a file that has no dimension for it."""
        place = self.source.file_axes.index(-1)
        part = key[place]
        if not isinstance(part, (slice, np.ndarray)):
            return found
        before = sum(isinstance(other, (slice, np.ndarray)) for other in key[:place])
        return np.expand_dims(found, before)[(slice(None),) * before + (part,)]


def _with(key: tuple[Any, ...], place: int | None, part: Any) -> tuple[Any, ...]:
    return key if place is None else (*key[:place], part, *key[place + 1:])


def _as_slice(steps: npt.NDArray[np.int64]) -> slice | npt.NDArray[np.int64]:
    """A slice where the steps follow one another, which reads faster than a list of places."""
    if np.all(np.diff(steps) == 1):
        return slice(int(steps[0]), int(steps[-1]) + 1)
    return steps


def open_collection(collection: Collection) -> xr.Dataset:
    """The inputs as one lazy dataset, numbers and attributes as stored.

    Variables bear the names of their roles; dimensions are those of the reference grid in the order time, vertical,
    horizontal; nothing is masked, scaled or decoded. Only what is sliced is read, when it is loaded. The dataset can be
    pickled and read from several threads at once.
    """
    coordinates = {name: _variable(source) for name, source in collection.coordinates.items()}
    fields = {role: _variable(source.array) for role, source in collection.roles.items()}
    return xr.Dataset(fields, coords=coordinates, attrs=dict(collection.attributes))


def _variable(source: ArraySource) -> xr.Variable:
    attrs, first = dict(source.attrs), source.segments[0]
    if source.values is not None:
        return xr.Variable(source.dims, source.values.copy(), attrs)
    origin = {"source": first.path, "original_name": first.variable}  # where xarray keeps it too; errors tell it
    return xr.Variable(source.dims, LazilyIndexedArray(SegmentedArray(source)), attrs, origin)
