"""Levels and times, words and units."""

from __future__ import annotations

import cftime
import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import find_axes
from gridcarb.errors import InputError
from gridcarb.figures.lettering import meridian, parallel, readable_units, sentence, with_units
from gridcarb.figures.levels import Level, choose_level
from gridcarb.figures.moments import Moment, choose_moment

from .conftest import make_result


def moment(ds: xr.Dataset, wanted: str | int) -> Moment:
    return choose_moment(ds, find_axes(ds), wanted)


def level(ds: xr.Dataset, wanted: float) -> Level:
    return choose_level(ds, find_axes(ds), wanted)


@pytest.mark.parametrize(
    ("wanted", "index"),
    [("first", 0), ("last", 13), (3, 3), (-1, 13), ("2001-03", 2), ("2002", 12), ("2001-05-10", 4), ("2001-05-01T01", 4)],
)
def test_times_are_found(wanted: str | int, index: int) -> None:
    assert moment(make_result(step=30, months=14), wanted).index == index


def test_raw_and_decoded_times_agree() -> None:
    raw = make_result(step=30, months=14)
    decoded = xr.decode_cf(raw)
    assert isinstance(decoded.time.values[0], cftime.Datetime360Day)
    for wanted in ("2001-07-16", "last"):
        assert moment(raw, wanted) == moment(decoded, wanted)
    standard = raw.assign_coords(time=("time", raw.time.values, {**raw.time.attrs, "calendar": "standard"}))
    assert xr.decode_cf(standard).time.dtype.kind == "M"
    assert moment(xr.decode_cf(standard), "last") == moment(standard, "last")


def test_steps_within_a_day_are_told_apart() -> None:
    ds = make_result(step=30)
    ds = ds.assign_coords(time=("time", [0.25, 0.5], ds.time.attrs))
    assert moment(ds, 1) == Moment(1, "1 January 2001, 12:00", "2001-01-01T1200")


def test_climatologies_name_months_not_years() -> None:
    ds = make_result(step=30)
    ds = ds.assign_coords(
        time=("time", ds.time.values, {**ds.time.attrs, "climatology": "span"}),
        span=(("time", "two"), [[0, 30 + 360 * 29], [30, 120 + 360 * 29]]),
    )
    assert moment(ds, 0).label == "January climatology"
    assert moment(ds, 1).label == "February to April climatology"
    assert moment(ds, 1).slug == "february-to-april-climatology"
    assert moment(xr.decode_cf(ds, decode_coords="all"), 1).label == "February to April climatology"


def test_months_without_dates_are_steps() -> None:
    ds = make_result(step=30).drop_vars("time")
    assert moment(ds, "last") == Moment(1, "time step 2 of 2", "step0002")
    with pytest.raises(InputError, match="have no dates"):
        moment(ds, "2001-01-01")


def test_no_time_at_all() -> None:
    ds = make_result(step=30).isel(time=0, drop=True)
    assert moment(ds, "last") == Moment()


@pytest.mark.parametrize(
    ("values", "attributes"),
    [([5.0, 500.0], {"units": "m"}), ([-5.0, -500.0], {"units": "m"}), ([0.005, 0.5], {"units": "km", "positive": "down"}),
     ([500.0, 50000.0], {"units": "cm", "positive": "down"}), ([-5.0, -500.0], {"units": "meters", "positive": "up"})],
)
def test_depth_in_any_clothes(values: list[float], attributes: dict[str, str]) -> None:
    ds = make_result(step=30).assign_coords(lev=("lev", values, {**attributes, "axis": "Z"}))
    found = level(ds, 450)
    assert (found.index, found.label, found.below) == (1, "500 m depth", ())
    assert level(ds, 0).below == (1,)


def test_levels_in_any_order_and_pressure() -> None:
    ds = make_result(step=30).isel(lev=slice(None, None, -1))
    assert level(ds, 0) == Level(1, 5.0, "m", (0,))
    pressure = ds.assign_coords(lev=("lev", [5e6, 5e4], {"units": "Pa", "axis": "Z"}))
    assert level(pressure, 480).label == "500 dbar"


@pytest.mark.parametrize(("depth", "label", "slug"), [
    (4.999938, "5 m depth", "5m"), (2533.336, "2,533 m depth", "2533m"), (0.5057600, "0.5058 m depth", "0.5058m"),
])
def test_depths_of_single_precision_are_told_to_four_digits(depth: float, label: str, slug: str) -> None:
    found = Level(0, depth)
    assert (found.label, found.slug) == (label, slug)


def test_levels_without_depth_are_refused() -> None:
    ds = make_result(step=30)
    fractions = ds.assign_coords(lev=("lev", [0.1, 0.9], {"units": "1", "axis": "Z"}))
    for bad in (fractions, ds.drop_vars("lev")):
        with pytest.raises(InputError, match="levels of one depth each"):
            level(bad, 0)


def test_a_scalar_depth_is_told() -> None:
    assert level(make_result(step=30).isel(lev=1), 0).label == "500 m depth"


@pytest.mark.parametrize(
    ("units", "printed"),
    [("umol kg-1", "µmol kg⁻¹"), ("uatm", "µatm"), ("1", ""), ("degC", "°C"), ("mol m-3", "mol m⁻³"),
     ("kg m-2 s-1", "kg m⁻² s⁻¹"), ("days since 2001-01-01", "days since 2001-01-01"), ("m2", "m²")],
)
def test_units_in_print(units: str, printed: str) -> None:
    assert readable_units(units) == printed


def test_words() -> None:
    assert with_units("pH", "1") == "pH"
    assert with_units("carbon", "umol kg-1") == "carbon (µmol kg⁻¹)"
    assert sentence("pH on the total scale") == "pH on the total scale"
    assert sentence("total alkalinity") == "Total alkalinity"
    assert [meridian(x) for x in (0, 360, 180, -180)] == ["0°", "0°", "180°", "180°"]
    assert [meridian(x) for x in (190, -30, 370)] == ["170°W", "30°W", "10°E"]
    assert [parallel(y) for y in (0, -60, 22.5)] == ["0°", "60°S", "22.5°N"]
    assert np.all([meridian(x) == meridian(x + 360) for x in range(-180, 181, 15)])
