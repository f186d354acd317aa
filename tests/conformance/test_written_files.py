"""Written files against the CF conventions, as an independent checker reads them, and against the official name table."""

from __future__ import annotations

import xml.etree.ElementTree as ET
from datetime import UTC, datetime
from importlib.resources import files
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

import gridcarb.chemistry  # noqa: F401  puts the derived fields into the catalogue
from gridcarb.axes import find_axes
from gridcarb.fields import FIELDS
from gridcarb.write import netcdf, store
from gridcarb.write.amounts import per_volume_field
from gridcarb.write.attributes import global_attributes

LAT = ("lat", np.array([-45.0, -15.0, 15.0, 45.0]),
       {"units": "degrees_north", "standard_name": "latitude", "bounds": "lat_bnds", "axis": "Y", "_FillValue": 1e20})
LON = ("lon", np.arange(5) * 72.0 + 36,
       {"units": "degrees_east", "standard_name": "longitude", "bounds": "lon_bnds", "axis": "X"})
BOUNDS = {
    "lat_bnds": (("lat", "bnds"), LAT[1][:, None] + [-15.0, 15.0], {"_FillValue": 1e20}),
    "lon_bnds": (("lon", "bnds"), LON[1][:, None] + [-36.0, 36.0]),
}
LEV = ("lev", np.array([5.0, 50.0, 500.0]),
       {"units": "m", "positive": "down", "standard_name": "depth", "axis": "Z", "long_name": "depth of the level"})
TIME = ("time", np.array([15.5, 45.0, 74.5]),
        {"units": "days since 2001-01-01 00:00:00", "calendar": "noleap", "standard_name": "time", "axis": "T",
         "bounds": "time_bnds"})
TIME_BOUNDS = {"time_bnds": (("time", "bnds"), np.array([[0.0, 31.0], [31.0, 59.0], [59.0, 90.0]]))}


def rectilinear_with_time() -> xr.Dataset:
    return xr.Dataset(coords={"time": TIME, "lev": LEV, "lat": LAT, "lon": LON, **BOUNDS, **TIME_BOUNDS})


def without_time() -> xr.Dataset:
    return xr.Dataset(coords={"lev": LEV, "lat": LAT, "lon": LON, **BOUNDS})


def scalar_depth() -> xr.Dataset:
    depth = ((), 0.0, {"units": "m", "positive": "down", "standard_name": "depth", "axis": "Z"})
    return xr.Dataset(coords={"time": TIME, "depth": depth, "lat": LAT, "lon": LON, **BOUNDS, **TIME_BOUNDS})


def curvilinear() -> xr.Dataset:
    j, i = np.meshgrid(np.arange(4.0), np.arange(5.0), indexing="ij")
    lat, lon = 60 + 5 * j - i, 10 + 8 * i + 2 * j
    corners = np.array([[-0.5, -0.5], [-0.5, 0.5], [0.5, 0.5], [0.5, -0.5]])
    return xr.Dataset(coords={
        "time": TIME, "lev": LEV, **TIME_BOUNDS,
        "nav_lat": (("y", "x"), lat, {"units": "degrees_north", "standard_name": "latitude", "bounds": "lat_corners"}),
        "nav_lon": (("y", "x"), lon, {"units": "degrees_east", "standard_name": "longitude", "bounds": "lon_corners"}),
        "lat_corners": (("y", "x", "corner"), lat[..., None] + 5 * corners[:, 0] - corners[:, 1]),
        "lon_corners": (("y", "x", "corner"), lon[..., None] + 2 * corners[:, 0] + 8 * corners[:, 1]),
    })


GRIDS = {grid.__name__: grid for grid in (rectilinear_with_time, without_time, scalar_depth, curvilinear)}


