"""Vertical coordinates in plain lengths and pressures: either direction, either sign, any unit, or none at all."""

from __future__ import annotations

import gsw
import numpy as np
import xarray as xr

from synthetic_grids.landmarks import DEPTHS, EDGES
from synthetic_grids.scene import Mesh, Upright

METRES = {"m": 1.0, "cm": 100.0, "km": 1e-3}
"""How many of the unit a metre is."""

MIDDLES = (np.array(EDGES[1:]) + np.array(EDGES[:-1])) / 2.0


def levels(
    unit: str = "m", *, name: str = "lev", height: bool = False, from_bottom: bool = False,
    says_positive: bool = True, bounds: bool = True, named: bool = True,
) -> Upright:
    """The eight levels of `EDGES`.

    height : negative numbers above the deep, positive up, instead of depths.
    from_bottom : the deepest level comes first.
    says_positive, named : whether the file has the attribute `positive`, and a standard name.
    """
    order = slice(None, None, -1 if from_bottom else 1)
    sides = np.stack([EDGES[:-1], EDGES[1:]], axis=-1)[order]
    depth = MIDDLES[order]
    factor = (-1.0 if height else 1.0) * METRES[unit]
    attributes = {"long_name": "height above the sea surface" if height else "depth below the sea surface", "units": unit,
                  "axis": "Z"}
    if named:
        attributes["standard_name"] = "height_above_mean_sea_level" if height else "depth"
    if says_positive:
        attributes["positive"] = "up" if height else "down"
    variables = {name: xr.Variable(name, factor * depth, attributes)}
    if bounds:
        variables[name].attrs["bounds"] = f"{name}_bnds"
        variables[f"{name}_bnds"] = xr.Variable((name, "bnds"), factor * sides)
    return Upright(xr.DataArray(depth, dims=name), variables, bounds=xr.DataArray(sides, dims=(name, "bnds")))


def pressure_levels(mesh: Mesh) -> Upright:
    """Levels of equal sea pressure, as many dbar as `levels` has metres: their depth depends on the latitude."""
    pressure = xr.DataArray(MIDDLES, dims="pressure")
    depth = xr.apply_ufunc(lambda p, lat: -gsw.z_from_p(p, lat), pressure, mesh.field(mesh.latitude))
    return Upright(depth, {"pressure": xr.Variable("pressure", MIDDLES, _of_pressure() | {"axis": "Z"})})


def pressure_of_depths(mesh: Mesh) -> Upright:
    """The depths of `levels`, of which the file tells the sea pressure only: (level, horizontal), one column if none."""
    depth = xr.DataArray(MIDDLES, dims="level")
    pressure = xr.apply_ufunc(lambda z, lat: gsw.p_from_z(-z, lat), depth, mesh.field(mesh.latitude))
    name = "pressure" if mesh.dims else "level"
    says = {"coordinates": name} if mesh.dims else {}
    return Upright(depth, {name: xr.Variable(pressure.dims, pressure.values, _of_pressure())}, says)


def _of_pressure() -> dict[str, str]:
    return {"standard_name": "sea_water_pressure_due_to_sea_water", "long_name": "sea pressure", "units": "dbar",
            "positive": "down"}


def surface() -> Upright:
    """No vertical coordinate: the ocean at 0 m."""
    return Upright(xr.DataArray(0.0), {})


def scalar_depth() -> Upright:
    """The first of the landmarks' depths as a scalar coordinate."""
    attributes = {"standard_name": "depth", "long_name": "depth below the sea surface", "units": "m", "positive": "down",
                  "axis": "Z"}
    depth = DEPTHS[0]
    return Upright(xr.DataArray(depth), {"depth": xr.Variable((), depth, attributes)}, {"coordinates": "depth"})


def one_level() -> Upright:
    """The first of the landmarks' depths as a dim of length one."""
    whole = levels()
    first = {name: variable.isel(lev=slice(0, 1)) for name, variable in whole.variables.items()}
    bounds = None if whole.bounds is None else whole.bounds.isel(lev=slice(0, 1))
    return Upright(whole.depth.isel(lev=slice(0, 1)), first, bounds=bounds)
