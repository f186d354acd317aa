from __future__ import annotations

from datetime import UTC, datetime, timedelta, timezone

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.errors import OutputError
from gridcarb.write.attributes import field_attributes, global_attributes, inherited_attributes
from gridcarb.write.coordinates import auxiliary, clean_coordinates, numbers
from gridcarb.write.coverage import geospatial, time_coverage

NOW = datetime(2020, 5, 4, 3, 2, 1, tzinfo=timezone(timedelta(hours=2)))


@pytest.fixture
def described(grid):
    def describe(**changes):
        return global_attributes(**{
            "title": "First look", "template": grid.template, "axes": grid.axes, "fields": grid.fields, "now": NOW,
        } | changes)

    return describe


def test_global_attributes_say_what_acdd_wants_most(described):
    found = described(citations=["lueker2000"], notes=["Density: 1025 kg m-3.", "Silicate: zero."])
    assert found["Conventions"] == "CF-1.11, ACDD-1.3"
    assert found["title"] == "First look"
    assert found["summary"].endswith("total alkalinity: pH; depth of a horizon.")
    assert "sea_water_ph_reported_on_total_scale" in found["keywords"].split(", ")
    assert found["source"].startswith("gridcarb ")
    assert found["source"].endswith("; computed from: an invented model")
    assert found["date_created"] == "2020-05-04T01:02:01Z"
    assert found["comment"] == "Density: 1025 kg m-3. Silicate: zero."
    assert found["references"].index("Lueker") < found["references"].index("Guide to best practices")
    assert "https://doi.org/10.1016/S0304-4203(00)00022-0" in found["references"]


def test_history_is_continued_not_replaced(described, grid):
    old, new = described()["history"].split("\n")
    assert old == "2001: made"
    assert new.startswith("2020-05-04T01:02:01Z: gridcarb ")
    assert "ph_total_scale" in new
    grid.template.attrs.clear()
    assert "\n" not in described()["history"]


def test_what_holds_for_the_result_is_kept_from_the_input_and_the_users_words_win(described):
    found = described(own={"institution": "Harbour Laboratory", "license": "CC0-1.0", "run_number": 3})
    assert found["institution"] == "Harbour Laboratory"
    assert found["geography"] == "invented"
    assert (found["license"], found["run_number"]) == ("CC0-1.0", 3)
    assert "tracking_id" not in found
    assert "comment" not in described()


@pytest.mark.parametrize("key", ["Conventions", "history"])
def test_attributes_that_must_be_true_cannot_be_set(described, key):
    with pytest.raises(OutputError, match=key) as caught:
        described(own={key: "mine"})
    assert "attributes" in caught.value.mend


def test_the_place_is_derived_from_coordinates_and_bounds(grid):
    found = geospatial(grid.template, grid.axes)
    assert (found["geospatial_lat_min"], found["geospatial_lat_max"]) == (-30.0, 30.0)
    assert (found["geospatial_lon_min"], found["geospatial_lon_max"]) == (0.0, 288.0)
    assert (found["geospatial_vertical_min"], found["geospatial_vertical_max"]) == (5.0, 500.0)
    assert found["geospatial_vertical_positive"] == "down"
    assert found["geospatial_vertical_units"] == "m"
    bounds = grid.template.assign_coords(lat_bnds_of_no_file=(("lat", "bnds"), [[-40, -20], [-20, 0], [0, 20], [20, 41]]))
    assert geospatial(bounds, grid.axes)["geospatial_lat_max"] == 41.0


def test_fills_and_radians_in_coordinates_do_not_mislead():
    ds = xr.Dataset(coords={
        "clat": ("cell", [-np.pi / 2, 0.5, 1e20, np.nan], {"units": "radian", "_FillValue": 1e20}),
        "clon": ("cell", [0.0, np.pi, 1e20, np.nan], {"units": "radian", "missing_value": 1e20}),
    })
    found = geospatial(ds, Axes(None, None, ("cell",), None, None, "clat", "clon"))
    assert found["geospatial_lat_min"] == pytest.approx(-90)
    assert found["geospatial_lat_max"] == pytest.approx(np.degrees(0.5))
    assert found["geospatial_lon_max"] == pytest.approx(180)


def timed(values, units, calendar=None, bounds=None):
    attrs = {"units": units} | ({"calendar": calendar} if calendar else {}) | ({"bounds": "tb"} if bounds else {})
    ds = xr.Dataset(coords={"t": ("t", values, attrs)})
    if bounds:
        ds = ds.assign_coords(tb=(("t", "two"), bounds))
    return time_coverage(ds, Axes("t", None, (), "t", None, None, None))


def test_the_time_is_derived_in_its_own_calendar(grid):
    assert time_coverage(grid.template, grid.axes) == {
        "time_coverage_start": "2001-01-01T00:00:00Z", "time_coverage_end": "2001-07-01T00:00:00Z",
        "time_coverage_duration": "P180D", "time_coverage_resolution": "P1M",
        "time_coverage_comment": "dates are of the 360_day calendar, durations nominal",
    }


