"""Where a cell lies: latitude, longitude, and sea pressure from depth (TEOS-10) or as the files give it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

import gsw
import numpy as np
import xarray as xr

from gridcarb import units
from gridcarb.axes import Axes
from gridcarb.errors import InputError, Notice
from gridcarb.harmonise.decisions import Decided, Decision
from gridcarb.harmonise.masks import MaskReading, read_mask, unmask
from gridcarb.harmonise.settings import ReadingSettings

DEEPEST = 12000.0
"""No sea is deeper, in m or in dbar."""

_POLE = 90.001
"""Degrees; single precision leaves some room."""

_SURFACE_MEND = "write `reading: {depth: surface}` in the recipe if the data lie at the sea surface"
_UNITS_MEND = "write `reading: {units: {depth: m}}` in the recipe"
_AS_THEY_ARE = units.Linear(1.0)
_UPWARD = frozenset({"height", "altitude", "height_above_mean_sea_level", "height_above_geopotential_datum"})
_PRESSURES = frozenset({"sea_water_pressure", "sea_water_pressure_due_to_sea_water"})


@dataclass(frozen=True)
class VerticalReading:
    """How the vertical coordinate becomes pressure.

    kind : what the numbers are; `surface` has no numbers and lies at 0 dbar.
    to_metres_or_dbar : conversion of the numbers.
    downward : whether they grow with depth.
    deepest, shallowest : of the whole grid, in m or dbar.
    """

    kind: Literal["depth", "pressure", "surface"]
    to_metres_or_dbar: units.Linear = _AS_THEY_ARE
    downward: bool = True
    deepest: float = 0.0
    shallowest: float = 0.0


@dataclass(frozen=True)
class PlaceReading:
    """How the coordinates are read; an angle is converted to degrees by its factor."""

    vertical: VerticalReading
    latitude_factor: float = 1.0
    longitude_factor: float = 1.0


@dataclass(frozen=True)
class Place:
    """Sea pressure (dbar), latitude and longitude (degrees, 0 to 360) of a block, in as few dims as they vary over."""

    pressure: xr.DataArray
    latitude: xr.DataArray | None
    longitude: xr.DataArray | None

    def horizontal(self, where: str) -> tuple[xr.DataArray, xr.DataArray]:
        """Latitude and longitude, or InputError if the data have none."""
        if self.latitude is None or self.longitude is None:
            raise InputError("latitude and longitude are needed to convert it, and the data have none", where=where,
                             mend="give the files coordinates with units degrees_north and degrees_east")
        return self.latitude, self.longitude


def coordinate_masks(raw: xr.Dataset, axes: Axes) -> dict[str, MaskReading]:
    """The mask readings of the coordinates that place a cell."""
    names = (axes.vertical_coordinate, axes.latitude, axes.longitude)
    return {name: read_mask(raw[name], name) for name in names if name is not None}


def read_place(
    raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], settings: ReadingSettings, standard_names: set[str]
) -> Decided[PlaceReading]:
    """Decide how pressure, latitude and longitude are found.

    Raises InputError or UnitsError for a vertical coordinate that is missing, contradicts itself or lies above the sea,
    and for depths without latitudes.
    """
    for name in (axes.vertical_coordinate, axes.latitude, axes.longitude):
        _refuse_broken_axis(raw, axes, masks, name)
    vertical = _read_vertical(raw, axes, masks, settings, standard_names)
    if vertical.reading.kind == "depth" and axes.latitude is None:
        raise InputError("pressure follows from depth and latitude, and the data have no latitude", where="latitude",
                         mend="give the files a latitude coordinate with units degrees_north")
    place = PlaceReading(
        vertical.reading,
        *(_angle(raw[name].attrs) if name else 1.0 for name in (axes.latitude, axes.longitude)),
    )
    _refuse_beyond_pole(_decoded(raw, axes.latitude, masks), place.latitude_factor)
    return Decided(place, vertical.decisions, vertical.notices)


def _refuse_broken_axis(raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], name: str | None) -> None:
    """A whole row, column or level would be lost with its coordinate; a list of cells may have land without a place."""
    numbers = _decoded(raw, name, masks)
    if numbers is None or numbers.ndim != 1 or numbers.dims == axes.horizontal:
        return
    missing = int(numbers.isnull().sum())
    if 0 < missing < numbers.size:
        raise InputError(f"{missing} of its {numbers.size} values are missing", where=f"coordinate '{name}'",
                         mend=f"repair '{name}' in the file, or cut these places out of it")


def _refuse_beyond_pole(latitude: xr.DataArray | None, factor: float) -> None:
    most = 0.0 if latitude is None else float(np.fmax.reduce(np.abs(latitude.values * factor), axis=None))
    if most > _POLE:
        raise InputError(f"the latitudes reach {most:g} degrees, beyond the pole", where="latitude",
                         mend="correct the latitudes or their units (degrees_north, or radians) in the file")


def locate(raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], reading: PlaceReading) -> Place:
    """The place of every cell of a block."""
    latitude = _decoded(raw, axes.latitude, masks)
    longitude = _decoded(raw, axes.longitude, masks)
    if latitude is not None:
        latitude = latitude * reading.latitude_factor
    if longitude is not None:
        longitude = _turned(longitude * reading.longitude_factor)
    numbers = _decoded(raw, axes.vertical_coordinate, masks)
    vertical = reading.vertical
    if vertical.kind == "surface" or numbers is None:
        return Place(xr.DataArray(0.0), latitude, longitude)
    down = _downward(numbers, vertical)
    if vertical.kind == "depth":
        down = xr.apply_ufunc(gsw.p_from_z, -down, latitude)
    dims = [dim for dim in axes.order if dim in down.dims]
    return Place(down.transpose(*dims), latitude, longitude)


def top_level(raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], reading: PlaceReading) -> int:
    """The index of the shallowest level along the vertical dimension."""
    numbers = _decoded(raw, axes.vertical_coordinate, masks)
    if numbers is None or axes.vertical not in numbers.dims:
        return 0
    down = _downward(numbers, reading.vertical).fillna(np.inf)
    return int(down.min([dim for dim in down.dims if dim != axes.vertical]).values.argmin())


def _turned(longitude: xr.DataArray) -> xr.DataArray:
    """Longitude from 0 to 360, rounded to 1e-4 degrees so that -157.3 and 202.7 are the same number."""
    return (longitude % 360.0).round(4) % 360.0


def _downward(numbers: xr.DataArray, reading: VerticalReading) -> xr.DataArray:
    converted: xr.DataArray = reading.to_metres_or_dbar(numbers)
    return (converted if reading.downward else -converted) + 0.0  # + 0.0 turns -0.0 into 0.0


def _decoded(raw: xr.Dataset, name: str | None, masks: Mapping[str, MaskReading]) -> xr.DataArray | None:
    if name is None:
        return None
    variable = raw[name]
    return xr.DataArray(unmask(np.asarray(variable.values), masks[name])[0], dims=variable.dims)


def _angle(attrs: Mapping[Any, Any]) -> float:
    return float(np.degrees(1.0)) if str(attrs.get("units", "")).lower().startswith("rad") else 1.0


def _read_vertical(
    raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], settings: ReadingSettings, standard_names: set[str]
) -> Decided[VerticalReading]:
    name = axes.vertical_coordinate
    levels = raw.sizes[axes.vertical] if axes.vertical else 1
    if settings.depth == "surface":
        return _stated_surface(name, levels)
    if name is None:
        return _without_coordinate(axes.vertical, standard_names)
    where = f"vertical coordinate '{name}'"
    attrs = raw[name].attrs
    standard_name = str(attrs.get("standard_name", ""))
    if "formula_terms" in attrs or (standard_name.startswith("ocean_") and standard_name.endswith("coordinate")):
        raise InputError(f"it is a parametric coordinate ({standard_name}), which is not read yet", where=where,
                         mend="give the files a vertical coordinate in metres or dbar")
    stated = settings.units.get("depth")
    unit = units.read(stated or attrs.get("units"), where=where, mend=_UNITS_MEND, expected=("length", "pressure"))
    kind: Literal["depth", "pressure"] = "pressure" if unit.kind == "pressure" else "depth"
    factor = units.conversion(stated or attrs.get("units"), "dbar" if kind == "pressure" else "m", where=where)
    numbers = _decoded(raw, name, masks)
    assert numbers is not None
    converted = factor(numbers.values[np.isfinite(numbers.values)])
    if not converted.size:
        raise InputError("all its values are missing", where=where, mend="give the files a vertical coordinate with values")
    downward, because = _direction(converted, attrs, where)
    down = converted if downward else -converted
    _check_range(down, kind, stated or attrs["units"], where)
    reading = VerticalReading(kind, factor, downward, float(down.max()), float(down.min()))
    how = "sea pressure as given" if kind == "pressure" else "sea pressure from depth and latitude (TEOS-10)"
    decision = Decision("pressure", how, f"'{name}' in {stated or attrs['units']}, {because}")
    return Decided(reading, (decision,), _pressure_notice(kind, standard_name, where))


def _pressure_notice(kind: str, standard_name: str, where: str) -> tuple[Notice, ...]:
    if kind == "pressure" and standard_name not in _PRESSURES - {"sea_water_pressure"}:
        return (Notice("sea_pressure", f"{where} is taken as sea pressure (0 at the surface), not absolute pressure"),)
    return ()


def _stated_surface(name: str | None, levels: int) -> Decided[VerticalReading]:
    if levels > 1:
        raise InputError(f"the recipe says the data lie at the surface, and they have {levels} levels", where="depth",
                         mend="take `depth: surface` out of the section `reading` of the recipe")
    decision = Decision("pressure", "0 dbar, sea surface", "stated in the recipe")
    notice = Notice("depth_overruled", f"the vertical coordinate '{name}' is passed over; the recipe says the data lie at "
                    "the surface", "reading: {depth: surface}")
    return Decided(VerticalReading("surface"), (decision,), (notice,) if name else ())


def _without_coordinate(dim: str | None, standard_names: set[str]) -> Decided[VerticalReading]:
    if dim is not None:
        raise InputError(f"the vertical dimension '{dim}' has no coordinate, so the depth of its levels is not known",
                         where=f"dimension '{dim}'", mend="give the files a coordinate of depth or pressure with units; "
                         f"{_SURFACE_MEND} and there is one level")
    surface = sorted(name for name in standard_names if name.startswith(("sea_surface_", "surface_")))
    if surface:
        return Decided(VerticalReading("surface"),
                       (Decision("pressure", "0 dbar, sea surface", f"standard_name {surface[0]}"),))
    decision = Decision("pressure", "0 dbar, sea surface", "the data have no vertical dimension or coordinate")
    notice = Notice("surface_assumed", "the data have no vertical dimension or coordinate: they are taken to lie at the "
                    "sea surface, 0 dbar", "reading: {depth: surface}")
    return Decided(VerticalReading("surface"), (decision,), (notice,))


def _direction(converted: np.ndarray[Any, Any], attrs: Mapping[Any, Any], where: str) -> tuple[bool, str]:
    """Whether the numbers grow downward, and why; refuse numbers that contradict what is said of them."""
    positive = str(attrs.get("positive", "")).lower()
    standard_name = str(attrs.get("standard_name", ""))
    below, above = bool(converted.min() < 0), bool(converted.max() > 0)
    if positive in ("down", "up"):
        downward, because = positive == "down", f"positive {positive}"
    elif standard_name in _UPWARD or standard_name == "depth" or standard_name in _PRESSURES:
        downward, because = standard_name not in _UPWARD, f"standard_name {standard_name}"
    elif below and above:
        raise InputError("its values lie on both sides of zero, and it does not say which way is down", where=where,
                         mend="give it the attribute positive = \"down\" (depths) or \"up\" (heights) in the file")
    else:
        downward, because = not below, "all its values are " + ("negative" if below else "positive")
    if (below and not above) if downward else (above and not below):
        way = "negative" if downward else "positive"
        raise InputError(f"{because} contradicts its values, which are all {way}: up and down cannot be told apart safely",
                         where=where, mend=f"set the attribute positive = \"{'up' if downward else 'down'}\" in the file, "
                         "or turn the sign of the values")
    return downward, because


def _check_range(down: np.ndarray[Any, Any], kind: str, said: object, where: str) -> None:
    if down.min() < -1e-6:
        raise InputError(f"its shallowest value lies {-down.min():g} above the sea surface", where=where,
                         mend="correct the sign of its values or its attribute positive in the file")
    if down.max() > DEEPEST:
        likely = "cm" if kind == "depth" else "Pa"
        raise InputError(f"its deepest value is {down.max():g} {'m' if kind == 'depth' else 'dbar'} if it is in '{said}', "
                         f"deeper than any sea; likely are {likely}", where=where,
                         mend=f"write `reading: {{units: {{depth: {likely}}}}}` in the recipe")