def write(grid: xr.Dataset, folder: Path, *, amounts: str, zarr_format: int) -> Path:
    sizes, axes = dict(grid.sizes), find_axes(grid)
    fields = [field for field in FIELDS.values() if field.part != "input"]
    if amounts == "per volume":
        fields = [per_volume_field(field) for field in fields]
    inputs = {"temperature": (axes.order, np.zeros([sizes[dim] for dim in axes.order]), {"cell_methods": "area: mean"})}
    template = grid.assign(inputs).assign_attrs(institution="Institute of the Invented Ocean", history="2001: made")
    attributes = global_attributes(
        title="Test of conformity", template=template, axes=axes, fields=fields, now=datetime(2020, 1, 2, tzinfo=UTC),
        citations=["lueker2000"], notes=["Silicate was assumed to be zero."], own={"license": "CC0-1.0", "number": 3},
    )
    store.create(folder / "r.zarr", template=template, fields=fields, axes=axes, chunks={"time": 1}, attributes=attributes,
                 zarr_format=zarr_format)
    values = np.linspace(*FIELDS["ph_total_scale"].sane_range, template["temperature"].size)
    shaped = values.reshape(template["temperature"].shape)
    block = {}
    for field in fields:
        if field.part == "status":
            block[field.key] = (axes.order, np.zeros(shaped.shape, "int8"))
        else:
            block[field.key] = (axes.order, np.where(shaped < 7.2, np.nan, shaped))
    store.write_block(folder / "r.zarr", {}, xr.Dataset(block))
    netcdf.export(folder / "r.zarr", folder / "r.nc")
    return folder / "r.nc"


@pytest.mark.parametrize("kind", list(GRIDS))
def test_the_checker_finds_nothing_wrong(kind, tmp_path, complaints):
    found = complaints(write(GRIDS[kind](), tmp_path, amounts="per mass", zarr_format=3))
    if kind == "curvilinear":
        # The checker knows a dimension without coordinate variable for no part of space and advises to put it before the
        # vertical. With `axis` on numbers of rows it takes those for latitudes. Time, vertical, y, x is what CF means.
        found = [message for message in found if not message.startswith("§2.4 Dimensions")]
    assert found == []


def test_amounts_per_volume_from_a_store_of_format_2_conform_as_well(tmp_path, complaints):
    assert complaints(write(rectilinear_with_time(), tmp_path, amounts="per volume", zarr_format=2)) == []


@pytest.mark.parametrize("way", ["by field", "by year", "by month"])
def test_each_of_several_files_conforms(way, tmp_path, complaints):
    write(rectilinear_with_time(), tmp_path, amounts="per mass", zarr_format=3)
    targets = netcdf.export_parts(tmp_path / "r.zarr", tmp_path / "several", way)
    assert len(targets) == {"by field": 12, "by year": 1, "by month": 3}[way]
    assert [complaints(target) for target in targets[:3]] == [[]] * min(3, len(targets))


def test_the_checker_would_notice(tmp_path, complaints):
    path = write(without_time(), tmp_path, amounts="per mass", zarr_format=3)
    with netCDF4.Dataset(path, "a") as file:
        file["co2_fugacity"].units = "no unit at all"
        file["lat"].setncattr("standard_name", "not_a_name")
    found = complaints(path)
    assert any(message.startswith("§3.1 Units") for message in found)
    assert any("not_a_name" in message for message in found)


@pytest.mark.parametrize("kind", list(GRIDS))
def test_no_coordinate_bound_or_status_has_a_fill(kind, tmp_path):
    path = write(GRIDS[kind](), tmp_path, amounts="per mass", zarr_format=3)
    with netCDF4.Dataset(path) as file:
        filled = {name for name, variable in file.variables.items() if "_FillValue" in variable.ncattrs()}
    assert filled == {field.key for field in FIELDS.values() if field.part == "derived"}


@pytest.mark.parametrize("key", list(FIELDS))
def test_standard_names_and_units_agree_with_the_official_table(key):
    from cf_units import Unit

    root = ET.fromstring((files("compliance_checker") / "data" / "cf-standard-name-table.xml").read_text(encoding="utf-8"))
    table = {entry.get("id"): entry.findtext("canonical_units") for entry in root.iter("entry")}
    for field in (FIELDS[key], per_volume_field(FIELDS[key])):
        unit = Unit(field.units)
        if field.standard_name is not None and field.part != "status":
            assert unit.is_convertible(Unit(table[field.standard_name]))
    assert FIELDS[key].standard_name is None or FIELDS[key].standard_name in table
