"""The one place that knows what lies behind a path: a NetCDF file or a Zarr store, and how it is opened."""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import Any, BinaryIO, Literal

import xarray as xr

from gridcarb.errors import InputError
from gridcarb.sources.classic import expected_length

Kind = Literal["netcdf", "zarr"]

_CLASSIC = (b"CDF\x01", b"CDF\x02", b"CDF\x05")
_HDF5 = b"\x89HDF\r\n\x1a\n"
_HDF5_STARTS = (0, 512, 1024, 2048, 4096, 8192, 16384, 32768)
"""An HDF5 file may begin with a block of the user's own, of 512 bytes doubled any number of times."""

_ZARR_METADATA = ("zarr.json", ".zgroup", ".zmetadata", ".zattrs", ".zarray")
_HEAD_BYTES = 65536
_AS_STORED: dict[str, Any] = {"decode_cf": False, "mask_and_scale": False, "decode_times": False, "cache": False}


def storage_kind(path: str) -> Kind:
    """What lies behind `path`, told by its first bytes or its metadata files, never by its name.

    Raises
    ------
    InputError : there is nothing, or it is neither a NetCDF file nor a Zarr store.
    """
    place = Path(path)
    if place.is_dir():
        if any((place / name).is_file() for name in _ZARR_METADATA):
            return "zarr"
        raise InputError("this is a folder, not a Zarr store", where=path, mend=f"write `{path}/*.nc` for the files in it")
    if not place.exists():
        raise InputError("there is no such file", where=path, mend="correct the path; it is relative to the recipe")
    if not place.stat().st_size:
        raise InputError("the file is empty (0 bytes)", where=path,
                         mend="copy it again from its origin, or leave it out of `inputs: files`")
    try:
        with place.open("rb") as file:
            if file.read(4) in _CLASSIC or any(_signature(file, at) == _HDF5 for at in _HDF5_STARTS):
                return "netcdf"
    except OSError as error:
        raise InputError(f"the file cannot be read: {error.strerror}", where=path, mend="check its permissions") from None
    raise InputError("this is neither a NetCDF file nor a Zarr store", where=path, mend="leave it out of `inputs: files`")


def _signature(file: BinaryIO, at: int) -> bytes:
    file.seek(at)
    return file.read(len(_HDF5))


def open_raw(path: str) -> xr.Dataset:
    """The dataset behind `path` with numbers and attributes as stored; the caller holds the lock of its kind."""
    kind = storage_kind(path)
    if kind == "netcdf":
        _refuse_short_classic(path)
    words = {"engine": "zarr", "consolidated": False} if kind == "zarr" else {"engine": "netcdf4"}
    try:
        dataset = xr.open_dataset(path, chunks=None, **words, **_AS_STORED)
        groups = {} if dataset.variables else xr.open_groups(path, **words, **_AS_STORED)
    except Exception as error:
        # The libraries raise many classes for damaged files; all of them mean the same to the user.
        raise unreadable(path, error) from error
    for group in groups.values():
        group.close()
    if len(groups) > 1:
        dataset.close()
        names = ", ".join(name.strip("/") for name in groups if name != "/")
        raise InputError(f"all variables of the file lie in groups ({names}), which are not read", where=path,
                         mend="copy the group with the variables to the top level of a file of its own")
    return dataset


def unreadable(path: str, error: Exception) -> InputError:
    """The error for a file that opens wrongly or breaks off."""
    return InputError(
        f"the file is damaged or cut short ({type(error).__name__}: {error})", where=path,
        mend="copy it again from its origin and compare the sizes",
    )


def _refuse_short_classic(path: str) -> None:
    place = Path(path)
    with place.open("rb") as file:
        if file.read(4) not in _CLASSIC:
            return
    try:
        expected = expected_length(place)
    except (EOFError, KeyError, IndexError) as error:
        raise unreadable(path, error) from error
    size = place.stat().st_size
    if expected is not None and size < expected:
        raise InputError(
            f"the file is cut short: its header promises {expected} bytes, it has {size}", where=path,
            mend="copy it again from its origin",
        )


def stamp(path: str) -> tuple[int, int]:
    """Size in bytes and time of the last change (ns); for a Zarr store, those of its metadata files."""
    stats = [place.stat() for place in _head_files(Path(path))]
    return sum(stat.st_size for stat in stats), max((stat.st_mtime_ns for stat in stats), default=0)


def fingerprint(path: str) -> str:
    """SHA-256 (hex) of the first 64 kB of a file, or of all metadata of a Zarr store."""
    digest = hashlib.sha256()
    for place in _head_files(Path(path)):
        with place.open("rb") as file:
            digest.update(file.read(_HEAD_BYTES))
    return digest.hexdigest()


def _head_files(place: Path) -> list[Path]:
    if not place.is_dir():
        return [place]
    folders = [place, *sorted(entry for entry in place.iterdir() if entry.is_dir())]
    return [folder / name for folder in folders for name in _ZARR_METADATA if (folder / name).is_file()]
