"""Writing so that a reader sees the old file or the new one, and saying plainly when the disk refuses."""

from __future__ import annotations

import errno
import os
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from gridcarb.errors import OutputError

_FULL = frozenset({errno.ENOSPC, errno.EDQUOT})
_FORBIDDEN = frozenset({errno.EACCES, errno.EPERM, errno.EROFS})


def free_bytes(place: Path) -> int:
    """The bytes free on the disk that holds `place`, or would hold it."""
    return shutil.disk_usage(nearest_folder(place)).free


def nearest_folder(place: Path) -> Path:
    """`place`, or the nearest thing above it that exists."""
    place = place.absolute()
    while not place.exists() and place != place.parent:
        place = place.parent
    return place


def sized(count: float) -> str:
    """A number of bytes in words, with decimal prefixes: ``1.5 GB``."""
    for prefix in ("", "k", "M", "G"):
        if count < 1000:
            return f"{count:.3g} {prefix}B"
        count /= 1000
    return f"{count:.3g} TB"


def disk_full(place: Path, needed: int) -> OutputError:
    """The error of a disk that is full: where, how much was to be written, how much is left."""
    return OutputError(
        f"the disk is full: about {sized(needed)} were to be written here, {sized(free_bytes(place))} are free",
        where=str(place),
        mend="free some space, or give `output: {folder: ...}` on another disk in the recipe, and run again",
    )


@contextmanager
def room_for(place: Path, needed: int) -> Iterator[None]:
    """Turn what a disk says while `needed` bytes are written to `place` into an `OutputError`.

    The HDF5 library reports a full disk as a `RuntimeError` without a reason, so such an error counts as a full disk
    when less than `needed` is free at that moment. Everything else passes unchanged.
    """
    try:
        yield
    except OutputError:
        raise
    except OSError as error:
        if error.errno in _FULL:
            raise disk_full(place, needed) from error
        if error.errno in _FORBIDDEN:
            raise unwritable(place, error) from error
        raise
    except RuntimeError as error:
        if free_bytes(place) < needed:
            raise disk_full(place, needed) from error
        raise


def unwritable(place: Path, reason: object) -> OutputError:
    """The error of a folder that takes no files."""
    return OutputError(
        f"nothing can be written here ({reason})", where=str(place),
        mend="give a folder you may write to as `output: {folder: ...}` in the recipe",
    )


def settle(temporary: Path, target: Path) -> None:
    """Give a finished temporary file its final name: contents on the disk first, then the name."""
    _sync(temporary)
    temporary.replace(target)
    sync_folder(target.parent)


def sync_folder(folder: Path) -> None:
    """Bring the names in `folder` to the disk, where the system can do that."""
    if os.name == "posix":
        _sync(folder)


def _sync(path: Path) -> None:
    handle = os.open(path, os.O_RDONLY if path.is_dir() else os.O_RDWR)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
