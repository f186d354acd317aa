"""Where a cell lies: latitude, longitude, and sea pressure from depth (TEOS-10) or as the files give it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import gsw
import numpy as np
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.errors import InputError
from gridcarb.harmonise.decisions import Decided
from gridcarb.harmonise.masks import MaskReading, decoded, read_mask
from gridcarb.harmonise.parametric import is_parametric, term_variables
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.harmonise.vertical import VerticalReading, down_of, read_vertical

_POLE = 90.001
"""Degrees; single precision leaves some room."""


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
    """The mask readings of the coordinates that place a cell, and of the terms they follow from."""
    names = (axes.vertical_coordinate, axes.latitude, axes.longitude, *term_variables(raw, axes.vertical_coordinate))
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
    vertical = read_vertical(raw, axes, masks, settings, standard_names)
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
    """A whole row, column or level would be lost with its coordinate; a list of cells may have land without a place.

    Of a parametric coordinate the terms are needed, not its own numbers.
    """
    if name is None or raw[name].ndim != 1 or raw[name].dims == axes.horizontal or is_parametric(raw[name].attrs):
        return
    numbers = decoded(raw, name, masks)
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
    down = down_of(raw, axes, masks, reading.vertical)
    if reading.vertical.kind == "depth":
        down = xr.apply_ufunc(gsw.p_from_z, -down, latitude)
    dims = [dim for dim in axes.order if dim in down.dims]
    return Place(down.transpose(*dims), latitude, longitude)


def _turned(longitude: xr.DataArray) -> xr.DataArray:
    """Longitude from 0 to 360, rounded to 1e-4 degrees so that -157.3 and 202.7 are the same number."""
    return (longitude % 360.0).round(4) % 360.0


def _decoded(raw: xr.Dataset, name: str | None, masks: Mapping[str, MaskReading]) -> xr.DataArray | None:
    return None if name is None else decoded(raw, name, masks)


def _angle(attrs: Mapping[Any, Any]) -> float:
    return float(np.degrees(1.0)) if str(attrs.get("units", "")).lower().startswith("rad") else 1.0
