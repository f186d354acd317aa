"""Every kind of file of the invented ocean: its axes are found, its grid comes along, its numbers are untouched."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import find_axes
from gridcarb.sources import Collection, InputsSettings, close_all, open_collection, survey
from synthetic_grids.kinds import KINDS, REGISTER, scene_of

MONTHS = {"time_months_since": {"months": "calendar"}}
SHAPES = {
    "grid_raster": ("rectilinear", ("time", "lev", "lat", "lon")),
    "grid_tripolar_edge_fold": ("curvilinear", ("time", "lev", "j", "i")),
    "grid_rotated_pole": ("curvilinear", ("time", "lev", "rlat", "rlon")),
    "grid_bipolar": ("curvilinear", ("time", "lev", "y", "x")),
    "grid_triangles_from_0": ("unstructured", ("time", "lev", "node")),
    "grid_polygons_from_1": ("unstructured", ("time", "lev", "face")),
    "grid_cells_in_radians": ("unstructured", ("time", "lev", "cell")),
    "grid_single_column": ("column", ("time", "lev")),
    "grid_single_cell": ("rectilinear", ("lev", "lat", "lon")),
    "grid_stations": ("unstructured", ("time", "lev", "station")),
    "grid_casts": ("unstructured", ("lev", "profile")),
    "grid_dims_turned": ("rectilinear", ("time", "lev", "lat", "lon")),
    "vertical_pressure_field": ("rectilinear", ("time", "level", "lat", "lon")),
    "vertical_surface": ("rectilinear", ("time", "lat", "lon")),
    "time_none": ("rectilinear", ("lev", "lat", "lon")),
}


@pytest.fixture(scope="module", params=[name for name in KINDS if not name.startswith("mask")])
def kind(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> tuple[str, Collection]:
    name = request.param
    folder = tmp_path_factory.mktemp("kinds")
    KINDS[name](folder)
    found = survey(InputsSettings(files=("*",), **MONTHS.get(name, {})), folder)
    close_all()
    assert found.faults == ()
    assert found.collection is not None
    return name, found.collection


def test_its_shape_is_understood(kind: tuple[str, Collection]) -> None:
    name, collection = kind
    if name in SHAPES:
        assert (collection.kind, collection.axes.order) == SHAPES[name]
    assert collection.axes.latitude is not None
    assert collection.axes.longitude is not None
    assert len(collection.roles) == 6
    assert find_axes(open_collection(collection)) == collection.axes


def test_its_numbers_are_those_of_the_files(kind: tuple[str, Collection]) -> None:
    name, collection = kind
    written, found = scene_of(name).dataset, open_collection(collection)
    for role, source in collection.roles.items():
        theirs = written[source.variable]
        np.testing.assert_array_equal(found[role].values, theirs.transpose(*found[role].dims).values)
    for coordinate in set(found.coords) & set(written.variables) - {"time"}:
        ours, theirs = found[coordinate].variable, written[coordinate].variable
        np.testing.assert_array_equal(ours.transpose(*theirs.dims).values, theirs.values)


def test_what_describes_the_grid_comes_along(kind: tuple[str, Collection]) -> None:
    name, collection = kind
    written, found = scene_of(name).dataset, open_collection(collection)
    tracers = {source.variable for source in collection.roles.values()}
    assert set(written.variables) - tracers <= set(found.coords)
    for variable in found.variables.values():
        for key in ("bounds", "climatology", "grid_mapping", "mesh"):
            assert variable.attrs.get(key, "time") in {*found.coords, "time"}
    assert ("area" in collection.measures) is REGISTER[name].measured


@pytest.mark.parametrize(("name", "stamps"), [
    ("time_stamps_at_start", "start"), ("time_stamps_at_end", "end"), ("grid_raster", "middle"),
    ("time_without_bounds", "unknown"), ("time_climatology", "unknown"),
])
def test_stamps_are_told(name: str, stamps: str, tmp_path: Path) -> None:
    KINDS[name](tmp_path)
    found = survey(InputsSettings(files=("*",)), tmp_path).collection
    assert found
    assert found.time
    assert found.time.stamps == stamps
    assert found.time.climatological is (name == "time_climatology")
    np.testing.assert_array_equal(open_collection(found).time, scene_of(name).dataset.time)


def test_months_are_told_in_days(tmp_path: Path) -> None:
    KINDS["time_months_since"](tmp_path)
    found = survey(InputsSettings(files=("*",)), tmp_path)
    assert "inputs: {months: calendar}" in found.faults[0].mend
    found = survey(InputsSettings(files=("*",), months="calendar"), tmp_path)
    assert found.collection
    time = open_collection(found.collection).time
    assert time.attrs["units"] == "days since 2010-11-01"
    np.testing.assert_array_equal(time, [15.0, 30 + 15.5, 61 + 15.5])
    assert [notice.code for notice in found.collection.notices] == ["months-in-days"]


def test_a_moment_a_file(tmp_path: Path) -> None:
    """Files without a time dimension, each with a scalar time, are one axis; a sea surface goes with its moment."""
    whole = scene_of("vertical_ocean_sigma").dataset
    for step in (2, 0, 1):
        whole.isel(time=step).drop_vars("time_bnds").to_netcdf(tmp_path / f"{step}.nc")
    found = survey(InputsSettings(files=("*.nc",)), tmp_path)
    assert found.faults == ()
    assert found.collection
    ours = open_collection(found.collection)
    assert ours.temperature.dims == ("time", "layer", "lat", "lon")
    for name, theirs in (("surface", whole.surface), ("dic", whole.dissic)):
        np.testing.assert_array_equal(ours[name], theirs)
        for part in (1, slice(1, 3), [0, 2]):
            cut = {"time": part, "lat": slice(2, 4)}
            np.testing.assert_array_equal(ours[name].isel(cut), theirs.isel(cut))
    xr.testing.assert_identical(ours.isel(time=[1]).load(), ours.load().isel(time=[1]))
