"""Compiling: scalar functions of one cell, and short loops that run them over a tile of cells.

A published equation stays a plain scalar function. `scalar` compiles it; `tile_loop` wraps it in one short loop over a
tile, which LLVM turns into vector instructions. Every loop always runs over the whole tile (the last tile of a grid is
padded), so that each cell meets the same instructions wherever it lies: results do not depend on chunking or threads.
"""

from __future__ import annotations

import hashlib
import inspect
from collections.abc import Callable
from typing import Any

import numba

from gridcarb.compiling import FLAGS, compile_function, plain

TILE = 2048
"""Cells in a tile: the rows of a whole solution stay in the second-level cache."""


def scalar(function: Callable[..., Any]) -> Any:
    """Compile a function of one cell, to be inlined into a tile loop. `.py_func` stays the plain source."""
    return numba.njit(nogil=True, error_model="numpy", fastmath=set(FLAGS))(function)


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
