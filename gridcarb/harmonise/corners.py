"""The corners of cells: bounds of two-dimensional or listed coordinates, or the faces of an unstructured mesh."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.harmonise.masks import MaskReading, read_mask, unmask

Numbers = npt.NDArray[np.float64]

_BEYOND = 1e4
"""No angle is larger; what is, is a fill value that no attribute names."""


def corner_names(raw: xr.Dataset, axes: Axes) -> str:
    """Where the corners of the cells of a grid come from, in words; '' if there are none."""
    names = (axes.longitude, axes.latitude)
    if all(name is not None and _fits(raw, name) for name in names):
        return " and ".join(str(_bounds_name(raw, str(name))) for name in names)
    return _faces(raw, axes) or ""


def corners(raw: xr.Dataset, axes: Axes) -> tuple[Numbers, Numbers]:
    """Longitude and latitude (cell, corner) in degrees of the cells of a loaded slice; NaN where there is no corner."""
    assert axes.longitude is not None
    assert axes.latitude is not None
    if _fits(raw, axes.longitude) and _fits(raw, axes.latitude):
        lon, lat = (_flat(raw, axes, name) for name in (axes.longitude, axes.latitude))
        return lon, lat
    return _mesh_corners(raw, axes)


def bounds_of(raw: xr.Dataset, name: str) -> Numbers | None:
    """The bounds of a coordinate in degrees, dims of the coordinate first, or None."""
    bounds = _bounds_name(raw, name)
    if bounds is None:
        return None
    return degrees(raw, name, raw[bounds].transpose(*raw[name].dims, ...), None)


def degrees(raw: xr.Dataset, name: str, values: xr.DataArray, mask: MaskReading | None) -> Numbers:
    """Values of a coordinate, or of its bounds, in degrees; NaN where missing."""
    numbers, _ = unmask(np.asarray(values.values), mask or read_mask(values, name))
    numbers[np.abs(numbers) > _BEYOND] = np.nan
    said = str(values.attrs.get("units") or raw[name].attrs.get("units", ""))
    return np.degrees(numbers) if said.lower().startswith("rad") else numbers


def _bounds_name(raw: xr.Dataset, name: str) -> str | None:
    bounds = raw[name].attrs.get("bounds")
    return str(bounds) if bounds in raw.variables else None


def _fits(raw: xr.Dataset, name: str) -> bool:
    """Whether a coordinate has bounds of at least three corners a cell."""
    bounds = _bounds_name(raw, name)
    if bounds is None or len(raw[bounds].dims) != len(raw[name].dims) + 1:
        return False
    extra = [dim for dim in raw[bounds].dims if dim not in raw[name].dims]
    return len(extra) == 1 and raw.sizes[extra[0]] >= 3


def _flat(raw: xr.Dataset, axes: Axes, name: str) -> Numbers:
    """Bounds as (cell, corner), the cells in the order of the horizontal dims."""
    bounds = raw[_bounds_name(raw, name)].transpose(*axes.horizontal, ...)
    found = degrees(raw, name, bounds, None)
    return found.reshape(-1, found.shape[-1])


def _faces(raw: xr.Dataset, axes: Axes) -> str | None:
    """The connectivity of a UGRID mesh whose faces are the cells."""
    mesh = str(raw["temperature"].attrs.get("mesh", ""))
    if mesh not in raw.variables or raw["temperature"].attrs.get("location") != "face" or len(axes.horizontal) != 1:
        return None
    faces = str(raw[mesh].attrs.get("face_node_connectivity", ""))
    nodes = str(raw[mesh].attrs.get("node_coordinates", "")).split()
    known = faces in raw.variables and len(nodes) == 2 and all(node in raw.variables for node in nodes)
    return faces if known and axes.horizontal[0] in raw[faces].dims else None


def _mesh_corners(raw: xr.Dataset, axes: Axes) -> tuple[Numbers, Numbers]:
    name = _faces(raw, axes)
    assert name is not None
    connectivity = raw[name].transpose(*axes.horizontal, ...)
    fill = connectivity.attrs.get("_FillValue")
    start = int(connectivity.attrs.get("start_index", 0))
    numbers = np.asarray(connectivity.values)
    nodes = str(raw[raw["temperature"].attrs["mesh"]].attrs["node_coordinates"]).split()
    places = {_is_latitude(raw[node]): degrees(raw, node, raw[node], None) for node in nodes}
    lon, lat = places[False], places[True]
    index = np.where(np.isfinite(numbers), numbers, -1).astype(np.int64) - start
    there = (index >= 0) & (index < lon.size)
    if fill is not None:
        there &= numbers != np.asarray(fill)
    index = np.where(there, index, 0)
    return np.where(there, lon[index], np.nan), np.where(there, lat[index], np.nan)


def _is_latitude(node: xr.DataArray) -> bool:
    said = f"{node.attrs.get('standard_name', '')} {node.attrs.get('units', '')} {node.name}".lower()
    return "lat" in said or "north" in said or str(node.name).endswith("_y")
