"""Compiled functions: plain Python loops made fast, without the interpreter lock, and kept on disk between processes.

Compiled code is kept in a folder of this host and of exactly the sources it was made from, so that neither a cluster's
shared home nor an edit can bring back something stale.
"""

from __future__ import annotations

import functools
import hashlib
import os
import platform
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numba

COMPILE_LOCK = threading.RLock()

# NaN and infinity must keep their meaning (land is NaN), so neither `nnan` nor `ninf`.
FLAGS = frozenset({"contract", "nsz", "arcp", "reassoc"})
"""What the compiler may do with sums and products."""


@functools.cache
def cache_folder(room: str) -> Path | None:
    """Where the compiled code of a room of the house, such as "chemistry", is kept between processes; None where no such
    place can be written.

    The path holds the host name, the Python and numba versions and a digest of the sources of the room.
    """
    digest = hashlib.sha256(f"{room} {platform.python_version()} {numba.__version__}".encode())
    house = Path(__file__).parent
    for source in (house / "compiling.py", house / "elementary.py", *sorted((house / room).rglob("*.py"))):
        digest.update(source.read_bytes())
    root = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache")
    folder = root / "gridcarb" / (platform.node() or "host") / digest.hexdigest()[:16]
    try:
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
        owned = os.access(folder, os.W_OK) and (not hasattr(os, "getuid") or folder.stat().st_uid == os.getuid())
    except OSError:
        return None
    return folder if owned else None


@contextmanager
def _own_cache_folder(folder: Path) -> Iterator[None]:
    """numba asks for its cache folder when a function is decorated; other packages' choice is put back at once."""
    before = numba.config.CACHE_DIR
    numba.config.CACHE_DIR = str(folder)
    try:
        yield
    finally:
        numba.config.CACHE_DIR = before


def compile_function(function: Callable[..., Any]) -> Any:
    """Compile a loop over arrays: without the interpreter lock, division by zero as NumPy does it."""
    options: dict[str, Any] = {"nogil": True, "error_model": "numpy", "fastmath": set(FLAGS)}
    folder = None if numba.config.DISABLE_JIT else cache_folder(function.__module__.split(".")[1])
    if folder is None:
        return numba.njit(**options)(function)
    with COMPILE_LOCK, _own_cache_folder(folder):
        return numba.njit(cache=True, **options)(function)


def plain(function: Any) -> Callable[..., Any]:
    """The Python function behind a compiled one (itself when the compiler is off)."""
    found: Callable[..., Any] = getattr(function, "py_func", function)
    return found
