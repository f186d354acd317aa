"""Compiling: scalar functions of one cell, and short loops that run them over a tile of cells.

A published equation stays a plain scalar function. `scalar` compiles it; `tile_loop` wraps it in one short loop over a
tile, which LLVM turns into vector instructions. Every loop always runs over the whole tile (the last tile of a grid is
padded), so that each cell meets the same instructions wherever it lies: results do not depend on chunking or threads.

Compiled code is kept on disk in a folder of this host and of exactly these sources, so that neither a cluster's shared
home nor an edit can bring back something stale.
"""

from __future__ import annotations

import functools
import hashlib
import inspect
import os
import platform
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numba

TILE = 2048
"""Cells in a tile: the rows of a whole solution stay in the second-level cache."""

COMPILE_LOCK = threading.RLock()

# NaN and infinity must keep their meaning (land is NaN), so neither `nnan` nor `ninf`.
_FLAGS = {"contract", "nsz", "arcp", "reassoc"}


@functools.cache
def cache_folder() -> Path | None:
    """Where compiled code is kept between processes, or None where no such place can be written.

    The path holds the host name, the Python and numba versions and a digest of the sources of this package.
    """
    digest = hashlib.sha256(f"{platform.python_version()} {numba.__version__}".encode())
    for source in sorted(Path(__file__).parent.rglob("*.py")):
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
    """Compile for one cell or one tile: without the interpreter lock, division by zero as NumPy does it."""
    options: dict[str, Any] = {"nogil": True, "error_model": "numpy", "fastmath": _FLAGS}
    folder = None if numba.config.DISABLE_JIT else cache_folder()
    if folder is None:
        return numba.njit(**options)(function)
    with COMPILE_LOCK, _own_cache_folder(folder):
        return numba.njit(cache=True, **options)(function)


def scalar(function: Callable[..., Any]) -> Any:
    """Compile a function of one cell, to be inlined into a tile loop. `.py_func` stays the plain source."""
    return numba.njit(nogil=True, error_model="numpy", fastmath=_FLAGS)(function)


def plain(function: Any) -> Callable[..., Any]:
    """The Python function behind a compiled one (itself when the compiler is off)."""
    found: Callable[..., Any] = getattr(function, "py_func", function)
    return found


def arguments(function: Any) -> tuple[str, ...]:
    """The names of a scalar function's arguments: the columns it reads."""
    return tuple(inspect.signature(plain(function)).parameters)


_loops: dict[str, tuple[str, dict[str, Any]]] = {}


def tile_function(name: str, columns: tuple[str, ...], lines: list[str], uses: dict[str, Any]) -> Any:
    """A compiled function of the lines given; its name is made this function's own by a digest of them."""
    body = "".join(f"    {line}\n" for line in lines)
    own = f"{name}_{hashlib.sha256(body.encode()).hexdigest()[:12]}"
    space: dict[str, Any] = {**uses, "__name__": __name__}
    exec(compile(f"def {own}({', '.join(columns)}):\n{body}", __file__, "exec"), space)
    return compile_function(space[own])


def tile_loop(name: str, columns: tuple[str, ...], expression: str, uses: dict[str, Any]) -> Any:
    """One short loop over a tile: ``loop(scratch, out, *rows)`` sets row `out` to `expression` of the named columns.

    The loop is written out as source because its number of arguments differs from equation to equation; `uses` gives
    the compiled scalar functions and numbers that the expression names. Rows are passed by number: one array is
    cheaper to hand over than eight. The name must be this loop's alone: compiled code is kept under it.
    """
    source = (
        f"def {name}(scratch, out, {', '.join(f'row_{column}' for column in columns)}):\n"
        "    filled = scratch[out]\n"
        + "".join(f"    all_{column} = scratch[row_{column}]\n" for column in columns)
        + f"    for i in range({TILE}):\n"
        + "".join(f"        {column} = all_{column}[i]\n" for column in columns)
        + f"        filled[i] = {expression}\n"
    )
    if _loops.setdefault(name, (expression, uses)) != (expression, uses):
        raise RuntimeError(f"two different loops are called '{name}': their compiled code would be confused on disk")
    space: dict[str, Any] = {**uses, "__name__": __name__}
    exec(compile(source, __file__, "exec"), space)
    return compile_function(space[name])
