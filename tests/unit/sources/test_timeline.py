"""Time axes of many files: joined whatever their order and epochs, refused where they do not fit."""

from __future__ import annotations

from pathlib import Path

import cftime
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gridcarb.errors import InputError
from gridcarb.sources.timeline import Piece, Units, build

MONTHS = np.cumsum([31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31] * 3).astype(float) - 15


def _pieces(values: np.ndarray, cuts: list[int], units: list[str], calendar: str = "noleap") -> list[Piece]:
    """`values` (days since 2000-01-01) cut into files, each told in units of its own."""
    pieces = []
    for place, part in enumerate(np.split(values, cuts)):
        dates = cftime.num2date(part, "days since 2000-01-01", calendar)
        own = units[place % len(units)]
        told = np.asarray(cftime.date2num(dates, own, calendar), dtype=float)
        pieces.append(Piece(f"{place}.nc", told, None, Units.of({"units": own, "calendar": calendar})))
    return pieces


EPOCHS = ["days since 2000-01-01", "days since 1850-01-01 00:00:00", "hours since 1999-12-31", "seconds since 2000-02-01"]


@given(
    cuts=st.sets(st.integers(1, len(MONTHS) - 1), max_size=5), order=st.randoms(use_true_random=False),
    units=st.lists(st.sampled_from(EPOCHS), min_size=1, max_size=4), calendar=st.sampled_from(["noleap", "standard"]),
)
def test_files_in_any_order_and_unit_make_one_axis(cuts, order, units, calendar) -> None:
    pieces = _pieces(MONTHS, sorted(cuts), units, calendar)
    shuffled = list(enumerate(pieces))
    order.shuffle(shuffled)
    line = build("dic", [piece for _, piece in shuffled], "refuse")
    assert [shuffled[place][0] for place in line.order] == list(range(len(pieces)))
    assert line.units == pieces[0].units
    dates = cftime.num2date(line.values, line.units.units, line.units.calendar)
    assert list(dates) == list(cftime.num2date(MONTHS, "days since 2000-01-01", calendar))
    assert line.starts == (0, *sorted(cuts), len(MONTHS))


def test_a_shift_of_the_epoch_is_exact() -> None:
    first = Piece("a", np.array([0.1, 0.2]), None, Units("days since 2000-01-01", "standard"))
    later = Piece("b", np.array([0.1, 0.2]), None, Units("days since 2000-01-02", "standard"))
    assert build("dic", [first, later], "accept").values.tolist() == [0.1, 0.2, 1.1, 1.2]


@pytest.mark.parametrize(("values", "what"), [
    ([1.0, 3.0, 2.0], r"not sorted: 2000-01-04 is followed by 2000-01-03"),
    ([1.0, 2.0, 2.0], r"2000-01-03 is there twice"),
    ([1.0, np.nan, 2.0], r"missing values"),
    ([], r"no steps"),
])
def test_disorder_in_one_file(values: list[float], what: str) -> None:
    piece = Piece("a.nc", np.array(values), None, Units("days since 2000-01-01", "standard"))
    with pytest.raises(InputError, match=what) as caught:
        build("dic", [piece], "accept")
    assert caught.value.where == "a.nc: dic"
    assert caught.value.mend


def test_files_that_overlap() -> None:
    one, two = _pieces(np.arange(12.0), [6], ["days since 2000-01-01"])
    doubled = Piece("1.nc", two.values - 1.0, None, two.units)
    with pytest.raises(InputError, match=r"overlap in time: 0.nc goes to 2000-01-06, 1.nc begins at 2000-01-06"):
        build("dic", [one, doubled], "accept")
    shifted = Piece("1.nc", two.values - 0.8, None, two.units)
    with pytest.raises(InputError, match="overlap in time"):
        build("dic", [one, shifted], "accept")


@pytest.mark.parametrize("with_bounds", [True, False])
def test_a_gap_is_refused_or_noticed(with_bounds: bool) -> None:
    edges = np.stack([MONTHS - 15, np.append(MONTHS[1:], MONTHS[-1] + 31) - 15], axis=1)
    kept, units = np.delete(np.arange(36), [14]), Units("days since 2000-01-01", "noleap")
    pieces = [
        Piece(f"{name}.nc", MONTHS[part], edges[part] if with_bounds else None, units)
        for name, part in (("early", kept[:14]), ("late", kept[14:]))
    ]
    with pytest.raises(InputError, match=r"missing between 2001-02-1\d and 2001-04-1\d") as caught:
        build("dic", pieces, "refuse")
    assert caught.value.where == "early.nc and late.nc: dic"
    assert "time_gaps: accept" in caught.value.mend
    assert [notice.code for notice in build("dic", pieces, "accept").notices] == ["time-gap"]


def test_a_gap_of_all_roles_is_told_once(gathered, ocean, save, tmp_path: Path) -> None:
    for start in (0, 10):
        save(ocean(times=np.arange(start, start + 5) * 30.0), tmp_path / f"{start}.nc")
    with pytest.raises(InputError, match="time steps are missing"):
        gathered(tmp_path, files="*.nc")
    collection = gathered(tmp_path, files="*.nc", time_gaps="accept")
    assert [notice.code for notice in collection.notices] == ["time-gap"]


