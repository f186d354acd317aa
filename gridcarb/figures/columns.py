"""The level nearest to a depth in every column, where levels follow the sea floor or the depth is a field."""

from __future__ import annotations

import gsw
import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.figures.choice import Choice
from gridcarb.figures.corners import degrees
from gridcarb.figures.ground import MISSING_INPUT, STATUS
from gridcarb.figures.levels import depths_of

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]


def slice_at(ds: xr.Dataset, choice: Choice) -> tuple[xr.DataArray, Mask]:
    """The horizontal slice a figure shows, and where the water column ends above its depth.

    Where the level differs from column to column, the nearest one with water is taken; the column ends as far below its
    deepest as half the step above that. Levels are read one after the other.
    """
    if choice.level.within is None:
        found = choice.slice_of(ds)
        return found, np.zeros(found.shape, dtype=bool)
    field, vertical = choice.columns_of(ds, choice.key), str(choice.axes.vertical)
    template, wanted = field.isel({vertical: 0}), float(choice.level.depth or 0.0)
    best = np.full(template.shape, np.nan)
    off = np.full(template.shape, np.inf)
    deepest, above = np.full((2, *template.shape), -np.inf)
    for level in range(field.sizes[vertical]):
        values = field.isel({vertical: level}).values
        depth = np.where(_wet(ds, choice, level, values), _depth(ds, choice, level), np.nan)
        nearer = np.abs(depth - wanted) < off
        best = np.where(nearer, values, best)
        off = np.where(nearer, np.abs(depth - wanted), off)
        known = np.where(np.isfinite(depth), depth, -np.inf)
        above = np.maximum(np.minimum(deepest, known), above)
        deepest = np.maximum(deepest, known)
    bottom = deepest + np.where(np.isfinite(above), deepest - np.where(np.isfinite(above), above, 0.0), 0.0) / 2
    ends = np.isfinite(deepest) & (bottom < wanted)
    return template.copy(data=np.where(ends, np.nan, best)), ends


def _wet(ds: xr.Dataset, choice: Choice, level: int, values: Floats) -> Mask:
    """Where one level has input, computed or not; without a status, where it has a value."""
    if STATUS not in ds:
        return np.isfinite(values)
    status = choice.columns_of(ds, STATUS).isel({choice.axes.vertical: level}).values
    return np.asarray(status != MISSING_INPUT)


def _depth(ds: xr.Dataset, choice: Choice, level: int) -> Floats:
    """Depth of one level below the surface, m, on the horizontal dims."""
    name, axes = str(choice.level.within), choice.axes
    values = choice.columns_of(ds, name).isel({axes.vertical: level})
    depth, unit = depths_of(values)
    if unit == "m" or axes.latitude is None:
        return depth
    latitude = ds[axes.latitude].copy(data=degrees(ds[axes.latitude]))
    _, north = xr.broadcast(values, latitude)
    found: Floats = -gsw.z_from_p(depth, np.nan_to_num(north.transpose(*values.dims).values))
    return found
