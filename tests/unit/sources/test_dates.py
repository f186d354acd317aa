"""Months counted from a date, and stamps in their intervals, against the calendar library itself."""

from __future__ import annotations

import cftime
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gridcarb.errors import InputError
from gridcarb.sources.dates import Units, stamps, without_months

CALENDARS = ("standard", "proleptic_gregorian", "julian", "noleap", "all_leap")


def _told(values: list[float], units: str, calendar: str, months: str) -> tuple[np.ndarray, Units]:
    return without_months(np.array(values), Units.of({"units": units, "calendar": calendar}), months, "a.nc: time")


@given(st.integers(-2400, 2400), st.sampled_from(CALENDARS))
def test_whole_months_are_the_same_day_of_a_later_month(count: int, calendar: str) -> None:
    values, units = _told([float(count)], "months since 1990-03-05 06:00", calendar, "calendar")
    date = cftime.num2date(values[0], units.units, units.calendar)
    assert (date.day, date.hour) == (5, 6)
    assert 12 * (date.year - 1990) + date.month - 3 == count


@given(st.floats(0.0, 600.0), st.sampled_from(CALENDARS))
def test_months_keep_their_order_and_meet_at_their_ends(count: float, calendar: str) -> None:
    whole = np.floor(count)
    values, _ = _told([count, count + 0.01, whole, whole + 1], "months since 1990-01-01", calendar, "calendar")
    assert values[2] - 1e-6 <= values[0] < values[1]
    assert 28 <= values[3] - values[2] <= 31


def test_years_are_twelve_months() -> None:
    values, _ = _told([0.0, 1.0, 2.5], "years since 2000-01-01", "standard", "calendar")
    np.testing.assert_array_equal(values, [0.0, 366.0, 366.0 + 365.0 + 181.0])


def test_mean_months_are_those_of_udunits() -> None:
    cf_units = pytest.importorskip("cf_units")
    values, _ = _told([1.0, 7.0], "months since 2000-01-01", "standard", "mean")
    np.testing.assert_allclose(values, cf_units.Unit("month").convert(np.array([1.0, 7.0]), "day"), rtol=1e-9)


@pytest.mark.parametrize("units", ["months since 2000-01-01", "year since 2000-01-01"])
def test_nothing_is_assumed(units: str) -> None:
    with pytest.raises(InputError, match="no fixed length") as caught:
        _told([1.0], units, "standard", "refuse")
    assert "inputs: {months: calendar}" in caught.value.mend


def test_a_day_that_some_months_lack() -> None:
    with pytest.raises(InputError, match="gives no dates"):
        _told([1.0], "months since 2000-01-31", "standard", "calendar")


@pytest.mark.parametrize("units", ["days since 2000-01-01", "hours since 1-1-1", "months", ""])
def test_other_units_are_let_be(units: str) -> None:
    values, told = _told([1.0, 2.0], units, "standard", "refuse")
    assert told.units == units
    np.testing.assert_array_equal(values, [1.0, 2.0])


def test_months_of_thirty_days_need_no_word() -> None:
    assert _told([1.0], "months since 2000-01-01", "360_day", "refuse")[1].units == "months since 2000-01-01"


@pytest.mark.parametrize(("share", "word"), [(0.0, "start"), (0.5, "middle"), (1.0, "end"), (0.3, "uneven")])
def test_where_stamps_lie(share: float, word: str) -> None:
    edges = np.cumsum([0.0, 31, 28, 31, 30])
    bounds = np.stack([edges[:-1], edges[1:]], axis=1)
    assert stamps(bounds[:, 0] + share * np.diff(edges), bounds, False) == word
    assert stamps(bounds[:, 0], bounds, True) == "unknown"
    assert stamps(bounds[:, 0], bounds[:, :1].repeat(2, axis=1), False) == "unknown"
