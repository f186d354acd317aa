"""Compiled loops over lines of cells: what the summaries count and add up, in one passage and without temporaries."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.compiling import compile_function
from gridcarb.elementary import exp

Line = npt.NDArray[np.float64]
Values = npt.NDArray[np.floating[Any]]

_LN10 = math.log(10.0)
_LARGEST = float(np.finfo(np.float64).max)


def keep_weights_of(weights: Line, sea: npt.NDArray[np.bool_]) -> float:
    """Set to 0 what is no positive weight of a cell of the sea; gives the sum of the rest."""
    total = 0.0
    for i in range(weights.size):
        weights[i] = weights[i] if weights[i] > 0.0 and sea[i] else 0.0
        total += weights[i]
    return total


def weigh_line(values: Values, weights: Line) -> tuple[float, float]:
    """Sum of the weights, and of weights times values, of the cells that have a finite value.

    weights : of the same length, finite; 0 for a cell that does not count.
    """
    weight = total = 0.0
    for i in range(values.size):
        value = np.float64(values[i])
        there = abs(value) <= _LARGEST
        mine = weights[i] if there else 0.0
        weight += mine
        total += mine * (value if there else 0.0)
    return weight, total


def weigh_powers_line(values: Values, weights: Line) -> float:
    """Sum of weights times ten to the power of minus the values, of the cells that have a finite value."""
    total = 0.0
    for i in range(values.size):
        there = abs(values[i]) <= _LARGEST
        total += exp(-_LN10 * values[i]) * weights[i] if there else 0.0
    return total


def count_flags_of(flags: npt.NDArray[np.int8], counts: npt.NDArray[np.int64]) -> None:
    """Add to `counts` how often each value occurs, at the place 128 higher than the value.

    counts : 4 x 256, to be added up: neighbours are mostly alike, and counting all in one place would wait for itself.
    """
    for i in range(flags.size):
        counts[i % 4, int(flags[i]) + 128] += 1


def weigh_flags_of(flags: npt.NDArray[np.int8], weights: Line, sums: npt.NDArray[np.float64]) -> None:
    """Add to `sums`, laid out as those counts, the weights of the cells of each value."""
    for i in range(flags.size):
        sums[i % 4, int(flags[i]) + 128] += weights[i]


keep_weights = compile_function(keep_weights_of)
weigh = compile_function(weigh_line)
weigh_powers = compile_function(weigh_powers_line)
_count_flags = compile_function(count_flags_of)
_weigh_flags = compile_function(weigh_flags_of)


def count_flags(flags: npt.NDArray[np.int8]) -> dict[int, int]:
    """Value -> how often it occurs."""
    table = np.zeros((4, 256), dtype=np.int64)
    _count_flags(flags, table)
    counts = table.sum(axis=0)
    return {int(place) - 128: int(counts[place]) for place in np.flatnonzero(counts)}


def weigh_flags(flags: npt.NDArray[np.int8], weights: Line) -> dict[int, float]:
    """Value -> sum of the weights of its cells, where that is not zero."""
    table = np.zeros((4, 256))
    _weigh_flags(flags, weights, table)
    sums = table.sum(axis=0)
    return {int(place) - 128: float(sums[place]) for place in np.flatnonzero(sums)}
