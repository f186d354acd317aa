"""From a result and the settings of a map to everything that is drawn: slice, ground, view, colours, words."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.fields import FIELDS, Ink
from gridcarb.figures.cells import Grid, grid_of
from gridcarb.figures.choice import Choice
from gridcarb.figures.columns import slice_at
from gridcarb.figures.drawing import views
from gridcarb.figures.drawing.chart import Plate
from gridcarb.figures.drawing.scales import kinds, scale_of
from gridcarb.figures.ground import MISSING_INPUT, solid_ground
from gridcarb.figures.lettering import sentence, with_units
from gridcarb.figures.map import POLAR_EDGE, MapSettings

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]


def plate_of(result: xr.Dataset, choice: Choice, settings: MapSettings) -> Plate:
    """Read the slice and decide how it is drawn."""
    field = FIELDS[choice.key]
    variable, below = slice_at(result, choice)
    values = _values(variable, is_status=bool(field.flags))
    empty = np.isnan(values)
    grid = grid_of(result, choice.axes)
    hidden = grid.covered(empty)
    values[hidden] = np.nan
    ground = (solid_ground(result, choice, empty) | below) & ~hidden
    missing = empty & ~ground & ~hidden
    view = _view(grid, ~ground, settings)
    name = str(variable.attrs.get("long_name", field.long_name))
    label, entries = "", []
    if field.flags:
        scale, colours = kinds(field.flags)
        entries = [(word.replace("_", " "), colours[value]) for value, word in field.flags if (values == value).any()]
    else:
        units = str(variable.attrs.get("units", field.units))
        # Centre and limits of the catalogue are numbers in its own units.
        ink = field.ink if units == field.units else Ink(field.ink.palette)
        seen = np.where(_seen(grid, view, values.shape), values, np.nan)
        scale, label = scale_of(seen, ink, settings.limits or ink.limits), with_units(name, units)
    return Plate(
        grid=grid, values=values, ground=ground, missing=missing, view=view, scale=scale,
        title=settings.title or sentence(name), subtitle=choice.label, label=label, entries=entries,
        ground_word="land" if _on_top(result, choice) else "land or sea floor",
        coast=settings.coastline and result.attrs.get("geography") != "invented",
    )


def _values(variable: xr.DataArray, is_status: bool) -> Floats:
    """The numbers of a slice, NaN where there is none."""
    values = np.array(variable.values, dtype=np.float64)
    values[~np.isfinite(values)] = np.nan
    if is_status:
        values[values == MISSING_INPUT] = np.nan
    return values


def _on_top(result: xr.Dataset, choice: Choice) -> bool:
    """Whether no level lies above this one, so that all solid ground in it is land."""
    vertical, level = choice.axes.vertical, choice.level
    if vertical is None or level.index is None:
        return level.within is None
    return len(level.below) == result.sizes[vertical] - 1


def _view(grid: Grid, wet: Mask, settings: MapSettings) -> views.View:
    """The view asked for, or the one that suits the extent of the grid."""
    middle, region = settings.centre or 0.0, settings.region
    if settings.projection == "north":
        return views.disc("north", region[2] if region else POLAR_EDGE, middle)
    if settings.projection == "south":
        return views.disc("south", region[3] if region else -POLAR_EDGE, middle)
    if region:
        return views.window(*region)
    west, east, south, north = grid.extent()
    around = east - west >= 300
    if settings.projection == "global" or (around and north - south >= 90):
        return views.globe(_least_land(grid, wet) if settings.centre is None else middle)
    if around and max(south, -north) >= 30:
        return views.disc("north", south, middle) if south > 0 else views.disc("south", north, middle)
    if around:
        west, east = middle - 180, middle + 180
    return views.window(west, east, south, north)


def _least_land(grid: Grid, wet: Mask) -> float:
    """The meridian, in steps of 10 degrees, opposite to the band of 20 degrees with the least water from 60 S to 60 N.

    Counted on squares of 10 degrees, so that places where a grid has no cells count as land.
    """
    lon, lat = (side.ravel() for side in grid.middles(wet.shape))
    near = np.abs(lat) < 60
    square = (np.floor(lat[near] / 10) + 6) * 36 + np.floor(lon[near] % 360 / 10) % 36
    counts = [np.bincount(square[of].astype(np.intp), minlength=432) for of in (slice(None), wet.ravel()[near])]
    shares = (counts[1] / np.maximum(counts[0], 1)).reshape(12, 36).mean(axis=0)
    water = np.round(shares + np.roll(shares, 1), 6)  # of the band about the meridian at the western side of each square
    opposite = np.roll(water, 18)[np.arange(-18, 18)]
    return float(10 * np.argmin(opposite) - 180)


def _seen(grid: Grid, view: views.View, shape: tuple[int, ...]) -> Mask:
    """The cells whose middle lies in the view."""
    lon, lat = grid.middles(shape)
    east = (lon - view.centre - view.west) % 360 + view.west
    return np.asarray((east <= view.east) & (lat >= view.south) & (lat <= view.north))