def test_steps_have_their_usual_names():
    assert timed([0, 1, 2], "days since 2000-02-28") == {
        "time_coverage_start": "2000-02-28T00:00:00Z", "time_coverage_end": "2000-03-01T00:00:00Z",
        "time_coverage_duration": "P2D", "time_coverage_resolution": "P1D",
    }
    assert timed([0, 365, 730], "days since 2001-01-01", "noleap")["time_coverage_resolution"] == "P1Y"
    assert timed([0, 5, 10], "days since 2001-01-01")["time_coverage_resolution"] == "P5D"
    assert timed([0, 6], "hours since 2001-01-01")["time_coverage_resolution"] == "PT21600S"
    assert timed([15], "days since 0000-01-01", "365_day", [[0, 31]])["time_coverage_end"] == "0000-02-01T00:00:00Z"
    assert "time_coverage_resolution" not in timed([15], "days since 2001-01-01")


@pytest.mark.parametrize("units", ["months since 2001-01-01", "month", "", "days since the flood"])
def test_times_that_cannot_be_dated_are_left_out(units):
    assert timed([0, 1], units) == {}


def test_no_time_and_no_place_give_no_attributes():
    axes = Axes(None, None, ("cell",), None, None, None, None)
    assert geospatial(xr.Dataset(), axes) == time_coverage(xr.Dataset(), axes) == {}


def test_only_what_every_input_says_is_inherited():
    ds = xr.Dataset({"a": ((), 0, {"cell_methods": "time: mean", "grid_mapping": "crs"}),
                     "b": ((), 0, {"cell_methods": "time: point", "grid_mapping": "crs"})})
    assert inherited_attributes(ds) == {"grid_mapping": "crs"}
    assert inherited_attributes(xr.Dataset()) == {}


def test_mapping_measures_and_methods_are_carried_only_if_they_fit(grid):
    coords = {
        "crs": xr.Variable((), 0, {"grid_mapping_name": "latitude_longitude"}),
        "areacello": xr.Variable(("lat", "lon"), np.ones((2, 2))),
        "volcello": xr.Variable(("lev", "lat", "lon"), np.ones((2, 2, 2))),
    }
    inherited = {"grid_mapping": "crs", "cell_measures": "area: areacello volume: volcello",
                 "cell_methods": "area: mean where sea time: point (interval: 1 day)"}
    assert "Computed from inputs averaged" not in field_attributes(grid.ph, ("time",), coords, inherited, None)["comment"]
    cell = field_attributes(grid.ph, ("time", "lev", "lat", "lon"), coords, inherited, None)
    assert cell["grid_mapping"] == "crs"
    assert cell["cell_measures"] == "area: areacello volume: volcello"
    assert cell["cell_methods"] == inherited["cell_methods"]
    column = field_attributes(grid.horizon, ("time", "lat", "lon"), coords, inherited, None)
    assert column["cell_measures"] == "area: areacello"
    still = field_attributes(grid.ph, ("lat", "lon"), coords, inherited, None)
    assert "cell_methods" not in still
    assert "cell_methods" not in field_attributes(grid.status, ("time", "lat", "lon"), coords, inherited, None)
    assert "grid_mapping" not in field_attributes(grid.ph, (), {}, inherited, None)


def test_helpers_are_no_auxiliary_coordinates(grid):
    coords = clean_coordinates(grid.template.assign_coords(
        crs=((), 0, {"grid_mapping_name": "latitude_longitude"}), mesh=((), 0, {"cf_role": "mesh_topology"}),
        lat2=(("lat", "lon"), np.zeros((4, 5)), {"bounds": "lat2_b"}), lat2_b=(("lat", "lon", "n"), np.zeros((4, 5, 3))),
    ), grid.axes)
    assert auxiliary(("time", "lev", "lat", "lon"), coords) == ["basin", "letters", "run", "lat2"]
    assert auxiliary(("lat",), coords) == ["letters", "run"]
    assert coords["lat2"].attrs == {"bounds": "lat2_b"}


def test_coordinates_come_raw(grid):
    decoded = grid.template.assign_coords(time=("time", np.array(["2000-01-01"] * 6, "M8[ns]")))
    with pytest.raises(TypeError, match="raw numbers"):
        clean_coordinates(decoded, grid.axes)


def test_the_template_is_left_as_it_was(grid):
    before = grid.template.copy(deep=True)
    clean_coordinates(grid.template, grid.axes)
    xr.testing.assert_identical(grid.template, before)
    assert NOW.astimezone(UTC).hour == 1


def test_a_fill_in_another_precision_is_recognised():
    lat = np.array([10.0, 1e20, 20.0], "f4")
    ds = xr.Dataset(coords={"lat": ("cell", lat, {"units": "degrees_north", "_FillValue": 1e20})})
    axes = Axes(None, None, ("cell",), None, None, "lat", None)
    assert geospatial(ds, axes)["geospatial_lat_max"] == 20.0
    assert np.isnan(numbers(clean_coordinates(ds, axes)["lat"])[1])


def test_only_a_time_with_a_base_date_is_called_time():
    axes = Axes("month", None, (), "month", None, None, None)
    numbered = xr.Dataset(coords={"month": ("month", np.arange(12), {"units": "1"})})
    assert clean_coordinates(numbered, axes)["month"].attrs == {"units": "1", "axis": "T"}
    dated = xr.Dataset(coords={"month": ("month", np.arange(12), {"units": "days since 2001-01-01"})})
    assert clean_coordinates(dated, axes)["month"].attrs["standard_name"] == "time"
