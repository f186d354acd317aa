"""From a result and the settings of a map to everything that is drawn: slice, ground, view, colours, words."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.fields import FIELDS, Ink
from gridcarb.figures.cells import Grid, grid_of
from gridcarb.figures.drawing import views
from gridcarb.figures.drawing.chart import Plate
from gridcarb.figures.drawing.scales import Scale, kinds, scale_of
from gridcarb.figures.ground import MISSING_INPUT, solid_ground
from gridcarb.figures.lettering import sentence, with_units
from gridcarb.figures.levels import Level
from gridcarb.figures.map import POLAR_EDGE, MapSettings
from gridcarb.figures.moments import Moment

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]


def plate_of(result: xr.Dataset, axes: Axes, level: Level, moment: Moment, settings: MapSettings) -> Plate:
    """Read the slice and decide how it is drawn."""
    field = FIELDS[settings.field]
    values, units = _slice(result, axes, level, moment, settings.field)
    empty = np.isnan(values)
    ground = solid_ground(result, settings.field, axes, level, moment, empty)
    grid = grid_of(result, axes)
    view = _view(grid, ~ground, settings)
    name = str(result[settings.field].attrs.get("long_name", field.long_name))
    if field.flags:
        scale, colours = kinds(field.flags)
        present = [(value, word) for value, word in field.flags if (values == value).any()]
        label, entries = "", [(word.replace("_", " "), colours[value]) for value, word in present]
    else:
        scale = _scale(values, _seen(grid, view, values.shape), field.ink, settings, same_units=units == field.units)
        label, entries = with_units(name, units), []
    return Plate(
        grid=grid, values=values, ground=ground, missing=empty & ~ground, view=view, scale=scale,
        title=settings.title or sentence(name), subtitle=", ".join(part for part in (level.label, moment.label) if part),
        label=label, entries=entries, ground_word="land" if _on_top(result, axes, level) else "land or sea floor",
        coast=settings.coastline and result.attrs.get("geography") != "invented",
    )


def _on_top(result: xr.Dataset, axes: Axes, level: Level) -> bool:
    """Whether no level lies above this one, so that all solid ground in it is land."""
    return level.index is None or axes.vertical is None or len(level.below) == result.sizes[axes.vertical] - 1


def _slice(result: xr.Dataset, axes: Axes, level: Level, moment: Moment, key: str) -> tuple[Floats, str]:
    """(y, x) or (cell,) values at one level and time, NaN where there is none, and their units."""
    variable = result[key]
    chosen = {axes.vertical: level.index, axes.time: moment.index}
    variable = variable.isel({dim: index for dim, index in chosen.items() if dim in variable.dims and index is not None})
    variable = variable.squeeze([dim for dim in variable.dims if dim not in axes.horizontal]).transpose(*axes.horizontal)
    values = np.array(variable.values, dtype=np.float64)
    values[~np.isfinite(values)] = np.nan
    if FIELDS[key].flags:
        values[values == MISSING_INPUT] = np.nan
    return values, str(variable.attrs.get("units", FIELDS[key].units))


def _view(grid: Grid, wet: Mask, settings: MapSettings) -> views.View:
    """The view asked for, or the one that suits the extent of the grid."""
    if settings.projection in ("north", "south"):
        north = settings.projection == "north"
        edge = POLAR_EDGE if north else -POLAR_EDGE
        if settings.region:
            edge = settings.region[2] if north else settings.region[3]
        return views.disc("north" if north else "south", edge, settings.centre or 0.0)
    if settings.region:
        return views.window(*settings.region)
    west, east, south, north_end = grid.extent()
    around = east - west >= 300
    if settings.projection == "global" or (around and north_end - south >= 90):
        return views.globe(_least_land(grid, wet) if settings.centre is None else settings.centre)
    if around and south >= 30:
        return views.disc("north", south, settings.centre or 0.0)
    if around and north_end <= -30:
        return views.disc("south", north_end, settings.centre or 0.0)
    if around and settings.centre is not None:
        west, east = settings.centre - 180, settings.centre + 180
    return views.window(west, east, south, north_end)


def _least_land(grid: Grid, wet: Mask) -> float:
    """The meridian, in steps of 10 degrees, opposite to the band of 20 degrees with the least water between 60 S and 60 N."""
    centres = np.arange(-180.0, 180.0, 10.0)
    cuts = [_water(grid, wet, (centre + 180) % 360) for centre in centres]
    return float(centres[int(np.argmin(cuts))])


def _water(grid: Grid, wet: Mask, meridian: float) -> float:
    """The share of wet cells within 10 degrees of a meridian, rounded so that turns of longitude do not matter."""
    lon, lat = grid.middles(wet.shape)
    near = (np.abs((lon - meridian + 180) % 360 - 180) <= 10) & (np.abs(lat) <= 60)
    return round(float(wet[near].mean()), 6) if near.any() else 0.0


def _seen(grid: Grid, view: views.View, shape: tuple[int, ...]) -> Mask:
    """The cells whose middle lies in the view."""
    lon, lat = grid.middles(shape)
    east = (lon - view.centre - view.west) % 360 + view.west
    return (east <= view.east) & (lat >= view.south) & (lat <= view.north)


def _scale(values: Floats, seen: Mask, ink: Ink, settings: MapSettings, same_units: bool) -> Scale:
    """Limits of the recipe, else of the catalogue (they hold in its own units only), else from the values in view."""
    if not same_units:
        ink = Ink(ink.palette)
    return scale_of(np.where(seen, values, np.nan), ink, settings.limits or ink.limits)
