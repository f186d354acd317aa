"""Sampling the invented ocean: axes with bounds, and the truth on any grid they make.

`sample` does not care what kind of grid it is given: longitude and latitude may be 1-D axes, 2-D fields or a list of
cells, depth may be levels or a field that changes with place and time. A cell has the value of the ocean at its centre
and at the middle of its time; a centre given by the same numbers has the same value to the last bit on every grid.
"""

from __future__ import annotations

from collections.abc import Sequence

import cftime
import numpy as np
import xarray as xr

from synthetic_grids.geography import sea_floor_depth
from synthetic_grids.ocean import state
from synthetic_grids.sphere import RADIUS_KM, Numbers


def _middles(edges: Sequence[float] | Numbers) -> tuple[Numbers, Numbers]:
    """The middles of neighbouring edges (n) and the bounds (n, 2)."""
    sides = np.asarray(edges, dtype=np.float64)
    bounds = np.stack([sides[:-1], sides[1:]], axis=-1)
    return bounds.mean(axis=-1), bounds


def rectilinear(rows: int, columns: int, west: float = 0.0) -> xr.Dataset:
    """A global grid of equal steps in degrees: lat (rows, south first) and lon (columns, from `west`), with bounds."""
    lat, lat_bounds = _middles(np.linspace(-90.0, 90.0, rows + 1))
    lon, lon_bounds = _middles(west + np.linspace(0.0, 360.0, columns + 1))
    return xr.Dataset(coords={
        "lat": ("lat", lat, {"standard_name": "latitude", "long_name": "latitude", "units": "degrees_north", "axis": "Y",
                             "bounds": "lat_bnds"}),
        "lon": ("lon", lon, {"standard_name": "longitude", "long_name": "longitude", "units": "degrees_east", "axis": "X",
                             "bounds": "lon_bnds"}),
        "lat_bnds": (("lat", "bnds"), lat_bounds),
        "lon_bnds": (("lon", "bnds"), lon_bounds),
    })


def levels(edges: Sequence[float]) -> xr.Dataset:
    """Depth levels between edges in m, positive down: coordinate lev, with bounds."""
    lev, bounds = _middles(edges)
    attributes = {"standard_name": "depth", "long_name": "depth below the sea surface", "units": "m", "positive": "down",
                  "axis": "Z", "bounds": "lev_bnds"}
    return xr.Dataset(coords={"lev": ("lev", lev, attributes), "lev_bnds": (("lev", "bnds"), bounds)})


def months(first_year: int, last_year: int, calendar: str) -> xr.Dataset:
    """The months of whole years in a CF calendar: time (days since the start, with bounds), and their decimal `year`."""
    units = f"days since {first_year:04d}-01-01"
    count = 12 * (last_year - first_year + 1)
    firsts = [cftime.datetime(first_year + n // 12, 1 + n % 12, 1, calendar=calendar) for n in range(count + 1)]
    edges = np.asarray(cftime.date2num(firsts, units, calendar), dtype=np.float64)
    time, bounds = _middles(edges)
    begin, length = np.repeat(edges[:-1:12], 12), np.repeat(np.diff(edges[::12]), 12)
    year = np.repeat(np.arange(first_year, last_year + 1, dtype=np.float64), 12) + (time - begin) / length
    attributes = {"standard_name": "time", "long_name": "time", "units": units, "calendar": calendar, "axis": "T",
                  "bounds": "time_bnds"}
    return xr.Dataset({"year": ("time", year)}, {
        "time": ("time", time, attributes), "time_bnds": (("time", "bnds"), bounds),
    })


def cell_area(grid: xr.Dataset) -> xr.DataArray:
    """Area in m2 (lat, lon) of the cells of a `rectilinear` grid on the sphere, from their bounds."""
    south, north = (xr.apply_ufunc(np.sin, np.pi / 180.0 * grid["lat_bnds"].isel(bnds=side)) for side in (0, 1))
    width = np.pi / 180.0 * (grid["lon_bnds"].isel(bnds=1) - grid["lon_bnds"].isel(bnds=0))
    return xr.DataArray(1e6 * RADIUS_KM**2 * (north - south) * width)


def sea_floor(longitude: xr.DataArray, latitude: xr.DataArray) -> xr.DataArray:
    """Depth of the sea floor in m on the horizontal dims, NaN on land."""
    lon, lat = xr.broadcast(longitude, latitude)
    depth = sea_floor_depth(lon.values, lat.values)
    return xr.DataArray(np.where(depth > 0.0, depth, np.nan), coords=lon.coords, dims=lon.dims)


def _spread(array: xr.DataArray, order: Sequence[str]) -> Numbers:
    """The values with the dims in `order`, length 1 where the array lacks a dim."""
    own = [dim for dim in order if dim in array.dims]
    shape = [array.sizes.get(dim, 1) for dim in order]
    return np.asarray(array.transpose(*own).values, dtype=np.float64).reshape(shape)


def sample(longitude: xr.DataArray, latitude: xr.DataArray, depth: xr.DataArray, year: xr.DataArray) -> xr.Dataset:
    """The tracers of `synthetic_grids.ocean.TRACERS` on a grid, NaN on land and at or below the sea floor.

    Arguments in degrees east, degrees north, m (positive down) and decimal years; any dims, matched by name. The dims of
    the result are those of time, of depth, and of the map (latitude first), in this order.
    """
    lat, lon = xr.broadcast(latitude, longitude)
    horizontal = [str(dim) for dim in lat.dims]
    upright = [str(dim) for dim in depth.dims if dim not in (*horizontal, *year.dims)]
    order = [*(str(dim) for dim in year.dims if dim not in horizontal), *upright, *horizontal]
    z, when = _spread(depth, order), _spread(year, order)
    found = state(lon.values, lat.values, z, when)
    wet = z < sea_floor_depth(lon.values, lat.values)
    shape = np.broadcast_shapes(z.shape, when.shape, lat.shape)
    masked = {key: (order, np.broadcast_to(np.where(wet, values, np.nan), shape)) for key, values in found.items()}
    return xr.Dataset(masked, {**lat.coords, **depth.coords, **year.coords})
