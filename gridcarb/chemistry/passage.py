"""The way of the cells through the tiles: all of it compiled, so that threads never wait for the interpreter.

Cells are taken from the inputs, solved tile by tile, and put into the results. The last tile is padded with ordinary water
up to the full length, so that every cell of every grid goes through the same instructions.
"""

from __future__ import annotations

import types
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.chemistry.compiled import TILE
from gridcarb.chemistry.status import MISSING, Flags, judge
from gridcarb.compiling import compile_function, plain

Numbers = npt.NDArray[np.float64]
Results = npt.NDArray[np.floating[Any]]
Places = npt.NDArray[np.intp]

TO_CANONICAL = (1.0, 1.0, 0.1, 1e-6, 1e-6, 1e-6, 1e-6)
"""Factors from degC, 1, dbar and four times umol/kg to degC, 1, bar and mol/kg."""

PADDING = (15.0, 35.0, 0.0, 2.1e-3, 2.3e-3, 0.0, 0.0)


def take(scratch: Numbers, inputs: tuple[Numbers, ...], wet: Places, everywhere: bool, start: int, count: int) -> None:
    """Fill the input rows of a tile with `count` cells: from `start` on, or the places in `wet` from `start` on."""
    for row in range(7):
        values = inputs[row]
        factor = TO_CANONICAL[row]
        filled = scratch[row]
        if values.size == 1:
            for i in range(count):
                filled[i] = values[0] * factor
        elif everywhere:
            for i in range(count):
                filled[i] = values[start + i] * factor
        else:
            for i in range(count):
                filled[i] = values[wet[start + i]] * factor
        for i in range(count, TILE):
            filled[i] = PADDING[row]


def give(
    results: Results, status: Flags, scratch: Numbers, flags: Flags, outputs: Places, wet: Places, everywhere: bool,
    start: int, count: int, worst: int,
) -> None:  # fmt: skip
    """Put the fields of a tile into the results, NaN where a cell was not solved or is left out before the next one."""
    for field in range(outputs.size):
        filled = scratch[outputs[field]]
        line = results[field]
        if worst >= MISSING:
            for i in range(count):
                if flags[i] >= MISSING:
                    filled[i] = np.nan
        if everywhere:
            for i in range(count):
                line[start + i] = filled[i]
        else:
            first = wet[start - 1] + 1 if start else 0
            last = line.size if start + count == wet.size else wet[start + count - 1] + 1
            line[first:last] = np.nan
            for i in range(count):
                line[wet[start + i]] = filled[i]
    for i in range(count):
        status[start + i if everywhere else wet[start + i]] = flags[i]


_take = compile_function(take)
_give = compile_function(give)


def solve_cells(
    inputs: tuple[Numbers, ...], results: Results, status: Flags, wet: Places, everywhere: bool, scratch: Numbers,
    flags: Flags, outputs: Places, ranges: tuple[float, float, float, float],
) -> None:  # fmt: skip
    """Solve all cells with the tile function that is called `_tile` where this runs (see `solve_cells_with`).

    inputs : seven float64 lines, each of one number or of all cells. results : fields x cells, of either precision.
    status : cells, int8. wet : places of the cells to solve, at least one, unless `everywhere`. scratch : rows x TILE.
    outputs : row of each field.
    ranges : lowest and highest temperature and salinity in which the constants were measured.
    """
    total = status.size if everywhere else wet.size
    for start in range(0, total, TILE):
        count = min(TILE, total - start)
        _take(scratch, inputs, wet, everywhere, start, count)
        judge(
            flags, scratch[0], scratch[1], scratch[2], scratch[3], scratch[4], scratch[5], scratch[6],
            ranges[0], ranges[1], ranges[2], ranges[3],
        )  # fmt: skip
        worst = _tile(scratch, flags)  # type: ignore[name-defined]  # noqa: F821
        _give(results, status, scratch, flags, outputs, wet, everywhere, start, count, worst)


def solve_cells_with(tile: Any) -> Any:
    """`solve_cells`, compiled with the tile function of a program.

    It finds that function among its globals, not in a closure: compiled code that depends on a closure is never found again
    on disk. Its names are the tile's, since it is kept under them: under one name another tile's code would be found.
    """
    function = types.FunctionType(solve_cells.__code__, {**globals(), "_tile": tile})
    function.__name__ = function.__qualname__ = f"cells_of_{plain(tile).__name__}"
    return compile_function(function)
