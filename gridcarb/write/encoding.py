"""How a field is stored: dimensions, data type, chunks, codecs and checksums, decided in one place."""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any, Literal

import google_crc32c
import numcodecs
import numpy as np
from numpy.typing import NDArray
from zarr.codecs import BloscCodec

from gridcarb.axes import Axes
from gridcarb.fields import Field

Precision = Literal["float32", "float64"]
Selection = tuple[slice, ...]

# The threads of Blosc put their pieces into a chunk in the order they finish: its bytes would differ from run to run.
numcodecs.blosc.use_threads = False

_LEVEL = 1
ENCODER = numcodecs.Blosc(cname="zstd", clevel=_LEVEL, shuffle=numcodecs.Blosc.SHUFFLE)
"""What makes the bytes of a chunk, in either format."""

_PIECE_BYTES = 16 * 2**20
"""Coordinates are mostly read whole: one chunk, unless they are so large that memory would feel it."""


def dims_of(field: Field, axes: Axes) -> tuple[str, ...]:
    """The dimensions of `field`: those of the grid, without the vertical unless it has one value a cell."""
    return tuple(dim for dim in axes.order if field.extent == "cell" or dim != axes.vertical)


def dtype_of(field: Field, precision: Precision) -> np.dtype[np.generic]:
    """Floats of the wanted precision; a status is a signed byte."""
    return np.dtype("int8" if field.part == "status" else precision)


def chunks_of(shape: Mapping[str, int], chunks: Mapping[str, int]) -> tuple[int, ...]:
    """The chunk lengths along each dimension of `shape`: as in `chunks`, the whole length where nothing is said."""
    return tuple(max(1, min(chunks.get(dim, size), size)) for dim, size in shape.items())


def split_chunks(shape: Sequence[int], itemsize: int) -> tuple[int, ...]:
    """The chunk of a coordinate: all of it, or as much of its leading dimensions as makes a piece of 16 MiB."""
    chunk = [max(1, size) for size in shape]
    for axis, size in enumerate(chunk):
        rest = itemsize * int(np.prod(chunk[axis + 1 :], dtype=np.int64))
        chunk[axis] = max(1, min(size, _PIECE_BYTES // rest))
        if rest <= _PIECE_BYTES:
            break
    return tuple(chunk)


def pieces(shape: Sequence[int], chunks: Sequence[int]) -> Iterator[Selection]:
    """The chunks of an array as slices, the last dimension fastest."""
    starts = (range(0, size, chunk) for size, chunk in zip(shape, chunks, strict=True))
    for corner in itertools.product(*starts):
        yield tuple(slice(at, min(at + chunk, size)) for at, chunk, size in zip(corner, chunks, shape, strict=True))


def fill_of(dtype: np.dtype[Any], zarr_format: Literal[2, 3], *, missing: bool) -> object:
    """What an array holds where nothing was written; with `missing`, readers take it for missing data: then it is NaN.

    A status or a coordinate has no missing data. Readers of format 2 take any fill for missing, so there it is None;
    format 3 demands one, and the lowest integer is none of the flags, so an unwritten status is not read as solved.
    """
    if missing:
        return np.nan
    if zarr_format == 2:
        return None
    if dtype.kind == "O":
        return ""
    return np.nan if dtype.kind == "f" else int(np.iinfo(dtype).min)


def compressor(zarr_format: Literal[2, 3]) -> BloscCodec | numcodecs.Blosc:
    """Zstandard at level 1 behind a byte shuffle, in the Blosc container.

    Blosc is the one codec with a shuffle that the core of both Zarr formats specifies, so every implementation reads it;
    plain Zstandard has no shuffle there, and smooth floats then take a third more room.
    """
    return ENCODER if zarr_format == 2 else BloscCodec(cname="zstd", clevel=_LEVEL, shuffle="shuffle")


def stored(values: NDArray[np.generic], dtype: np.dtype[np.generic]) -> NDArray[np.generic]:
    """`values` as they are kept: float64 is rounded to float32 here and nowhere else."""
    with np.errstate(over="ignore"):  # beyond the float32 range: infinity is what that format has
        return np.asarray(values, dtype=dtype, order="C")


def checksum(values: NDArray[np.generic]) -> str:
    """A CRC-32C of the bytes of C-ordered `values` in little-endian order, to find damage, not malice."""
    return bytes_checksum(values.astype(values.dtype.newbyteorder("<"), copy=False))


def bytes_checksum(content: bytes | NDArray[np.generic]) -> str:
    """The same of bytes."""
    return f"crc32c:{google_crc32c.value(content):08x}"


def file_checksum(path: Path) -> str:
    """The same of the bytes of a file of any size; "" if there is none."""
    so_far = 0
    try:
        with path.open("rb") as file:
            while piece := file.read(_PIECE_BYTES):
                so_far = google_crc32c.extend(so_far, piece)
    except FileNotFoundError:
        return ""
    return f"crc32c:{so_far:08x}"
