"""Choosing the time step a figure shows, from the time coordinate of a dataset, in any CF calendar."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

import cftime
import numpy as np
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.errors import InputError

MONTHS = ("January", "February", "March", "April", "May", "June", "July", "August", "September", "October", "November",
          "December")
_ISO = re.compile(r"^(\d{1,4})(?:-(\d{1,2})(?:-(\d{1,2})(?:[T ](\d{1,2})(?::(\d{1,2}))?(?::(\d{1,2}))?)?)?)?Z?$")


@dataclass(frozen=True)
class Moment:
    """One time step: its index (None: the data have no time dimension), words for a reader and for a file name."""

    index: int | None = None
    label: str = ""
    slug: str = ""


def choose_moment(header: xr.Dataset, axes: Axes, wanted: str | int) -> Moment:
    """The time step asked for: "first", "last", an index (negative: from the end), or an ISO date.

    A date of less than full precision ("2005", "2005-07") takes the first step inside that year or month; otherwise the
    nearest step is taken. `header` may hold decoded times or raw numbers with CF units.

    Raises
    ------
    InputError : no such step, a date outside the time axis or impossible in its calendar, or no times to choose from.
    """
    coordinate = header[axes.time_coordinate] if axes.time_coordinate else None
    count = header.sizes[axes.time] if axes.time else 1
    dates = () if coordinate is None else _dates(coordinate)
    if coordinate is not None and coordinate.ndim and axes.time is None:
        return _of_each_column(wanted, dates)
    index = _index(wanted, count, dates)
    described = _describe(header, coordinate, dates, index, count) if coordinate is not None or axes.time else ("", "")
    return Moment(index if axes.time else None, *described)


def _of_each_column(wanted: str | int, dates: Sequence[cftime.datetime]) -> Moment:
    """Casts and the like, each at a time of its own: all of them are shown."""
    if wanted not in ("first", "last"):
        raise InputError(
            f"there is no map of '{wanted}': every column has a time of its own", where="figures: time",
            mend="leave `time` out of this map in the recipe: it shows all columns",
        )
    ends = dict.fromkeys(_day(date) for date in (min(dates), max(dates))) if dates else ()
    return Moment(None, " to ".join(ends))


def _day(date: cftime.datetime) -> str:
    return f"{date.day} {MONTHS[date.month - 1]} {date.year}"


def _index(wanted: str | int, count: int, dates: Sequence[cftime.datetime]) -> int:
    if wanted == "first":
        return 0
    if wanted == "last":
        return count - 1
    if isinstance(wanted, int):
        if not -count <= wanted < count:
            raise _no_such(f"there is no time step {wanted}", count, dates)
        return wanted % count
    if not dates:
        raise _no_such(f"the data have no dates, so '{wanted}' cannot be found", count, dates)
    return _nearest(wanted, count, dates)


def _nearest(wanted: str, count: int, dates: Sequence[cftime.datetime]) -> int:
    match = _ISO.match(wanted.strip())
    if match is None:
        raise _no_such(f"'{wanted}' is no date", count, dates)
    given = [int(part) for part in match.groups() if part is not None]
    if len(given) < 3:
        inside = [i for i, date in enumerate(dates) if [date.year, date.month][: len(given)] == given]
        if inside:
            return inside[0]
    try:
        instant = cftime.datetime(*given, *[1] * (3 - len(given)), calendar=dates[0].calendar)
    except ValueError:
        raise _no_such(f"there is no '{wanted}' in the calendar '{dates[0].calendar}'", count, dates) from None
    days = np.array([(date - instant).total_seconds() / 86400 for date in dates])
    reach = max(1.0, float(np.abs(np.diff(days)).max()) / 2 if count > 1 else 1.0)
    nearest = int(np.argmin(np.abs(days)))
    if abs(days[nearest]) > reach:
        raise _no_such(f"'{wanted}' lies outside the time axis", count, dates)
    return nearest


def _dates(coordinate: xr.DataArray) -> tuple[cftime.datetime, ...]:
    """The times as dates of their calendar; empty when the coordinate holds no dates."""
    values = np.atleast_1d(coordinate.values)
    if values.dtype.kind == "M":
        instants: list[datetime] = values.astype("datetime64[us]").astype(object).tolist()
        return tuple(cftime.datetime(*instant.timetuple()[:6], calendar="standard") for instant in instants)
    if values.dtype == object:
        return tuple(values.tolist())
    units = str(coordinate.attrs.get("units", ""))
    if " since " not in units:
        return ()
    calendar = str(coordinate.attrs.get("calendar", "standard"))
    try:
        return tuple(cftime.num2date(values, units, calendar, only_use_cftime_datetimes=True))
    except ValueError:  # "months since" in a calendar that has no fixed months, and the like
        return ()


def _describe(
    header: xr.Dataset, coordinate: xr.DataArray | None, dates: Sequence[cftime.datetime], index: int, count: int
) -> tuple[str, str]:
    """Words for a reader, and for a file name."""
    if not dates:
        return (f"time step {index + 1} of {count}", f"step{index + 1:04d}") if count > 1 else ("", "")
    if coordinate is not None and (season := _season(header, coordinate, dates, index)):
        return f"{season} climatology", season.lower().replace(" ", "-") + "-climatology"
    date = dates[index]
    alone = sum((d.year, d.month, d.day) == (date.year, date.month, date.day) for d in dates) == 1
    clock = "" if alone else f"{date.hour:02d}:{date.minute:02d}"
    label = _day(date) + (f", {clock}" if clock else "")
    slug = f"{date.year:04d}-{date.month:02d}-{date.day:02d}" + (f"T{clock.replace(':', '')}" if clock else "")
    return label, slug


def _season(header: xr.Dataset, coordinate: xr.DataArray, dates: Sequence[cftime.datetime], index: int) -> str:
    """ "January", "March to May", "annual" for a step of a climatological time axis, else empty."""
    name = {**coordinate.encoding, **coordinate.attrs}.get("climatology")
    if name is None:
        return ""
    months = [dates[index].month]
    if name in header.variables:
        bounds = header[name].assign_attrs({**coordinate.encoding, **coordinate.attrs, **header[name].attrs})
        edges = _dates(bounds.isel({coordinate.dims[0]: index}) if coordinate.dims else bounds)
        if len(edges) == 2:
            last = (edges[1].month - 2) % 12 + 1 if edges[1].day == 1 else edges[1].month
            months = [edges[0].month, last]
    elif len(dates) == 1:
        return "annual"
    if months == [1, 12]:
        return "annual"
    return " to ".join(dict.fromkeys(MONTHS[month - 1] for month in months))


def _no_such(what: str, count: int, dates: Sequence[cftime.datetime]) -> InputError:
    ends = [date.strftime("%Y-%m-%d") for date in (dates[0], dates[-1])] if dates else []
    known = f"dates from {' to '.join(ends)}, " if dates else ""
    steps = f"steps 0 to {count - 1}" if count > 1 else "a single step"
    return InputError(
        what, where="figures: time",
        mend=f"write `time: first`, `time: last`, an index or a date in quotes in the recipe; there are {known}{steps}",
    )
