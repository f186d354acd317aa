"""A bounded number of open files for the whole process, and the one way to read from them.

Nothing here is ever pickled: arrays carry paths, and a worker process fills its own handles.
"""

from __future__ import annotations

import contextlib
import math
import os
import threading
import time
from collections import OrderedDict
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from typing import Any, TypeVar

import numpy as np
import numpy.typing as npt

from gridcarb.errors import InputError
from gridcarb.netcdf_lock import NETCDF_LOCK
from gridcarb.sources.places import is_url, split
from gridcarb.sources.storage import kind_behind_url, open_stored, stamp, storage_kind, unreadable
from gridcarb.sources.stored import Key, Stored

T = TypeVar("T")

LIMIT = 32
"""Most files of one kind held open at a time."""

LOOK_AGAIN = 1.0
"""Seconds after which an open file is looked at again, whether it has changed."""


@dataclass(frozen=True)
class Layout:
    """How a variable lies in its file.

    stamp : what tells the file from a later one at its path.
    chunks : None if it is contiguous.
    """

    stamp: tuple[int, int]
    shape: tuple[int, ...]
    dtype: np.dtype[Any]
    chunks: tuple[int, ...] | None


@dataclass
class _Held:
    stamp: tuple[int, int]
    stored: Stored
    looked_at: float = 0.0
    layouts: dict[str, Layout] = field(default_factory=dict)


class Handles:
    """Open files by path, the least recently used closed first; a file of this disk that changed since is opened anew."""

    def __init__(self, lock: contextlib.AbstractContextManager[Any], limit: int = LIMIT) -> None:
        self.lock = lock
        self.limit = limit
        self._open: OrderedDict[str, _Held] = OrderedDict()

    def __len__(self) -> int:
        return len(self._open)

    def stored(self, path: str) -> Stored:
        """The open file or store; the caller holds the lock while it uses it, unless the kind needs none."""
        return self._held(path).stored

    def layout(self, path: str, variable: str) -> Layout:
        """How a variable lies in its file; the caller holds the lock, unless the kind needs none."""
        held = self._held(path)
        if variable not in held.layouts:
            held.layouts[variable] = Layout(held.stamp, *held.stored.layout(variable))
        return held.layouts[variable]

    def _held(self, path: str) -> _Held:
        with self.lock:
            held, now = self._open.pop(path, None), time.monotonic()
            if held is None or now - held.looked_at >= LOOK_AGAIN:
                stamped = (0, 0) if is_url(path) else stamp(path)
                if held is not None and held.stamp != stamped:
                    held.stored.close()
                    held = None
                while len(self._open) >= self.limit:
                    self._open.popitem(last=False)[1].stored.close()
                held = held or _Held(stamped, open_stored(path))
                held.looked_at = now
            self._open[path] = held
            return held

    def look_again(self) -> None:
        """Look at every open file, whether it has changed, before it is read the next time."""
        with self.lock:
            for held in self._open.values():
                held.looked_at = -math.inf

    def close(self) -> None:
        """Close everything."""
        with self.lock:
            while self._open:
                self._open.popitem()[1].stored.close()

    def forget(self) -> None:
        """After a fork: the parent's handles are not the child's to use or to close."""
        self._open = OrderedDict()


NETCDF_HANDLES = Handles(NETCDF_LOCK)
ZARR_HANDLES = Handles(threading.RLock())
if hasattr(os, "register_at_fork"):
    os.register_at_fork(after_in_child=NETCDF_HANDLES.forget)
    os.register_at_fork(after_in_child=ZARR_HANDLES.forget)


def read(path: str, variable: str, key: Key) -> npt.NDArray[Any]:
    """The part `key` of one variable, as stored.

    Raises
    ------
    InputError : the file is gone, damaged, or no longer holds the variable.
    """
    return _of(path, variable, lambda handles: handles.stored(path).read(variable, key))


def layout_of(path: str, variable: str) -> Layout:
    """How a variable lies in its file; InputError as for `read`."""
    return _of(path, variable, lambda handles: handles.layout(path, variable))


def _of(path: str, variable: str, ask: Callable[[Handles], T]) -> T:
    try:
        zarr = _is_zarr(path)
        handles = ZARR_HANDLES if zarr else NETCDF_HANDLES
        # NetCDF is read under the lock of the whole process; Zarr reads run side by side.
        with contextlib.nullcontext() if zarr else handles.lock:
            return ask(handles)
    except InputError:
        raise
    except (KeyError, FileNotFoundError):
        raise InputError(
            f"the variable '{variable}' is no longer there: the file was moved or changed while it was in use",
            where=path, mend="put the file back, or run again with what is there now",
        ) from None
    except (OSError, RuntimeError, ValueError) as error:
        raise unreadable(f"{path}: {variable}", error) from error


def look_again() -> None:
    """Files may have changed since they were read last: notice it at the next reading, however soon that is."""
    NETCDF_HANDLES.look_again()
    ZARR_HANDLES.look_again()


def close_all() -> None:
    """Close every file this process still holds open for reading."""
    NETCDF_HANDLES.close()
    ZARR_HANDLES.close()
    kind_behind_url.cache_clear()


def _is_zarr(path: str) -> bool:
    return storage_kind(path) == "zarr" if is_url(path) else os.path.isdir(split(path)[0])


@contextlib.contextmanager
def opened(path: str) -> Iterator[Stored]:
    """The file or store behind `path` for a look at its header, closed afterwards."""
    with ZARR_HANDLES.lock if storage_kind(path) == "zarr" else NETCDF_LOCK:
        stored = open_stored(path)
        try:
            yield stored
        finally:
            stored.close()
