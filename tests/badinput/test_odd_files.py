"""What else people bring along: each is read rightly, or refused with words that help."""

from __future__ import annotations

import netCDF4
import numpy as np
import pytest
import xarray as xr

CARBON = ["dissic", "talk"]


def test_an_earlier_result_given_as_input(bench, ocean) -> None:
    bench.put(ocean(), "input.nc")
    bench.say({"output": {"netcdf": True, "folder": "first_result"}, "inputs": {"files": "input.nc"}})
    assert bench.run().exit_code == 0
    bench.say({"output": {"folder": "result"}, "inputs": {"files": "first_result/fields.nc"}})
    told = bench.refusal(3)
    assert "no variable is known as temperature or salinity or dic or alkalinity" in told.what
    assert "ph_total_scale" in told.mend


def test_the_result_folder_among_the_inputs_of_a_pattern(bench, ocean) -> None:
    bench.put(ocean(), "input.nc")
    bench.say({"output": {"netcdf": True, "folder": "first_result"}, "inputs": {"files": "**/*.nc"}})
    assert bench.run().exit_code == 0
    bench.say({"output": {"folder": "again"}})
    assert bench.run().exit_code == 0


def test_a_land_file_among_the_inputs_of_a_pattern(bench, ocean) -> None:
    bench.put(ocean())
    mask = ocean()[["thetao"]].isel(lev=0, drop=True).rename(thetao="sftof")
    mask["sftof"].attrs |= {"standard_name": "sea_area_fraction", "units": "%"}
    bench.put(mask, "fixed.nc")
    bench.success()


def test_a_surface_file_beside_the_columns(bench, ocean) -> None:
    bench.put(ocean())
    top = ocean(surface=True)[CARBON].rename(dissic="dissicos", talk="talkos")
    bench.put(top, "surface.nc")
    bench.success()


def test_fields_in_the_only_group(bench, ocean) -> None:
    ocean().to_netcdf(bench.folder / "ocean.nc", group="model")
    bench.success()


def test_fields_in_several_groups(bench, ocean) -> None:
    for group in ("control", "warming"):
        ocean().to_netcdf(bench.folder / "ocean.nc", mode="a", group=group)
    told = bench.refusal(3)
    assert told.what == "the fields of the file lie in several groups (control, warming)"
    assert "ocean.nc#control" in told.mend


def test_packed_as_integers(bench, ocean) -> None:
    ds = ocean()
    bench.put(ds)
    true = bench.success()
    for name, (scale, offset) in {"dissic": (0.02, 2000.0), "talk": (0.02, 2300.0), "thetao": (1e-3, 10.0)}.items():
        values = ds[name].values.astype("f8")
        packed = np.where(values > 1e19, -32768, np.round((values - offset) / scale)).astype("i2")
        packing = {"_FillValue": np.int16(-32768), "scale_factor": scale, "add_offset": offset}
        attrs = {key: value for key, value in ds[name].attrs.items() if key != "missing_value"}
        ds[name] = (ds[name].dims, packed, attrs | packing)
    bench.put(ds)
    xr.testing.assert_allclose(bench.success()["ph_total_scale"], true["ph_total_scale"], atol=3e-4, rtol=0)


@pytest.mark.parametrize("fill", [-999.0, -9999.0, 0.0, np.nan])
def test_land_without_a_declared_fill_value(bench, ocean, fill: float) -> None:
    ds = ocean()
    bench.put(ds)
    true = bench.success()
    for name in ds.data_vars:
        values = ds[name].values
        attrs = {key: value for key, value in ds[name].attrs.items() if key not in ("_FillValue", "missing_value")}
        ds[name] = (ds[name].dims, np.where(values > 1e19, np.float32(fill), values), attrs)
    bench.put(ds)
    found = bench.success()
    xr.testing.assert_equal(found["ph_total_scale"], true["ph_total_scale"])


def test_one_file_for_each_level_is_refused(bench, ocean) -> None:
    ds = ocean()
    for level in range(3):
        bench.put(ds.isel(lev=[level]), f"level_{level}.nc")
    told = bench.refusal(3)
    assert "no time dimension" in told.what or "overlap" in told.what


def test_one_file_for_each_region_is_refused(bench, ocean) -> None:
    ds = ocean(months=slice(0, 2))
    bench.put(ds.isel(lon=slice(0, 6)), "west.nc")
    bench.put(ds.isel(lon=slice(6, 12)), "east.nc")
    told = bench.refusal(3)
    assert "grid differs" in told.what
    assert "east.nc" in told.where + told.what


