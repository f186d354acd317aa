"""Holding a result against what was noted when it was written: file by file, chunk by chunk."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator, Mapping
from pathlib import Path

import netCDF4
import numpy as np

from gridcarb.netcdf_lock import NETCDF_LOCK
from gridcarb.write.chunks import PARTIAL, chunked_field
from gridcarb.write.disk import room_for, settle
from gridcarb.write.encoding import checksum, file_checksum
from gridcarb.write.ledger import Marker


class Proof:
    """A Zarr store to be held against its frame (metadata and coordinates) and against the markers of its blocks."""

    def __init__(self, store: Path) -> None:
        self.store = store

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
            found = chunked_field(self.store, field)
            for path, sum_then in zip(found.files(found.selection(marker.slices())), noted, strict=True):
                yield field, path, sum_then

    def damaged_chunks(self, marker: Marker) -> list[tuple[str, Path]]:
        """Field and file of each chunk of a block that is not as its marker says."""
        return [(field, path) for field, path, sum_then in self.files(marker) if file_checksum(path) != sum_then]


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
    for path in store.rglob(f"*{PARTIAL}"):
        path.unlink(missing_ok=True)
