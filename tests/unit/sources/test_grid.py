"""Roles in files of their own must lie on one grid, and a refusal says how they differ."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import InputError


@pytest.fixture
def two_files(gathered, ocean, save, tmp_path: Path):
    """Gather a whole ocean whose salinity lies in a file of its own, changed by `change`."""
    save(ocean().drop_vars("so"), tmp_path / "rest.nc")

    def run(change):
        save(change(ocean(["so"])), tmp_path / "salt.nc")
        return gathered(tmp_path, files="*.nc")

    return run


def _shift(ds: xr.Dataset, name: str, by: float) -> xr.Dataset:
    return ds.assign_coords({name: ds[name] + by * xr.ones_like(ds[name])}).assign_coords(
        {name: lambda new: new[name].assign_attrs(ds[name].attrs)}
    )


@pytest.mark.parametrize(("change", "what"), [
    (lambda ds: ds.isel(lat=slice(3)), "3 cells along lat, not 4"),
    (lambda ds: ds.isel(lev=slice(2)), "2 levels, not 3"),
    (lambda ds: ds.isel(lev=0, drop=True), "'so' has no levels, 'thetao' has 3"),
    (lambda ds: ds.isel(lat=slice(None, None, -1)), r"latitudes are up to 120 degrees off \(they run the other way\)"),
    (lambda ds: _shift(ds, "lon", -360.0), r"longitudes are up to 360 degrees .*counted from another meridian\)"),
    (lambda ds: ds.roll(lon=2, roll_coords=True), r"longitudes .* \(they begin at another meridian\)"),
    (lambda ds: _shift(ds, "lat", 0.01), r"latitudes are up to 0\.01 degrees off"),
    (lambda ds: _shift(ds, "lev", 1.0), r"level 1 is 1, not 0"),
    (lambda ds: ds.assign_coords(lev=ds.lev.assign_attrs(units="cm")), "levels have units 'cm', not 'm'"),
    (lambda ds: ds.assign_coords(lev=ds.lev.assign_attrs(positive="up")), "levels have positive 'up', not 'down'"),
    (lambda ds: ds.isel(lat=0), r"horizontal dimensions are \('lon',\), not \('lat', 'lon'\)"),
])
def test_a_difference_is_refused(two_files, change, what: str) -> None:
    with pytest.raises(InputError, match=what) as caught:
        two_files(change)
    assert caught.value.where.endswith("salt.nc: so (salinity)")
    assert "rest.nc" in caught.value.what
    assert caught.value.mend


@pytest.mark.parametrize("change", [
    lambda ds: ds.assign_coords(lat=ds.lat.astype("f4"), lon=ds.lon.astype("f4"), lev=ds.lev.astype("f4")),
    lambda ds: ds.assign_coords(lev=ds.lev.assign_attrs(units="metres")),
    lambda ds: ds.rename(lev="olevel", lat="j", lon="i"),
    lambda ds: ds.transpose("lon", "time", "lev", "lat"),
    lambda ds: ds.drop_vars(["lat", "lon"]),
    lambda ds: ds.expand_dims(member=1),
])
def test_other_clothes_of_the_same_grid_pass(two_files, ocean, change) -> None:
    collection = two_files(change)
    assert collection.roles["salinity"].array.dims == ("time", "lev", "lat", "lon")
    assert collection.roles["salinity"].array.shape == (3, 3, 4, 5)


def test_positions_in_two_dimensions(gathered, ocean, save, tmp_path: Path) -> None:
    ds = ocean().rename(lat="y", lon="x").drop_vars(["x", "y"])
    lat, lon = np.meshgrid(np.linspace(40, 60, 4), np.linspace(0, 30, 5), indexing="ij")
    for field in ds.data_vars.values():
        field.attrs["coordinates"] = "north east"
    ds["north"] = (("y", "x"), lat, {"standard_name": "latitude", "units": "degrees_north"})
    ds["east"] = (("y", "x"), lon, {"standard_name": "longitude", "units": "degrees_east"})
    save(ds.drop_vars("so"), tmp_path / "rest.nc")
    salt = ds[["so", "north", "east"]]
    save(salt, tmp_path / "salt.nc")
    assert gathered(tmp_path, files="*.nc").kind == "curvilinear"
    moved = salt.copy(deep=True)
    moved["north"][3, 4] += 0.5
    save(moved, tmp_path / "salt.nc")
    with pytest.raises(InputError, match=r"latitudes are up to 0\.5 degrees off"):
        gathered(tmp_path, files="*.nc")
    land = salt.copy(deep=True)
    land["north"][0, 0] = 1e20
    save(land, tmp_path / "salt.nc")
    assert gathered(tmp_path, files="*.nc").kind == "curvilinear"


def test_files_of_one_role_on_different_grids(gathered, ocean, save, tmp_path: Path) -> None:
    save(ocean(), tmp_path / "a.nc")
    save(_shift(ocean(times=(105.0, 135.0, 165.0)), "lat", 1.0), tmp_path / "b.nc")
    with pytest.raises(InputError, match="grid differs from that of thetao"):
        gathered(tmp_path, files="*.nc")


def test_an_ensemble_is_refused(gathered, ocean, save, tmp_path: Path) -> None:
    save(ocean().expand_dims(member=2), tmp_path / "a.nc")
    with pytest.raises(InputError, match=r"'member' \(size 2\)") as caught:
        gathered(tmp_path, files="a.nc")
    assert caught.value.where.startswith(f"{tmp_path / 'a.nc'}: thetao")
