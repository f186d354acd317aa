"""The one place that knows what lies behind a path: a NetCDF file or a Zarr store, and how it is opened."""

from __future__ import annotations

import functools
import hashlib
from pathlib import Path
from typing import BinaryIO, Literal

from gridcarb.errors import InputError
from gridcarb.sources.classic import expected_length
from gridcarb.sources.netcdf_file import NetcdfFile
from gridcarb.sources.places import is_url, reached, split
from gridcarb.sources.stored import Stored
from gridcarb.sources.zarr_store import ZarrStore

Kind = Literal["netcdf", "zarr"]

_CLASSIC = (b"CDF\x01", b"CDF\x02", b"CDF\x05")
_HDF5 = b"\x89HDF\r\n\x1a\n"
_HDF5_STARTS = (0, 512, 1024, 2048, 4096, 8192, 16384, 32768)
"""An HDF5 file may begin with a block of the user's own, of 512 bytes doubled any number of times."""

_ZARR_METADATA = ("zarr.json", ".zgroup", ".zmetadata", ".zattrs", ".zarray")
_HEAD_BYTES = 65536


def storage_kind(path: str) -> Kind:
    """What lies behind `path`, told by its first bytes or its metadata files, never by its name.

    Raises
    ------
    InputError : there is nothing, or it is neither a NetCDF file nor a Zarr store.
    """
    store = split(path)[0]
    if is_url(store):
        return kind_behind_url(store)
    place = Path(store)
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
    raise _neither(path)


@functools.lru_cache(maxsize=10_000)
def kind_behind_url(store: str) -> Kind:
    """What lies behind a URL, asked once as long as files are kept open."""
    with reached(store) as (system, inner):
        if any(system.exists(f"{inner}/{name}") for name in _ZARR_METADATA[:2]):
            return "zarr"
        if not system.isfile(inner):
            raise InputError("there is no file and no Zarr store", where=store, mend="correct `inputs: files`")
        head = system.cat_file(inner, start=0, end=_HDF5_STARTS[-1] + len(_HDF5))
    if head[:4] in _CLASSIC or any(head[at:at + len(_HDF5)] == _HDF5 for at in _HDF5_STARTS):
        return "netcdf"
    raise _neither(store)


def _neither(path: str) -> InputError:
    return InputError("this is neither a NetCDF file nor a Zarr store", where=path, mend="leave it out of `inputs: files`")


def _signature(file: BinaryIO, at: int) -> bytes:
    file.seek(at)
    return file.read(len(_HDF5))


def open_stored(path: str) -> Stored:
    """The file or store behind `path`, numbers and attributes as stored; the caller holds the lock of its kind."""
    kind = storage_kind(path)
    if kind == "netcdf" and not is_url(path):
        _refuse_short_classic(path)
    try:
        return ZarrStore(path) if kind == "zarr" else NetcdfFile(path)
    except InputError:
        raise
    except Exception as error:
        # The libraries raise many classes for damaged files; all of them mean the same to the user.
        raise unreadable(path, error) from error


def unreadable(path: str, error: Exception) -> InputError:
    """The error for a file that opens wrongly or breaks off."""
    return InputError(
        f"the file is damaged or cut short ({type(error).__name__}: {error})", where=path,
        mend="copy it again from its origin and compare the sizes",
    )


def _refuse_short_classic(path: str) -> None:
    place = Path(split(path)[0])
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
    """Size in bytes and time of the last change (ns, 0 if unknown); for a Zarr store, those of its metadata files."""
    store = split(path)[0]
    if is_url(store):
        return _stamp_behind_url(store)
    stats = [place.stat() for place in _head_files(Path(store))]
    return sum(stat.st_size for stat in stats), max((stat.st_mtime_ns for stat in stats), default=0)


def _stamp_behind_url(store: str) -> tuple[int, int]:
    with reached(store) as (system, inner):
        heads = _heads_behind_url(store)
        found = [system.info(place) for place in heads or [inner]]
    changed = [entry.get("LastModified") or entry.get("mtime") or entry.get("created") for entry in found]
    times = [int(time.timestamp() * 1e9) for time in changed if hasattr(time, "timestamp")]
    return sum(int(entry.get("size") or 0) for entry in found), max(times, default=0)


def _heads_behind_url(store: str) -> list[str]:
    """The metadata files at the top of a Zarr store; none for a file."""
    with reached(store) as (system, inner):
        return [place for name in _ZARR_METADATA if system.exists(place := f"{inner}/{name}")]


def fingerprint(path: str) -> str:
    """SHA-256 (hex) of the first 64 kB of a file, or of all metadata of a Zarr store."""
    digest, store = hashlib.sha256(), split(path)[0]
    if is_url(store):
        with reached(store) as (system, inner):
            for place in _heads_behind_url(store) or [inner]:
                digest.update(system.cat_file(place, start=0, end=_HEAD_BYTES))
        return digest.hexdigest()
    for head in _head_files(Path(store)):
        with head.open("rb") as file:
            digest.update(file.read(_HEAD_BYTES))
    return digest.hexdigest()


def _head_files(place: Path) -> list[Path]:
    if not place.is_dir():
        return [place]
    folders = [place, *sorted(entry for entry in place.iterdir() if entry.is_dir())]
    return [folder / name for folder in folders for name in _ZARR_METADATA if (folder / name).is_file()]
