"""Holding a result against what was noted when it was written: file by file, chunk by chunk."""

from __future__ import annotations

import zlib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

import zarr

from gridcarb.write.encoding import file_checksum
from gridcarb.write.ledger import Marker
from gridcarb.write.store import chunk_files, dims_of_array

_PIECE = 16 * 2**20


class Proof:
    """A Zarr store to be held against its frame (metadata and coordinates) and against the markers of its blocks."""

    def __init__(self, store: Path) -> None:
        self.store = store
        self._arrays: dict[str, zarr.Array[Any]] = {}

    def frame(self) -> dict[str, str]:
        """Checksum of every file of a store whose fields are still empty."""
        return {
            path.relative_to(self.store).as_posix(): file_checksum(path)
            for path in sorted(self.store.rglob("*")) if path.is_file()
        }  # fmt: skip

    def damaged_frame(self, noted: Mapping[str, str]) -> list[str]:
        """The files of the frame that are not as noted, or gone."""
        return [name for name, checksum in noted.items() if file_checksum(self.store / name) != checksum]

    def files(self, marker: Marker) -> Iterator[tuple[str, Path, str]]:
        """Field, chunk file and noted checksum of everything the block of `marker` has in the store.

        Raises whatever Zarr raises where the metadata of a field cannot be read.
        """
        for field, noted in marker.chunks.items():
            array = self._array(field)
            region = marker.slices()
            selection = [slice(*region.get(dim, slice(None)).indices(size)[:2])
                         for dim, size in zip(dims_of_array(array), array.shape, strict=True)]  # fmt: skip
            for path, checksum in zip(chunk_files(self.store, array, selection), noted, strict=True):
                yield field, path, checksum

    def damaged_chunks(self, marker: Marker) -> list[tuple[str, Path]]:
        """Field and file of each chunk of a block that is not as its marker says."""
        return [(field, path) for field, path, checksum in self.files(marker) if file_checksum(path) != checksum]

    def _array(self, field: str) -> zarr.Array[Any]:
        if field not in self._arrays:
            self._arrays[field] = zarr.open_array(self.store / field, mode="r")
        return self._arrays[field]


def large_file_checksum(path: Path) -> str:
    """Checksum of a file of any size; "" if there is none."""
    checksum = 0
    try:
        with path.open("rb") as file:
            while piece := file.read(_PIECE):
                checksum = zlib.crc32(piece, checksum)
    except FileNotFoundError:
        return ""
    return f"crc32:{checksum:08x}"


def sweep_store(store: Path) -> None:
    """Remove what writers that were killed have left half written: Zarr gives it this ending until it is whole."""
    for path in store.rglob("*.partial"):
        path.unlink(missing_ok=True)
