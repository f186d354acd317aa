"""The axes of invented headers: by attributes, by names, in any order, on every kind of grid."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import Axes, find_axes, grid_kind
from gridcarb.errors import InputError


def _grid(dims: tuple[str, ...], sizes: dict[str, int], attrs: dict[str, dict[str, str]]) -> xr.Dataset:
    """A dataset with one field `f` along `dims` and a 1-D coordinate for every entry of `attrs`."""
    coords = {name: (name, np.arange(float(sizes[name])), words) for name, words in attrs.items()}
    return xr.Dataset({"f": (dims, np.zeros([sizes[dim] for dim in dims]))}, coords=coords)


SIZES = {"a": 2, "b": 3, "c": 4, "d": 5}
WORDS = {
    "a": {"units": "days since 2000-01-01"},
    "b": {"positive": "down", "units": "m"},
    "c": {"units": "degrees_north"},
    "d": {"units": "degreeE"},
}


@pytest.mark.parametrize("dims", list(itertools.permutations("abcd")))
def test_attributes_decide_and_the_order_of_dimensions_does_not(dims: tuple[str, ...]) -> None:
    axes = find_axes(_grid(dims, SIZES, WORDS))
    assert axes == Axes("a", "b", ("c", "d"), "a", "b", "c", "d")
    assert axes.order == ("a", "b", "c", "d")


@pytest.mark.parametrize(("a", "b", "c", "d"), [
    ({"axis": "T"}, {"axis": "Z"}, {"standard_name": "latitude"}, {"standard_name": "longitude"}),
    ({"standard_name": "time"}, {"standard_name": "depth"}, {"units": "degree_N"}, {"units": "degree_east"}),
    ({"standard_name": "time"}, {"units": "dbar"}, {"units": "degreesN"}, {"units": "degrees_E"}),
    ({"axis": "T"}, {"standard_name": "ocean_sigma_coordinate"}, {"units": "degrees_N"}, {"units": "degreesE"}),
])
def test_each_kind_of_evidence_is_enough(
    a: dict[str, str], b: dict[str, str], c: dict[str, str], d: dict[str, str]
) -> None:
    assert find_axes(_grid(("d", "b", "a", "c"), SIZES, {"a": a, "b": b, "c": c, "d": d})).order == ("a", "b", "c", "d")


def test_names_are_the_last_resort() -> None:
    sizes = {"lon": 2, "lat": 3, "lev": 4, "time": 5}
    axes = find_axes(_grid(tuple(sizes), sizes, {name: {} for name in sizes}))
    assert axes == Axes("time", "lev", ("lat", "lon"), "time", "lev", "lat", "lon")
    misleading = find_axes(_grid(tuple(sizes), sizes, {"time": {"axis": "Z"}, "lev": {"axis": "T"}, "lat": {}, "lon": {}}))
    assert (misleading.time, misleading.vertical) == ("lev", "time")


def test_dimensions_without_coordinates() -> None:
    axes = find_axes(_grid(("time", "depth", "i", "j"), {"time": 2, "depth": 3, "i": 4, "j": 5}, {}))
    assert axes == Axes("time", "depth", ("j", "i"), None, None, None, None)


def test_decoded_and_raw_headers_agree() -> None:
    ds = _grid(("a", "b", "c", "d"), SIZES, WORDS)
    assert find_axes(xr.decode_cf(ds)) == find_axes(ds)


@pytest.mark.parametrize("calendar", ["standard", "360_day"])
def test_dates_without_a_word_are_time(calendar: str) -> None:
    dates = xr.date_range("2001-01-01", periods=2, calendar=calendar, use_cftime=calendar != "standard")
    ds = xr.Dataset({"f": (("when", "x"), np.zeros((2, 3)))}, coords={"when": dates})
    assert find_axes(ds).time == "when"


def _curvilinear() -> xr.Dataset:
    plane = ("eta", "xi")
    return xr.Dataset(
        {
            "f": (("t", "k", "xi", "eta"), np.zeros((2, 3, 5, 4)), {"coordinates": "north east deep"}),
            "north": (plane, np.zeros((4, 5)), {"units": "degrees_north"}),
            "east": (plane, np.zeros((4, 5)), {"units": "degrees_east"}),
            "deep": ("k", [1.0, 2.0, 3.0], {"standard_name": "depth", "bounds": "deep_edges"}),
            "deep_edges": (("k", "two"), np.zeros((3, 2)), {"units": "m"}),
            "floor": (plane, np.zeros((4, 5)), {"standard_name": "sea_floor_depth_below_geoid"}),
            "t": ("t", [0.0, 1.0], {"units": "days since 2000-01-01", "calendar": "noleap"}),
        },
    )


def test_two_dimensional_latitude_gives_the_order_of_the_plane() -> None:
    ds = _curvilinear()
    axes = find_axes(ds)
    assert axes == Axes("t", "k", ("eta", "xi"), "t", "deep", "north", "east")
    assert grid_kind(ds, axes) == "curvilinear"


def test_a_coordinate_the_data_point_at_beats_a_nominal_axis() -> None:
    ds = _curvilinear().assign_coords(
        xi=("xi", np.arange(5.0), {"units": "degrees_E"}), eta=("eta", np.arange(4.0), {"units": "degrees_N"}),
        k=("k", np.arange(3.0), {"axis": "Z", "positive": "down"}),
    )
    axes = find_axes(ds)
    assert (axes.latitude, axes.longitude, axes.vertical_coordinate) == ("north", "east", "deep")


def test_time_is_told_by_its_own_dimension() -> None:
    units = {"units": "days since 2000-01-01"}
    ds = xr.Dataset(
        {"f": (("t", "x"), np.zeros((2, 3)), {"coordinates": "middle"}), "middle": ("t", [0.5, 1.5], units)},
        coords={"t": ("t", [0.0, 1.0], units)},
    )
    assert find_axes(ds).time_coordinate == "t"


def test_a_bare_counter_gives_way_to_a_time_that_tells_dates() -> None:
    dates = {"units": "seconds since 1900-01-01", "standard_name": "time", "calendar": "360_day"}
    ds = xr.Dataset(
        {"f": (("t", "x"), np.zeros((2, 3)), {"coordinates": "middle"}), "middle": ("t", [0.5, 1.5], dates)},
        coords={"t": ("t", [0.0, 0.0], {"axis": "T"})},
    )
    axes = find_axes(ds)
    assert (axes.time, axes.time_coordinate) == ("t", "middle")


def test_unstructured_and_stations() -> None:
    ds = xr.Dataset(
        {"f": (("cell", "z"), np.zeros((4, 2)), {"coordinates": "y x"}),
         "y": ("cell", np.zeros(4), {"standard_name": "latitude", "units": "radian"}),
         "x": ("cell", np.zeros(4), {"standard_name": "longitude", "units": "radian"})},
        coords={"z": ("z", [0.0, 5.0], {"positive": "down"})},
    )
    axes = find_axes(ds)
    assert axes == Axes(None, "z", ("cell",), None, "z", "y", "x")
    assert grid_kind(ds, axes) == "unstructured"


def test_single_column_and_single_cell() -> None:
    scalars = {"lat": ((), 1.0, {"units": "degrees_north"}), "lon": ((), 2.0, {"units": "degrees_east"})}
    column = xr.Dataset({"f": ("z", np.zeros(3))}, coords={**scalars, "z": ("z", np.arange(3.0), {"axis": "Z"})})
    axes = find_axes(column)
    assert axes == Axes(None, "z", (), None, "z", "lat", "lon")
    assert grid_kind(column, axes) == "column"
    cell = find_axes(column.isel(z=0))
    assert (cell.order, cell.vertical_coordinate) == ((), "z")


def test_scalar_depth_of_a_surface_field() -> None:
    ds = _grid(("c", "d"), SIZES, {"c": WORDS["c"], "d": WORDS["d"]}).assign_coords(depth=((), 0.0, {"units": "m"}))
    axes = find_axes(ds)
    assert (axes.vertical, axes.vertical_coordinate) == (None, "depth")


def test_depths_that_differ_from_column_to_column() -> None:
    ds = _grid(("s", "c", "d"), {**SIZES, "s": 2}, {"c": WORDS["c"], "d": WORDS["d"]})
    ds = ds.assign_coords(gdept=(("s", "c", "d"), np.zeros((2, 4, 5)), {"standard_name": "depth"}))
    axes = find_axes(ds)
    assert (axes.vertical, axes.vertical_coordinate) == ("s", "gdept")


def test_sea_floor_depth_is_no_vertical_axis() -> None:
    ds = _grid(("c", "d"), SIZES, {"c": WORDS["c"], "d": WORDS["d"]}).assign_coords(depth=(("c", "d"), np.zeros((4, 5))))
    assert find_axes(ds).vertical_coordinate is None


def test_projected_axes() -> None:
    words = {"c": {"standard_name": "projection_y_coordinate"}, "d": {"standard_name": "projection_x_coordinate"}}
    assert find_axes(_grid(("d", "c"), SIZES, words)).horizontal == ("c", "d")


def test_an_ensemble_is_refused_and_one_member_is_passed_over() -> None:
    ds = _grid(("member", "c", "d"), {**SIZES, "member": 3}, {"c": WORDS["c"], "d": WORDS["d"]})
    with pytest.raises(InputError, match=r"'member'.*neither time") as caught:
        find_axes(ds)
    assert caught.value.where == "variable f"
    assert find_axes(ds.isel(member=[0])).order == ("c", "d")


def test_a_reference_time_is_not_the_time() -> None:
    ds = _grid(("a", "c", "d"), SIZES, WORDS | {"a": {"standard_name": "time"}}).drop_vars("b", errors="ignore")
    ds = ds.assign_coords(r=((), 0.0, {"standard_name": "forecast_reference_time", "units": "days since 1990-01-01"}))
    assert find_axes(ds).time_coordinate == "a"
    assert find_axes(ds.isel(a=0, drop=True)).time_coordinate is None


def _places(dim: str, size: int) -> dict[str, tuple[str, np.ndarray, dict[str, str]]]:
    return {
        "lat": (dim, np.arange(float(size)), {"units": "degrees_north"}),
        "lon": (dim, np.arange(float(size)), {"units": "degrees_east"}),
        "time": (dim, np.arange(float(size)), {"units": "days since 2000-01-01"}),
    }


@pytest.mark.parametrize("dim", ["profile", "time", "anything"])
def test_casts_and_tracks_are_places_and_not_a_time_axis(dim: str) -> None:
    ds = xr.Dataset({"f": ((dim, "z"), np.zeros((4, 3)))}, coords=_places(dim, 4))
    axes = find_axes(ds)
    assert axes.order == ("z", dim)
    assert (axes.time, axes.time_coordinate) == (None, "time")
    assert grid_kind(ds, axes) == "unstructured"


def test_one_place_at_many_times_keeps_its_time_axis() -> None:
    places = {name: ((), 1.0, words) for name, (_, _, words) in _places("x", 1).items() if name != "time"}
    ds = xr.Dataset({"f": (("time", "z"), np.zeros((4, 3)))}, coords={**places, "time": _places("time", 4)["time"]})
    axes = find_axes(ds)
    assert (axes.order, grid_kind(ds, axes)) == (("time", "z"), "column")


@pytest.mark.parametrize("units", ["radian", "degrees_north"])
def test_places_in_radians(units: str) -> None:
    words = {"standard_name": "latitude", "units": units}
    ds = xr.Dataset({"f": ("cell", np.zeros(4))}, coords={
        "yy": ("cell", np.zeros(4), words), "xx": ("cell", np.zeros(4), {**words, "standard_name": "longitude"}),
    })
    assert find_axes(ds).horizontal == ("cell",)
    assert find_axes(ds).latitude == "yy"


def test_a_sea_floor_is_no_vertical_coordinate() -> None:
    floor = {"standard_name": "sea_floor_depth_below_geoid", "units": "m", "positive": "down"}
    ds = xr.Dataset({"f": ((), 1.0)}, coords={"deptho": ((), 100.0, floor)})
    assert find_axes(ds).vertical_coordinate is None
