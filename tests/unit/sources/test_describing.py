"""What describes a grid, wherever it lies: measures, terms, meshes and positions in files of their own."""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import InputError
from gridcarb.sources import InputsSettings, gather, open_collection
from synthetic_grids.kinds import KINDS, scene_of

APART = {
    "grid_tripolar_edge_fold": ("latitude", "longitude", "latitude_vertices", "longitude_vertices"),
    "grid_polygons_from_1": ("mesh", "node_lon", "node_lat", "face_nodes", "face_lon", "face_lat"),
    "grid_triangles_from_0": ("mesh", "node_lon", "node_lat", "face_nodes"),
    "vertical_ocean_sigma": ("surface", "floor"),
    "vertical_ocean_s_g1": ("curve", "surface", "floor", "critical"),
}


@pytest.mark.parametrize("kind", APART)
def test_a_file_of_the_grid_alone(kind: str, tmp_path: Path) -> None:
    whole, names = scene_of(kind).dataset, APART[kind]
    whole.drop_vars(names).to_netcdf(tmp_path / "fields.nc")
    xr.Dataset({name: whole.variables[name] for name in names}).to_netcdf(tmp_path / "grid.nc")
    (tmp_path / "whole").mkdir()
    KINDS[kind](tmp_path / "whole")
    apart = gather(InputsSettings(files=("*.nc",)), tmp_path)
    together = gather(InputsSettings(files=("whole/*",)), tmp_path)
    assert apart.axes == together.axes
    assert set(apart.coordinates) == set(together.coordinates)
    ours, theirs = open_collection(apart), open_collection(together)
    for name in theirs.coords:
        np.testing.assert_array_equal(ours[name], theirs[name])
    assert {Path(file.path).name for file in apart.files} == {"fields.nc", "grid.nc"}
    assert [notice.code for notice in apart.notices if notice.code != "measure-left-aside"] == ["described-elsewhere"]


def test_a_sea_surface_for_every_file(tmp_path: Path) -> None:
    whole = scene_of("vertical_ocean_sigma").dataset
    for step in range(3):
        part = whole.isel(time=[step])
        part.drop_vars("surface").to_netcdf(tmp_path / f"fields_{step}.nc")
        part[["surface"]].drop_vars(["layer", "layer_bnds"], errors="ignore").to_netcdf(tmp_path / f"a_{2 - step}.nc")
    ours = open_collection(gather(InputsSettings(files=("*.nc",)), tmp_path))
    np.testing.assert_array_equal(ours.surface, whole.surface)


def _measures(tmp_path: Path, change, **words):
    KINDS["measures_tripolar"](tmp_path)
    with xr.open_dataset(tmp_path / "fixed.nc", decode_cf=False) as opened:
        fixed = opened.load()
    (tmp_path / "fixed.nc").unlink()
    change(fixed).to_netcdf(tmp_path / "fixed.nc")
    return gather(InputsSettings(files=("*.nc",), **words), tmp_path)


def test_measures_by_name_on_other_dimension_names(tmp_path: Path) -> None:
    def change(fixed: xr.Dataset) -> xr.Dataset:
        for name in fixed.data_vars:
            fixed[name].attrs.pop("standard_name", None)
        return fixed.rename(j="y", i="x", lev="z")

    found = _measures(tmp_path, change)
    assert set(found.measures) == {"area", "volume", "thickness", "sea_fraction", "basin", "sea_floor_depth"}
    ours = open_collection(found)
    assert ours.areacello.dims == ("j", "i")
    assert ours.thkcello.dims == ("lev", "j", "i")
    assert "cell_measures" in ours.dic.attrs


def test_an_area_of_another_grid_is_left_aside(tmp_path: Path) -> None:
    def change(fixed: xr.Dataset) -> xr.Dataset:
        fixed["latitude"] = fixed.latitude + 1.0
        return fixed

    found = _measures(tmp_path, change)
    assert found.measures == {}
    aside = [notice for notice in found.notices if notice.code == "measure-left-aside"]
    assert len(aside) == 6
    assert "latitudes are up to 1 degrees off" in aside[0].text


def test_a_stated_area_of_another_grid_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="cells along"):
        _measures(tmp_path, lambda fixed: fixed.isel(j=slice(1, None)), area="areacello")


def test_a_file_of_the_area_without_one_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no variable is known as the area"):
        _measures(tmp_path, lambda fixed: fixed.drop_vars("areacello"), area={"files": "fixed.nc"})


def test_two_areas_are_a_question(tmp_path: Path) -> None:
    def change(fixed: xr.Dataset) -> xr.Dataset:
        return fixed.assign(other=fixed.deptho, deptho=fixed.deptho)

    found = _measures(tmp_path, change)
    assert "sea_floor_depth" not in found.measures
    doubt = next(notice for notice in found.notices if notice.code == "measure-in-doubt")
    assert "inputs: {sea_floor_depth: other}" in doubt.state
    (tmp_path / "again").mkdir()
    assert _measures(tmp_path / "again", change, sea_floor_depth="other").measures["sea_floor_depth"] == "other"


def test_a_thickness_that_changes_in_time(tmp_path: Path) -> None:
    KINDS["form_file_a_year"](tmp_path)
    for path in sorted(tmp_path.glob("*.nc")):
        with netCDF4.Dataset(path, "a") as file:
            thick = file.createVariable("thkcello", "f4", ("time", "lev", "lat", "lon"))
            thick[:] = file["time"][:].reshape(-1, 1, 1, 1)
            thick.setncatts({"standard_name": "cell_thickness", "units": "m"})
    found = gather(InputsSettings(files=("*.nc",)), tmp_path)
    assert found.measures == {"thickness": "thkcello"}
    ours = open_collection(found)
    np.testing.assert_array_equal(ours.thkcello[:, 0, 0, 0], ours.time.astype("f4"))


def test_positions_packed_and_masked(tmp_path: Path) -> None:
    """Positions packed as integers, with fills on land, are compared as what they mean."""
    KINDS["form_file_a_variable"](tmp_path)
    for shift, path in enumerate(sorted(tmp_path.glob("*.nc"))):
        with netCDF4.Dataset(path, "a") as file:
            file.renameVariable("lat", "old")
            lat = file.createVariable("lat", "i2", ("lat",), fill_value=-999)
            lat.setncatts({"standard_name": "latitude", "units": "degrees_north", "scale_factor": 0.01 + 0 * shift})
            lat[:] = np.ma.masked_values(np.round(file["old"][:], 2), np.round(file["old"][0], 2) if shift else 99.0)
    assert gather(InputsSettings(files=("*.nc",)), tmp_path).axes.latitude == "lat"
