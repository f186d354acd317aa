"""Telling solid ground from values that are missing."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.figures.choice import Choice

Mask = npt.NDArray[np.bool_]

STATUS = "solution_status"
MISSING_INPUT = 2
_MOST_STEPS = 12
"""Time steps looked at, spread over the whole axis: enough to see a cell that is wet at times, and bounded on long runs."""


def solid_ground(result: xr.Dataset, choice: Choice, empty: Mask) -> Mask:
    """Which of the `empty` cells (no value in the slice drawn) are land or sea floor; the others are missing.

    With a status field: input is missing at this level and every level below it, at every time. Without one: the field
    itself has no value at this level at any time.
    """
    if not empty.any():
        return empty
    axes = choice.axes
    told = STATUS in result
    field = result[STATUS] if told else result[choice.key]
    if axes.vertical in field.dims and axes.vertical in result[choice.key].dims and choice.level.within is None:
        levels = sorted((choice.level.index or 0, *(choice.level.below if told else ())))
        field = field.isel({axes.vertical: levels})
    wet = np.zeros(empty.shape, dtype=bool)
    for step in _steps(field, choice):
        values = field.isel(step).transpose(..., *axes.horizontal).values
        holds = np.isfinite(values) & (values != MISSING_INPUT) if told else np.isfinite(values)
        wet |= holds.reshape(-1, *empty.shape).any(axis=0)
    return empty & ~wet


def _steps(field: xr.DataArray, choice: Choice) -> list[dict[str, int]]:
    time = choice.axes.time
    if time is None or time not in field.dims:
        return [{}]
    count = field.sizes[time]
    spread = np.linspace(0, count - 1, min(count, _MOST_STEPS)).round().astype(int)
    return [{time: int(at)} for at in sorted({*spread.tolist(), choice.moment.index or 0})]
