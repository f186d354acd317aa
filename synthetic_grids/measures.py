"""What modellers give beside their fields: areas, thicknesses, volumes, shares of sea, basins, the sea floor."""

from __future__ import annotations

import numpy as np
import xarray as xr

from synthetic_grids.areas import polygon_area
from synthetic_grids.clothes import filled
from synthetic_grids.geography import oldness, sea_floor_depth
from synthetic_grids.scene import ATTRIBUTES, Mesh, Scene
from synthetic_grids.sphere import point

BASINS = ("Lorrin_and_Halvren", "Vasht")
"""Names of the basins; their numbers count from 1."""


def cell_areas(mesh: Mesh) -> xr.DataArray:
    """Area of the cells in m2, land and copies included.

    Raises
    ------
    ValueError : the mesh has no corners.
    """
    if mesh.corners is None:
        raise ValueError("a mesh without corners has no areas")
    return mesh.field(polygon_area(*mesh.corners))


def thickness(scene: Scene) -> xr.DataArray:
    """Thickness in m (level, horizontal) of the water in each cell, NaN where the truth has none.

    The lower bound of the level or the sea floor, whichever comes first, less the upper bound: the lowest cell of a
    column is partial.

    Raises
    ------
    ValueError : the levels have no bounds.
    """
    bounds = scene.upright.bounds
    if bounds is None:
        raise ValueError("levels without bounds have no thickness")
    floor = scene.mesh.field(sea_floor_depth(scene.mesh.longitude, scene.mesh.latitude))
    lower = bounds.max("bnds")
    thick = lower.where(lower < floor, floor) - bounds.min("bnds")
    wet = scene.truth["salinity"].notnull()
    return thick.where(wet.any("time") if "time" in wet.dims else wet)


def fixed_fields(scene: Scene) -> xr.Dataset:
    """areacello, sftof, deptho and basin; thkcello and volcello too where the levels have bounds.

    Areas are those of the sea cells; the copies of halo and fold have theirs as well, as in real files. All float64 but
    the basin.
    """
    mesh = scene.mesh
    floor = mesh.field(sea_floor_depth(mesh.longitude, mesh.latitude))
    sea = floor > 0.0
    area = cell_areas(mesh).where(sea)
    said = {
        "areacello": (area, {"standard_name": "cell_area", "long_name": "area of the sea cells", "units": "m2"}),
        "sftof": (100.0 * sea.astype(np.float64), {
            "standard_name": "sea_area_fraction", "long_name": "share of the cell that is sea", "units": "%"}),
        "deptho": (floor.where(sea), {
            "standard_name": "sea_floor_depth_below_geoid", "long_name": "depth of the sea floor", "units": "m"}),
    }
    if scene.upright.bounds is not None:
        thick = thickness(scene)
        said["thkcello"] = (thick, {"standard_name": "cell_thickness", "long_name": "thickness of the cell", "units": "m"})
        said["volcello"] = (thick * area, {
            "standard_name": "ocean_volume", "long_name": "volume of the water in the cell", "units": "m3"})
    fields = {name: filled(values, {**attributes, **mesh.says}, "float64") for name, (values, attributes) in said.items()}
    fields["basin"] = _basin(mesh, sea)
    levels = scene.upright.variables if "thkcello" in fields else {}
    return xr.Dataset({**fields, **mesh.variables, **levels}).assign_attrs(ATTRIBUTES)


def _basin(mesh: Mesh, sea: xr.DataArray) -> xr.Variable:
    """1 where the water is young, 2 where it is old, 0 on land."""
    number = np.where(oldness(point(mesh.longitude, mesh.latitude)) > 0.5, 2, 1)
    attributes = {"standard_name": "region", "long_name": "basin", "units": "1",
                  "flag_values": np.array([0, 1, 2], np.int32), "flag_meanings": " ".join(("land", *BASINS)), **mesh.says}
    return xr.Variable(mesh.dims, np.where(sea.values, number, 0).astype(np.int32), attributes)


def with_measures(scene: Scene) -> Scene:
    """The scene with its tracers pointing at the area and volume in other files."""
    dataset = scene.dataset.copy()
    volume = scene.upright.bounds is not None
    for name in dataset.data_vars:
        if dataset[name].attrs.get("cell_methods"):
            dataset[name].attrs["cell_measures"] = "area: areacello" + (" volume: volcello" if volume else "")
    return scene.with_dataset(dataset.assign_attrs(external_variables="areacello" + (" volcello" if volume else "")))
