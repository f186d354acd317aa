"""Grids that disagree, time axes that do not fit, coordinates that are missing or wrong, and water without depth."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr

CARBON = ["dissic", "talk"]


def _others(ds: xr.Dataset) -> xr.Dataset:
    return ds.drop_vars(CARBON)


def _with(ds: xr.Dataset, name: str, values: np.ndarray) -> xr.Dataset:
    """Other coordinate values under the same attributes."""
    return ds.assign_coords({name: (ds[name].dims, values, ds[name].attrs)})


GRIDS: dict[str, tuple[Callable[[xr.Dataset], xr.Dataset], str]] = {
    "fewer rows": (lambda ds: ds.isel(lat=slice(1, None)), "8 cells along lat, not 9"),
    "fewer levels": (lambda ds: ds.isel(lev=slice(2)), "2 levels, not 3"),
    "no levels": (lambda ds: ds.isel(lev=0, drop=True), "no levels"),
    "another longitude origin": (lambda ds: ds.roll(lon=6, roll_coords=True), "begin at another meridian"),
    "rows upside down": (lambda ds: ds.isel(lat=slice(None, None, -1)), "run the other way"),
    "other levels": (lambda ds: _with(ds, "lev", ds["lev"].values * 1.1), "level 1 is 11, not 10"),
    "half a cell aside": (lambda ds: _with(ds, "lon", ds["lon"].values + 15), "longitudes are up to 15 degrees off"),
}


@pytest.mark.parametrize("case", GRIDS)
def test_grids_that_disagree(bench, ocean, case: str) -> None:
    change, what = GRIDS[case]
    ds = ocean()
    bench.put(_others(ds), "water.nc")
    bench.put(change(ds[CARBON]), "carbon.nc")
    told = bench.refusal(3)
    assert "carbon.nc" in told.where
    assert what in told.what
    assert "does not interpolate" in told.mend
    bench.put(ds[CARBON], "carbon.nc")
    bench.success()


def _parts(bench, ds: xr.Dataset, *stretches: slice) -> None:
    for number, stretch in enumerate(stretches):
        bench.put(ds.isel(time=stretch), f"part_{number}.nc")


def test_files_that_overlap_in_time(bench, ocean) -> None:
    _parts(bench, ocean(months=slice(0, 6)), slice(0, 4), slice(3, 6))
    told = bench.refusal(3)
    assert "overlap in time" in told.what
    assert "2010-04" in told.what
    assert "part_1.nc" in told.where
    bench.put(ocean(months=slice(4, 6)), "part_1.nc")
    assert bench.success().sizes["time"] == 6


def test_files_with_a_gap_in_time(bench, ocean) -> None:
    _parts(bench, ocean(months=slice(0, 6)), slice(0, 2), slice(4, 6))
    told = bench.refusal(3)
    assert "missing between 2010-02" in told.what
    bench.say(told.line())
    assert bench.words["inputs"]["time_gaps"] == "accept"
    assert bench.success().sizes["time"] == 4


def test_roles_on_other_times(bench, ocean) -> None:
    ds = ocean(months=slice(0, 4))
    bench.put(_others(ds), "water.nc")
    bench.put(ds[CARBON].isel(time=slice(0, 3)), "carbon.nc")
    told = bench.refusal(3)
    assert "time axes of two roles differ" in told.what
    bench.put(ds[CARBON], "carbon.nc")
    bench.success()


def test_one_time_twice(bench, ocean) -> None:
    ds = ocean(months=slice(0, 3))
    bench.put(ds.isel(time=[0, 1, 1, 2]))
    assert "is there twice" in bench.refusal(3).what
    bench.put(ds)
    bench.success()


def test_times_in_disorder(bench, ocean) -> None:
    bench.put(ocean(months=slice(0, 3)).isel(time=[1, 0, 2]))
    assert "not sorted" in bench.refusal(3).what


def test_two_calendars(bench, ocean) -> None:
    ds = ocean(months=slice(0, 4))
    _parts(bench, ds, slice(0, 2), slice(2, 4))
    late = ds.isel(time=slice(2, 4))
    late["time"].attrs["calendar"] = "360_day"
    bench.put(late, "part_1.nc")
    told = bench.refusal(3)
    assert "calendars differ" in told.what


def test_months_since(bench, ocean) -> None:
    ds = ocean(months=slice(0, 3))
    ds = _with(ds, "time", np.arange(3.0)).drop_vars("time_bnds")
    ds["time"].attrs["units"] = "months since 2010-01-15"
    del ds["time"].attrs["bounds"]
    bench.put(ds)
    told = bench.refusal(3)
    assert "months since 2010-01-15" in told.what
    assert "`inputs: {months: calendar}`" in told.mend
    assert "`inputs: {months: mean}`" in told.mend
    ds["time"].attrs |= {"calendar": "360_day"}  # where a month has a length
    bench.put(ds)
    assert bench.success().sizes["time"] == 3


def test_a_time_that_is_nan(bench, ocean) -> None:
    ds = ocean(months=slice(0, 3))
    bench.put(_with(ds, "time", np.array([15.5, np.nan, 74.5])))
    assert "missing values" in bench.refusal(3).what


def test_levels_without_a_coordinate(bench, ocean) -> None:
    ds = ocean()
    bench.put(ds.drop_vars(["lev", "lev_bnds"]))
    told = bench.refusal(3)
    assert "the depth of its levels is not known" in told.what
    assert "give the files a coordinate" in told.mend
    bench.put(ds)
    bench.success()


def test_interior_water_without_nutrients(bench, ocean) -> None:
    bench.put(ocean().drop_vars(["si", "po4"]))
    for role in ("phosphate", "silicate"):
        told = bench.refusal(3)
        assert told.where.endswith(role)
        bench.say(told.line())
    assert bench.words["reading"] == {"phosphate": "assume zero", "silicate": "assume zero"}
    bench.success()


def test_deep_water_of_an_unknown_temperature(bench, ocean) -> None:
    ds = ocean()
    del ds["thetao"].attrs["standard_name"]
    bench.put(ds.rename(thetao="temp"))
    told = bench.refusal(3)
    assert "in situ, potential or conservative" in told.what
    bench.say(told.line())
    bench.success()


def test_a_sea_deeper_than_any(bench, ocean) -> None:
    ds = ocean()
    bench.put(_with(ds, "lev", ds["lev"].values * 100))
    told = bench.refusal(3)
    assert "deeper than any sea" in told.what
    bench.say(told.line())
    mended = bench.success()
    bench.put(ds)
    bench.say({"reading": {"units": {"depth": "m"}}})
    xr.testing.assert_allclose(mended["ph_total_scale"], bench.success()["ph_total_scale"].drop_vars("lev").assign_coords(
        lev=mended["lev"]))


def test_depths_without_units(bench, ocean) -> None:
    ds = ocean()
    del ds["lev"].attrs["units"]
    bench.put(ds)
    told = bench.refusal(3)
    assert "units are missing" in told.what
    bench.say(told.line())
    bench.success()


@pytest.mark.parametrize("positive", ["down", "up"])
def test_depths_against_their_own_direction(bench, ocean, positive: str) -> None:
    ds = ocean()
    ds = _with(ds, "lev", ds["lev"].values * (-1 if positive == "down" else 1))
    ds["lev"].attrs["positive"] = positive
    bench.put(ds)
    told = bench.refusal(3)
    assert "contradicts" in told.what
    ds["lev"].attrs["positive"] = {"down": "up", "up": "down"}[positive]
    bench.put(ds)
    bench.success()


def test_no_latitude(bench, ocean) -> None:
    ds = ocean()
    bench.put(ds.drop_vars(["lat", "lat_bnds"]).rename(lat="y"))
    told = bench.refusal(3)
    assert told.what == "there is no latitude along the dimension 'y', only the other coordinate 'lon'"
    assert "degrees_north" in told.mend
    bench.put(ds.drop_vars(["lat", "lat_bnds"]).rename(lat="y").assign_coords(lat=("y", ds["lat"].values, ds["lat"].attrs)))
    bench.success()


@pytest.mark.parametrize("name", ["lat", "lon", "lev"])
def test_a_coordinate_with_nan(bench, ocean, name: str) -> None:
    ds = ocean()
    values = ds[name].values.copy()
    values[1] = np.nan
    bench.put(_with(ds, name, values))
    told = bench.refusal(3)
    assert name in told.where
    assert "missing" in told.what


def test_latitudes_that_are_none(bench, ocean) -> None:
    ds = ocean()
    bench.put(_with(ds, "lat", ds["lat"].values * 2))
    told = bench.refusal(3)
    assert "latitude" in told.what


def test_latitudes_in_radians_said_to_be_degrees(bench, ocean) -> None:
    ds = ocean()
    ds = _with(ds, "lat", np.deg2rad(ds["lat"].values))
    ds["lat"].attrs["units"] = "radians"
    bench.put(ds)
    bench.success()


def test_a_coordinate_with_a_fill_value(bench, ocean) -> None:
    ds = ocean()
    ds["lat"].attrs["_FillValue"] = 1e20
    ds["lon"].attrs["_FillValue"] = np.nan
    bench.put(ds)
    assert "_FillValue" not in bench.success()["lat"].attrs


def test_a_stranger_among_the_dimensions(bench, ocean) -> None:
    ds = ocean()
    members = [ds[name].expand_dims(member=[0, 1]).assign_attrs(ds[name].attrs) for name in ds.data_vars]
    bench.put(xr.merge(members).assign_coords(ds.coords))
    told = bench.refusal(3)
    assert "'member' (size 2)" in told.what


def test_a_file_of_scalars(bench, ocean) -> None:
    ds = ocean().isel(lat=4, lon=7, lev=0).reset_coords(["lat_bnds", "lon_bnds", "lev_bnds"], drop=True)
    bench.put(ds)
    assert bench.success()["ph_total_scale"].shape == ()


def test_all_is_missing(bench, ocean) -> None:
    ds = ocean()
    ds["talk"] = xr.full_like(ds["talk"], np.float32(1e20))
    bench.put(ds)
    told = bench.refusal(3)
    assert "all is missing" in told.what
    bench.put(ocean())
    bench.success()


def test_masks_of_two_oceans(bench, ocean) -> None:
    ds = ocean()
    ds["talk"] = ds["talk"].roll(lon=3, roll_coords=False)
    bench.put(ds)
    told = bench.refusal(3)
    assert "missing in different places" in told.what
    bench.say(told.line())
    bench.success()
