"""Holding a result against what was noted when it was written: file by file, chunk by chunk."""

from __future__ import annotations

import os
import shutil
import zlib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import zarr

from gridcarb.netcdf_lock import NETCDF_LOCK
from gridcarb.write.disk import room_for, settle
from gridcarb.write.encoding import checksum, file_checksum
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
        return [name for name, sum_then in noted.items() if file_checksum(self.store / name) != sum_then]

    def files(self, marker: Marker) -> Iterator[tuple[str, Path, str]]:
        """Field, chunk file and noted checksum of everything the block of `marker` has in the store.

        Raises whatever Zarr raises where the metadata of a field cannot be read.
        """
        for field, noted in marker.chunks.items():
            array = self._array(field)
            region = marker.slices()
            selection = [slice(*region.get(dim, slice(None)).indices(size)[:2])
                         for dim, size in zip(dims_of_array(array), array.shape, strict=True)]  # fmt: skip
            for path, sum_then in zip(chunk_files(self.store / field, array, selection), noted, strict=True):
                yield field, path, sum_then

    def damaged_chunks(self, marker: Marker) -> list[tuple[str, Path]]:
        """Field and file of each chunk of a block that is not as its marker says."""
        return [(field, path) for field, path, sum_then in self.files(marker) if file_checksum(path) != sum_then]

    def _array(self, field: str) -> zarr.Array[Any]:
        if field not in self._arrays:
            self._arrays[field] = zarr.open_array(self.store / field, mode="r")
        return self._arrays[field]


class FileProof:
    """The NetCDF file of a result, to be held against the markers of its blocks; one that is not there is not damaged."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._file: netCDF4.Dataset | None = None
        self._opens = path.is_file()

    def __enter__(self) -> FileProof:
        if self._opens:
            with NETCDF_LOCK:
                try:
                    self._file = netCDF4.Dataset(self._path)
                    self._file.set_auto_maskandscale(False)
                except (OSError, RuntimeError):  # which is told of the file as a whole
                    self._opens = False
        return self

    def __exit__(self, *_: object) -> None:
        if self._file is not None:
            with NETCDF_LOCK:
                self._file.close()

    def damaged_fields(self, marker: Marker) -> list[str]:
        """The fields whose numbers in the file are not those the block of `marker` has written."""
        return [field for field, noted in marker.values.items() if self._opens and self._checksum(field, marker) != noted]

    def _checksum(self, field: str, marker: Marker) -> str:
        assert self._file is not None
        region = marker.slices()
        with NETCDF_LOCK:
            try:
                variable = self._file.variables[field]
                values = variable[tuple(region.get(dim, slice(None)) for dim in variable.dimensions)]
            except (KeyError, OSError, RuntimeError):
                return "unreadable"
        return checksum(np.ascontiguousarray(values))


def large_file_checksum(path: Path) -> str:
    """Checksum of a file of any size; "" if there is none."""
    so_far = 0
    try:
        with path.open("rb") as file:
            while piece := file.read(_PIECE):
                so_far = zlib.crc32(piece, so_far)
    except FileNotFoundError:
        return ""
    return f"crc32:{so_far:08x}"


def put_file(source: Path, target: Path) -> None:
    """Give `target` the bytes of `source`, whole or not at all; if there is no source there is no target either."""
    if not source.exists():
        target.unlink(missing_ok=True)
        return
    target.parent.mkdir(parents=True, exist_ok=True)
    temporary = target.with_name(f".{target.name}.{os.getpid()}")
    with room_for(target, source.stat().st_size):
        shutil.copyfile(source, temporary)
        settle(temporary, target)


def sweep_store(store: Path) -> None:
    """Remove what writers that were killed have left half written: Zarr gives it this ending until it is whole."""
    for path in store.rglob("*.partial"):
        path.unlink(missing_ok=True)
