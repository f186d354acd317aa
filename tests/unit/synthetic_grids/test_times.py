"""Times: one moment of the ocean in every calendar, with stamps and bounds that fit."""

from __future__ import annotations

import cftime
import numpy as np
import pytest

from synthetic_grids import times
from synthetic_grids.landmarks import MONTHS


@pytest.mark.parametrize("calendar", times.CALENDARS)
def test_every_calendar_has_the_same_months(calendar: str) -> None:
    made = times.monthly(calendar)
    assert made.year.values.tolist() == [2010 + 10.5 / 12.0, 2010 + 11.5 / 12.0, 2011 + 0.5 / 12.0]
    stamp = made.variables["time"]
    dates = cftime.num2date(stamp.values, stamp.attrs["units"], stamp.attrs["calendar"])
    assert tuple((date.year, date.month) for date in dates) == MONTHS
    bounds = made.variables["time_bnds"].values
    np.testing.assert_array_equal(bounds[1:, 0], bounds[:-1, 1])
    assert np.diff(bounds)[0, 0] == 30.0
    assert np.diff(bounds)[1, 0] == (30.0 if calendar == "360_day" else 31.0)


@pytest.mark.parametrize(("stamp", "day"), [("start", 1), ("middle", 16), ("end", 1)])
def test_stamps_sit_where_asked(stamp: str, day: int) -> None:
    made = times.monthly("360_day", stamp=stamp)  # type: ignore[arg-type]
    first = cftime.num2date(made.variables["time"].values[0], made.variables["time"].attrs["units"], "360_day")
    assert (first.month, first.day) == (12 if stamp == "end" else 11, day)
    np.testing.assert_array_equal(made.year, times.monthly().year)


def test_climatology_spans_its_years() -> None:
    made = times.climatology()
    bounds = made.variables["climatology_bounds"].values
    units = made.variables["time"].attrs["units"]
    january = cftime.num2date(bounds[0], units, "noleap")
    assert [(date.year, date.month, date.day) for date in january] == [(2001, 1, 1), (2020, 2, 1)]
    assert "bounds" not in made.variables["time"].attrs
    assert np.all((made.variables["time"].values > bounds[:, 0]) & (made.variables["time"].values < bounds[:, 1]))
    shared = set(made.year.values.tolist()) & set(times.monthly().year.values.tolist())
    assert len(shared) == 2


def test_months_since_count_months() -> None:
    made = times.months_since()
    assert made.variables["time"].attrs["units"] == "months since 2010-11-01"
    assert made.variables["time"].values.tolist() == [0.5, 1.5, 2.5]


def test_one_moment_may_be_told_or_not() -> None:
    told, silent = times.scalar_time(), times.timeless()
    assert told.year.ndim == silent.year.ndim == 0
    assert float(told.year) == float(silent.year) == times.monthly().year.values[0]
    assert told.variables["time_bnds"].values.tolist() == [304.0, 334.0]
    assert not silent.variables
    each = times.of_each("profile", 4)
    assert each.year.dims == ("profile",)
    assert each.year.values[3] == each.year.values[0]