def test_bounds_tell_a_gap_that_steps_cannot() -> None:
    values = np.array([15.0, 75.0])
    units = Units("days since 2000-01-01", "360_day")
    with pytest.raises(InputError, match="missing between"):
        build("dic", [Piece("a", values, np.array([[0.0, 30.0], [60.0, 90.0]]), units)], "refuse")
    assert build("dic", [Piece("a", values, np.array([[0.0, 30.0], [30.0, 90.0]]), units)], "refuse").notices == ()
    climate = Piece("a", values, np.array([[0.0, 7000.0], [60.0, 7090.0]]), units, climatological=True)
    assert build("dic", [climate], "refuse").notices == ()


@pytest.mark.parametrize("values", [list(MONTHS), [0.0, 365, 730, 1096, 1461], [0.0, 1, 2, 3], [3.0], [0.0, 400]])
def test_ordinary_axes_have_no_gap(values: list[float]) -> None:
    piece = Piece("a", np.array(values), None, Units("days since 2000-01-01", "standard"))
    assert build("dic", [piece], "refuse").notices == ()


def test_calendars_are_never_mixed() -> None:
    pieces = [
        Piece(f"{name}.nc", np.array([day]), None, Units("days since 2000-01-01", name))
        for day, name in ((1.0, "360_day"), (2.0, "standard"))
    ]
    with pytest.raises(InputError, match=r"calendars differ: 360_day in 360_day\.nc, standard here"):
        build("dic", pieces, "accept")
    same = [Units.of({"units": "days since 2000-01-01", "calendar": name}) for name in ("noleap", "365_day")]
    assert same[0] == same[1]


def test_counters_of_two_kinds_are_not_joined() -> None:
    pieces = [Piece(f"{n}.nc", np.arange(12.0), None, Units(unit, "standard")) for n, unit in enumerate(["month", "year"])]
    with pytest.raises(InputError, match=r"cannot be told in those of 0\.nc"):
        build("dic", pieces, "accept")
    assert build("dic", pieces[:1], "refuse").span() == "0 month to 11 month (12 steps)"


@pytest.mark.parametrize("units", ["months since 2000-01-01", "years since 2000-01-01", "days since the war"])
def test_times_that_give_no_dates(units: str) -> None:
    with pytest.raises(InputError, match="no dates in the calendar standard") as caught:
        build("dic", [Piece("a.nc", np.arange(12.0), None, Units(units, "standard"))], "accept")
    assert "`days since`" in caught.value.mend


def test_months_of_one_length_give_dates() -> None:
    line = build("dic", [Piece("a.nc", np.arange(12.0), None, Units("months since 2000-01-01", "360_day"))], "refuse")
    assert line.span() == "2000-01-01 to 2000-12-01 (12 steps)"


def test_roles_share_one_axis(gathered, ocean, save, tmp_path: Path) -> None:
    names = ["thetao", "dissic", "talk", "po4"]
    save(ocean(names), tmp_path / "rest.nc")
    for salt, what in (
        (ocean(["so"], times=(15.5, 45.0)),
         r"salinity covers 2000-01-16 12:00 to 2000-02-15 \(2 steps\), temperature covers .* \(3 steps\)"),
        (ocean(["so"], times=(15.5, 45.0, 75.0)), r"step 3 of salinity is 2000-03-16, of temperature 2000-03-15 12:00"),
    ):
        save(salt, tmp_path / "salt.nc")
        with pytest.raises(InputError, match=what) as caught:
            gathered(tmp_path, files="*.nc")
        assert caught.value.where == f"{tmp_path / 'salt.nc'}: salinity"
        other_epoch = ocean(["so"], times=(46.5, 76.0, 105.5), units="days since 1999-12-01")
    save(other_epoch, tmp_path / "salt.nc")
    assert gathered(tmp_path, files="*.nc").sizes["time"] == 3


def test_a_climatology_does_not_stretch_over_the_years(gathered, ocean, save, tmp_path: Path) -> None:
    save(ocean(["thetao", "so", "dissic", "talk"], times=np.arange(24) * 30.0, calendar="360_day"), tmp_path / "long.nc")
    save(ocean(["po4"], times=np.arange(12) * 30.0, calendar="360_day"), tmp_path / "year.nc")
    with pytest.raises(InputError, match="phosphate covers") as caught:
        gathered(tmp_path, files="*.nc")
    assert "without a time dimension" in caught.value.mend


def test_what_is_constant_in_time(gathered, ocean, save, tmp_path: Path) -> None:
    save(ocean(["thetao", "so", "dissic", "talk"]), tmp_path / "long.nc")
    save(ocean(["po4"], dims=("lev", "lat", "lon")), tmp_path / "still.nc")
    collection = gathered(tmp_path, files="*.nc")
    assert [notice.code for notice in collection.notices] == ["constant-in-time"]
    assert collection.roles["phosphate"].array.dims == ("lev", "lat", "lon")
    save(ocean(["thetao"], dims=("lev", "lat", "lon")), tmp_path / "t.nc")
    with pytest.raises(InputError, match="temperature has no time dimension"):
        gathered(tmp_path, files="long.nc", temperature={"files": "t.nc"})


def test_two_files_that_nothing_puts_in_order(gathered, ocean, save, tmp_path: Path) -> None:
    for name in "ab":
        save(ocean().drop_vars("time"), tmp_path / f"bare_{name}.nc")
        save(ocean(dims=("lev", "lat", "lon")), tmp_path / f"still_{name}.nc")
    with pytest.raises(InputError, match="no time coordinate, so that 2 files"):
        gathered(tmp_path, files="bare_*.nc")
    with pytest.raises(InputError, match="lies in 2 files but has no time"):
        gathered(tmp_path, files="still_*.nc")
    assert gathered(tmp_path, files="bare_a.nc").sizes["time"] == 3