def test_the_same_file_twice_counts_once(bench, ocean) -> None:
    bench.put(ocean(months=slice(0, 2)))
    bench.say({"inputs": {"files": ["ocean.nc", "./ocean.nc", "*.nc"]}})
    assert bench.success().sizes["time"] == 2


def test_the_same_months_in_two_files(bench, ocean) -> None:
    for name in ("monthly.nc", "monthly_copy.nc"):
        bench.put(ocean(months=slice(0, 2)), name)
    told = bench.refusal(3)
    assert "overlap in time" in told.what
    bench.say({"inputs": {"files": "monthly.nc"}})
    bench.success()


def test_a_variable_of_no_length(bench, ocean) -> None:
    bench.put(ocean(months=slice(0, 0)))
    told = bench.refusal(3)
    assert "no values" in told.what


def test_numbers_that_are_not(bench, ocean) -> None:
    ds = ocean()
    values = ds["dissic"].values.copy()
    wet = tuple(np.argwhere(values < 1e19)[7])
    values[wet] = np.inf
    ds["dissic"] = (ds["dissic"].dims, values, ds["dissic"].attrs)
    bench.put(ds)
    status = bench.success()["solution_status"]
    assert status.values[wet] == dict(zip(status.flag_meanings.split(), status.flag_values, strict=True))["missing_input"]


def test_two_reference_densities(bench, ocean) -> None:
    ds = ocean(tracer_units="mol m-3", density=1026.0)
    ds["dissic"].attrs["rho0"] = 1026.0
    ds["talk"].attrs["rho0"] = 1035.0
    bench.put(ds)
    told = bench.refusal(3)
    assert "different densities" in told.what
    bench.say(told.line())
    bench.success()


def test_a_classic_file_of_bytes_and_characters(bench, ocean) -> None:
    path = bench.put(ocean())
    with netCDF4.Dataset(path, "a") as file:
        file.createDimension("letters", 4)
        file.createVariable("station", "S1", ("letters",))[:] = np.array(list("ABCD"), "S1")
        file.createVariable("flag", "i1", ("lat", "lon"))[:] = 1
    bench.success()


def test_a_map_of_an_interior_level_with_its_depth_lost(bench, ocean) -> None:
    ds = ocean().isel(lev=2, drop=True)
    bench.put(ds)
    ended = bench.run()
    assert ended.exit_code == 0
    assert "taken to lie at the sea surface" in " ".join(ended.stdout.split())


def test_dic_lower_than_any_sea_is_refused_until_meant(bench, ocean) -> None:
    ds = ocean()
    for name in CARBON:
        ds[name] = xr.where(ds[name] < 1e19, ds[name] * 0.3, ds[name]).assign_attrs(ds[name].attrs)
    bench.put(ds)
    told = bench.refusal(3)
    assert "far from sea water" in told.what
    bench.say(told.line(-1))
    assert bench.words["reading"] == {"unusual_values": "accept"}
    bench.success()


def test_a_figure_of_what_is_not_there(bench, ocean) -> None:
    bench.put(ocean())
    bench.say({"figures": [{"kind": "map", "field": "ph_total_scale", "depth": 9000}]})
    told = bench.refusal(3)
    assert "9000" in told.what or "9,000" in told.what
    bench.say({"figures": [{"kind": "map", "field": "ph_total_scale", "depth": 0}]})
    bench.success()


@pytest.mark.parametrize("turned", [
    lambda ds: ds.isel(lev=slice(None, None, -1)), lambda ds: ds.isel(lat=slice(None, None, -1)),
    lambda ds: ds.transpose("lon", "lat", "lev", "bnds"), lambda ds: ds.roll(lon=5, roll_coords=True),
    lambda ds: ds.assign_coords(lon=("lon", ds["lon"].values - 360.0, ds["lon"].attrs)),
    lambda ds: ds.assign_coords(lev=("lev", -ds["lev"].values, ds["lev"].attrs | {"positive": "up"})),
    lambda ds: ds.assign_coords(lev=("lev", 100 * ds["lev"].values, ds["lev"].attrs | {"units": "cm"})),
])
def test_a_file_that_lies_another_way_gives_the_same_numbers(bench, ocean, turned) -> None:
    bench.put(ocean())
    true = bench.success()["ph_total_scale"]
    bench.put(turned(ocean()))
    found = bench.success()["ph_total_scale"]
    metres = abs(found["lev"]) * {"m": 1.0, "cm": 0.01}[found["lev"].attrs["units"]]
    found = found.assign_coords(lon=found["lon"] % 360, lev=metres).sortby(["lev", "lat", "lon"])
    np.testing.assert_array_equal(found.values, true.values)
