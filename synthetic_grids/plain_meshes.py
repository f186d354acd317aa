"""Meshes with one-dimensional coordinates or none: the raster in any order, columns, cells, stations."""

from __future__ import annotations

import numpy as np
import xarray as xr

from synthetic_grids.landmarks import LATITUDES, LONGITUDES, STEP, eastward, landmarks
from synthetic_grids.scene import Mesh
from synthetic_grids.sphere import Numbers

LATITUDE = {"standard_name": "latitude", "long_name": "latitude", "units": "degrees_north"}
LONGITUDE = {"standard_name": "longitude", "long_name": "longitude", "units": "degrees_east"}


def _sides(centres: Numbers, limit: float | None = None) -> Numbers:
    """Bounds half a step to either side, in the order of the centres."""
    half = STEP / 2.0 if centres[-1] >= centres[0] else -STEP / 2.0
    bounds = np.stack([centres - half, centres + half], axis=-1)
    return bounds if limit is None else np.clip(bounds, -limit, limit)


def rectangle_corners(lon_bounds: Numbers, lat_bounds: Numbers) -> tuple[Numbers, Numbers]:
    """Corners (lat, lon, 4) of cells between meridians and parallels, anticlockwise from the south-west."""
    west, east = np.sort(lon_bounds, axis=-1).T
    south, north = np.sort(lat_bounds, axis=-1).T
    shape = (lat_bounds.shape[0], lon_bounds.shape[0])
    lon = np.stack([np.broadcast_to(side[None, :], shape) for side in (west, east, east, west)], axis=-1)
    lat = np.stack([np.broadcast_to(side[:, None], shape) for side in (south, south, north, north)], axis=-1)
    return lon, lat


def raster(
    west: float = 0.0, *, southward: bool = False, westward: bool = False, bounds: bool = True,
    names: tuple[str, str] = ("lat", "lon"), latitudes: Numbers = LATITUDES, longitudes: Numbers = LONGITUDES,
) -> Mesh:
    """The raster of the landmarks: longitudes from `west` (a multiple of 7.5) eastward, latitudes northward, or turned.

    `latitudes` and `longitudes` may be parts of the raster.
    """
    lat = latitudes[::-1] if southward else latitudes
    lon = np.sort(np.mod(longitudes - west, 360.0)) + west
    lon = lon[::-1] if westward else lon
    y, x = names
    lat_bounds, lon_bounds = _sides(lat, 90.0), _sides(lon)
    variables = {
        y: xr.Variable(y, lat, {**LATITUDE, "axis": "Y"}), x: xr.Variable(x, lon, {**LONGITUDE, "axis": "X"}),
    }
    if bounds:
        for name, sides in ((y, lat_bounds), (x, lon_bounds)):
            variables[name].attrs["bounds"] = f"{name}_bnds"
            variables[f"{name}_bnds"] = xr.Variable((name, "bnds"), sides)
    everywhere = np.broadcast_arrays(eastward(lon)[None, :], lat[:, None])
    return Mesh((y, x), everywhere[0], everywhere[1], variables, corners=rectangle_corners(lon_bounds, lat_bounds))


def single_cell() -> Mesh:
    """One cell of the raster, at the first landmark, with both horizontal dims of length one."""
    lon, lat = landmarks()[0]
    return raster(latitudes=np.array([lat]), longitudes=np.array([lon]))


def single_column() -> Mesh:
    """The first landmark without horizontal dims: latitude and longitude are scalar coordinates."""
    lon, lat = landmarks()[0]
    variables = {"lat": xr.Variable((), lat, LATITUDE), "lon": xr.Variable((), lon, LONGITUDE)}
    return Mesh((), np.asarray(lon), np.asarray(lat), variables, {"coordinates": "lat lon"})


def scattered(dim: str, role: str) -> Mesh:
    """All landmarks along one dim and in no order of a map, each with a name; `role` is the CF cf_role of the names."""
    lon, lat = np.array(landmarks()).T
    turned = np.where(lon > 180.0, lon - 360.0, lon)
    names = np.arange(1, lon.size + 1, dtype=np.int32)
    variables = {
        "lat": xr.Variable(dim, lat, LATITUDE), "lon": xr.Variable(dim, turned, LONGITUDE),
        f"{dim}_number": xr.Variable(dim, names, {"long_name": f"number of the {dim}", "cf_role": role}),
    }
    return Mesh((dim,), eastward(lon), lat, variables, {"coordinates": f"lat lon {dim}_number"})
