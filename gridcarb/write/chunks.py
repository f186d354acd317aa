"""The chunk files of a field in a store: where each lies, and how its bytes are made and checked.

They are the files the Zarr library would write, to the byte. A block writes whole chunks only and makes their bytes itself:
no event loop stands between a worker and its files, and what is noted of a chunk is noted of the very bytes that went out.
"""

from __future__ import annotations

import functools
import itertools
import uuid
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import IO, Any, cast

import numpy as np
import zarr
from numpy.typing import NDArray

from gridcarb.errors import BlockError
from gridcarb.write.encoding import ENCODER, bytes_checksum

DIMS_V2 = "_ARRAY_DIMENSIONS"
"""Where format 2 keeps the names of dimensions; format 3 has a place of its own for them."""

PARTIAL = ".partial"
"""The ending of a chunk file that is not whole yet."""

_METADATA = ("zarr.json", ".zarray")


@dataclass(frozen=True)
class ChunkedField:
    """A field of a store.

    fill : what a chunk without a file holds; None if that is not settled, as for a status in format 2.
    key : numbers of a chunk along each dimension -> the path of its file in `folder`.
    """

    name: str
    folder: Path
    dims: tuple[str, ...]
    shape: tuple[int, ...]
    chunks: tuple[int, ...]
    dtype: np.dtype[Any]
    fill: Any
    key: Callable[[tuple[int, ...]], str]

    def selection(self, region: Mapping[str, slice]) -> tuple[slice, ...]:
        """The slices of a region, which must consist of whole chunks; a dimension not named is taken whole.

        Raises
        ------
        BlockError : it does not: two writers in one chunk lose data silently.
        """
        found = []
        for dim, size, chunk in zip(self.dims, self.shape, self.chunks, strict=True):
            start, stop, step = region.get(dim, slice(None)).indices(size)
            if step != 1 or start % chunk or (stop % chunk and stop != size) or start >= stop:
                raise BlockError(
                    f"region {start}:{stop} along '{dim}' is not made of whole chunks of {chunk} (length {size})",
                    where=str(self.folder),
                )
            found.append(slice(start, stop))
        return tuple(found)

    def files(self, selection: Sequence[slice]) -> list[Path]:
        """The files of a selection made of whole chunks, in order; a chunk of only fill has none."""
        return [self.folder / self.key(place) for place in self._places(selection)]

    def write(self, selection: Sequence[slice], values: NDArray[Any]) -> tuple[str, ...]:
        """Write the numbers of a selection made of whole chunks; give the checksum of each file, "" where there is none."""
        return tuple(self._write(place, part) for place, part in self._parts(selection, values))

    def _places(self, selection: Sequence[slice]) -> Iterator[tuple[int, ...]]:
        cut = zip(selection, self.chunks, strict=True)
        return itertools.product(*(range(part.start // chunk, -(-part.stop // chunk)) for part, chunk in cut))

    def _parts(self, selection: Sequence[slice], values: NDArray[Any]) -> Iterator[tuple[tuple[int, ...], NDArray[Any]]]:
        for place in self._places(selection):
            corner = (at * chunk - part.start for at, chunk, part in zip(place, self.chunks, selection, strict=True))
            yield place, values[tuple(slice(at, at + chunk) for at, chunk in zip(corner, self.chunks, strict=True))]

    def _write(self, place: tuple[int, ...], part: NDArray[Any]) -> str:
        path = self.folder / self.key(place)
        if self._is_fill(part):
            path.unlink(missing_ok=True)
            return ""
        content = ENCODER.encode(self._whole(part))
        _put(path, content)
        return bytes_checksum(content)

    def _is_fill(self, part: NDArray[Any]) -> bool:
        """A look at a few numbers spares most chunks the look at all."""
        if self.fill is None or not self._fills(part[tuple(slice(None, None, size // 3 + 1) for size in part.shape)]).all():
            return False
        return bool(self._fills(part).all())

    def _fills(self, numbers: Any) -> Any:
        return np.isnan(numbers) if self.dtype.kind == "f" else numbers == self.fill

    def _whole(self, part: NDArray[Any]) -> NDArray[Any]:
        """At the edge of the grid a chunk reaches beyond it."""
        if part.shape == self.chunks:
            return np.ascontiguousarray(part, dtype=self.dtype)
        whole = np.full(self.chunks, 0 if self.fill is None else self.fill, dtype=self.dtype)
        whole[tuple(slice(size) for size in part.shape)] = part
        return whole


def chunked_field(store: Path, name: str) -> ChunkedField:
    """A field of the store at `store`.

    Raises
    ------
    BlockError : it has none of this name. Whatever Zarr raises where its metadata cannot be read.
    """
    folder = store / name
    metadata = next((place for known in _METADATA if (place := folder / known).exists()), None)
    if metadata is None:
        raise BlockError(f"the store has no field '{name}'", where=str(store))
    stats = metadata.stat()
    return _field(folder, (stats.st_ino, stats.st_mtime_ns))


@functools.lru_cache(maxsize=64)
def _field(folder: Path, stamp: tuple[int, int]) -> ChunkedField:
    """The stamp tells this field from that of another store which took its place."""
    array = zarr.open_array(folder, mode="r")
    return ChunkedField(
        folder.name, folder, dims_of_array(array), array.shape, array.chunks, array.dtype.newbyteorder("<"),
        array.fill_value, array.metadata.encode_chunk_key,
    )


def dims_of_array(array: zarr.Array[Any]) -> tuple[str, ...]:
    """The names of the dimensions of an array of a store, in either format."""
    if array.metadata.zarr_format == 3:
        return tuple(str(dim) for dim in array.metadata.dimension_names or ())
    return tuple(str(dim) for dim in cast(list[str], array.attrs[DIMS_V2]))


def _put(path: Path, content: bytes) -> None:
    """Write a file whole or not at all."""
    temporary = path.with_name(f"{path.name}.{uuid.uuid4().hex}{PARTIAL}")
    try:
        with _opened(temporary) as file:
            file.write(content)
        temporary.replace(path)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


def _opened(path: Path) -> IO[bytes]:
    """A new file; its folder is made if it is the first there."""
    try:
        return path.open("wb")
    except FileNotFoundError:
        path.parent.mkdir(parents=True, exist_ok=True)
        return path.open("wb")
