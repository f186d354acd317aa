"""Several NetCDF files of one store: by field and by period, together what the one file holds."""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import OutputError
from gridcarb.write.netcdf import export, export_parts


@pytest.fixture
def store(tmp_path: Path) -> Path:
    """Fourteen months of a 360-day calendar in chunks of four, two fields and their status."""
    shape, status = (14, 2, 3), "solution_status"
    numbers = np.random.default_rng(1).uniform(1, 9, shape).astype("f4")
    numbers[:, 0, 0] = np.nan
    dims = ("time", "y", "x")
    made = xr.Dataset(
        {name: (dims, numbers + at, {"units": "1", "ancillary_variables": status})
         for at, name in enumerate(("ph", "omega"))}
        | {status: (dims, np.isnan(numbers).astype("i1"), {"flag_values": [0, 1], "flag_meanings": "solved missing"})},
        coords={"time": ("time", 15.0 + 30 * np.arange(14), {
            "units": "days since 2010-11-01", "calendar": "360_day", "axis": "T", "standard_name": "time"})},
        attrs={"title": "one", "time_coverage_start": "2010-11-16T00:00:00Z"},
    )  # fmt: skip
    chunks = {name: {"chunks": (4, 2, 3)} for name in made.data_vars}
    made.to_zarr(tmp_path / "store", consolidated=False, encoding=chunks)
    return tmp_path / "store"


def whole(store: Path) -> xr.Dataset:
    target = store.with_name("whole.nc")
    export(store, target)
    return xr.load_dataset(target, decode_cf=False)


@pytest.mark.parametrize(("files", "names"), [
    ("by year", ["fields_2010", "fields_2011"]),
    ("by month", ["fields_2010-11", "fields_2010-12", *(f"fields_2011-{month:02d}" for month in range(1, 13))]),
])
def test_periods_together_are_the_whole(store: Path, tmp_path: Path, files, names) -> None:
    targets = export_parts(store, tmp_path / "netcdf", files)
    assert [target.stem for target in targets] == names
    assert sorted(tmp_path.joinpath("netcdf").iterdir()) == targets
    parts = [xr.load_dataset(target, decode_cf=False) for target in targets]
    for part in parts:
        assert part.attrs["title"] == "one"
        with netCDF4.Dataset(targets[0]) as file:
            assert file.dimensions["time"].isunlimited()
    assert parts[-1].attrs["time_coverage_start"] == f"{'2011-01' if files == 'by year' else '2011-12'}-16T00:00:00Z"
    together = xr.concat(parts, "time", data_vars="all", combine_attrs="drop_conflicts")
    xr.testing.assert_equal(together, whole(store))


def test_fields_come_with_their_status(store: Path, tmp_path: Path) -> None:
    targets = export_parts(store, tmp_path / "netcdf", "by field")
    assert [target.name for target in targets] == ["omega.nc", "ph.nc"]
    one = whole(store)
    for target in targets:
        found = xr.load_dataset(target, decode_cf=False)
        assert set(found.data_vars) == {target.stem, "solution_status"}
        xr.testing.assert_identical(found, one[[target.stem, "solution_status"]])


def test_without_a_time_all_is_one_file(store: Path, tmp_path: Path) -> None:
    with xr.open_zarr(store, consolidated=False, decode_cf=False) as source:
        still = source.isel(time=0).drop_vars("time").load()
    for variable in still.variables.values():
        variable.encoding.clear()
    still.to_zarr(tmp_path / "still", consolidated=False, encoding={name: {"chunks": (2, 3)} for name in still.data_vars})
    assert [path.name for path in export_parts(tmp_path / "still", tmp_path / "netcdf", "by year")] == ["fields.nc"]


@pytest.mark.parametrize(("attrs", "told"), [
    ({"units": "somewhen"}, "cannot be dated"), ({"units": "days since 2010-11-01", "calendar": "360_day"}, "come back")])
def test_times_that_make_no_periods_are_refused(store: Path, tmp_path: Path, attrs, told) -> None:
    import zarr

    time = zarr.open_array(store / "time", mode="r+")
    time.attrs.update(attrs)
    if told == "come back":
        time[-1] = 15.0
    with pytest.raises(OutputError, match=told) as caught:
        export_parts(store, tmp_path / "netcdf", "by year")
    assert "netcdf_files: one" in caught.value.mend
    assert not (tmp_path / "netcdf").exists()
