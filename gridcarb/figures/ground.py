"""Telling solid ground from values that are missing."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.figures.levels import Level
from gridcarb.figures.moments import Moment

Mask = npt.NDArray[np.bool_]

STATUS = "solution_status"
MISSING_INPUT = 2
_MOST_STEPS = 12
"""Time steps looked at, spread over the whole axis: enough to see a cell that is wet at times, and bounded on long runs."""


def solid_ground(result: xr.Dataset, key: str, axes: Axes, level: Level, moment: Moment, empty: Mask) -> Mask:
    """Which of the `empty` cells (no value in the slice drawn) are land or sea floor; the others are missing.

    With a status field: input is missing at this level and every level below it, at every time. Without one: the field
    itself has no value at this level at any time.
    """
    if not empty.any():
        return empty
    field = result[STATUS] if STATUS in result else result[key]
    if axes.vertical in field.dims:
        vertical = str(axes.vertical)
        if STATUS not in result:
            field = field.isel({vertical: level.index})
        elif axes.vertical in result[key].dims:
            field = field.isel({vertical: sorted((level.index or 0, *level.below))})
    wet = np.zeros(empty.shape, dtype=bool)
    for step in _steps(field, axes, moment):
        values = field.isel(step).transpose(..., *axes.horizontal).values
        holds = np.isfinite(values) & (values != MISSING_INPUT) if STATUS in result else np.isfinite(values)
        wet |= holds.reshape(-1, *empty.shape).any(axis=0)
    return empty & ~wet


def _steps(field: xr.DataArray, axes: Axes, moment: Moment) -> Sequence[dict[str, int]]:
    if axes.time is None or axes.time not in field.dims:
        return [{}]
    count = field.sizes[axes.time]
    spread = np.linspace(0, count - 1, min(count, _MOST_STEPS)).round().astype(int)
    return [{axes.time: int(i)} for i in sorted({*spread.tolist(), moment.index or 0})]
