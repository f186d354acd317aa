"""Times in every calendar: the middle of a month is the same moment of the ocean in all of them.

The ocean of month m (from 1) of year y is that at the decimal year y + (m - 1/2) / 12, whatever the length of the month
and wherever in it the time stamp lies. So a month has the same values to the last bit in all calendars.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal

import cftime
import numpy as np
import xarray as xr

from synthetic_grids.landmarks import MONTHS
from synthetic_grids.scene import Times
from synthetic_grids.sphere import Numbers

CALENDARS = (
    "standard", "gregorian", "proleptic_gregorian", "julian", "noleap", "365_day", "all_leap", "366_day", "360_day",
)

TIME = {"standard_name": "time", "long_name": "time", "axis": "T"}


def decimal_year(year: int, month: int) -> float:
    """The moment of the ocean that a month stands for."""
    return year + (month - 0.5) / 12.0


def _years(months: Sequence[tuple[int, int]]) -> xr.DataArray:
    return xr.DataArray([decimal_year(year, month) for year, month in months], dims="time")


def month_bounds(months: Sequence[tuple[int, int]], units: str, calendar: str) -> Numbers:
    """Begin and end of each month (month, 2) in units since a date."""
    def firsts(later: int) -> list[cftime.datetime]:
        counted = [12 * year + month - 1 + later for year, month in months]
        return [cftime.datetime(count // 12, count % 12 + 1, 1, calendar=calendar) for count in counted]
    sides = [cftime.date2num(firsts(later), units, calendar) for later in (0, 1)]
    return np.stack(sides, axis=-1).astype(np.float64)


def monthly(
    calendar: str = "noleap", *, stamp: Literal["start", "middle", "end"] = "middle", bounds: bool = True,
    months: Sequence[tuple[int, int]] = MONTHS, units: str = "days since 1850-01-01",
) -> Times:
    """Months in a CF calendar, stamped where asked, with or without bounds."""
    sides = month_bounds(months, units, calendar)
    stamps = {"start": sides[:, 0], "middle": sides.mean(axis=1), "end": sides[:, 1]}[stamp]
    attributes = {**TIME, "units": units, "calendar": calendar}
    variables = {"time": xr.Variable("time", stamps, attributes)}
    if bounds:
        variables["time"].attrs["bounds"] = "time_bnds"
        variables["time_bnds"] = xr.Variable(("time", "bnds"), sides)
    return Times(_years(months), variables, {"cell_methods": "time: mean"})


def climatology(first: int = 2001, last: int = 2020, calendar: str = "noleap") -> Times:
    """The twelve months of an average year, stamped in 2010, with climatological bounds: the ocean of 2010."""
    units = f"days since {first}-01-01"
    months = [(2010, month) for month in range(1, 13)]
    begin = month_bounds([(first, month) for _, month in months], units, calendar)[:, 0]
    end = month_bounds([(last, month) for _, month in months], units, calendar)[:, 1]
    stamps = month_bounds(months, units, calendar).mean(axis=1)
    attributes = {**TIME, "units": units, "calendar": calendar, "climatology": "climatology_bounds"}
    variables = {
        "time": xr.Variable("time", stamps, attributes),
        "climatology_bounds": xr.Variable(("time", "bnds"), np.stack([begin, end], axis=-1)),
    }
    return Times(_years(months), variables, {"cell_methods": "time: mean within years time: mean over years"})


def months_since() -> Times:
    """Months counted from a date, half a month in: a unit whose length nobody agrees on."""
    counted = np.array([0.5 + number for number in range(len(MONTHS))])
    year, month = MONTHS[0]
    attributes = {**TIME, "units": f"months since {year}-{month:02d}-01", "calendar": "standard"}
    return Times(_years(MONTHS), {"time": xr.Variable("time", counted, attributes)})


def timeless() -> Times:
    """No time at all: the first of the months, and the file does not say so."""
    return Times(xr.DataArray(decimal_year(*MONTHS[0])), {})


def scalar_time(calendar: str = "noleap") -> Times:
    """The first of the months as a scalar coordinate with bounds."""
    sides = month_bounds(MONTHS[:1], "days since 2010-01-01", calendar)[0]
    attributes = {**TIME, "units": "days since 2010-01-01", "calendar": calendar, "bounds": "time_bnds"}
    variables = {"time": xr.Variable((), sides.mean(), attributes), "time_bnds": xr.Variable("bnds", sides)}
    return Times(xr.DataArray(decimal_year(*MONTHS[0])), variables, {"coordinates": "time", "cell_methods": "time: mean"})


def of_each(dim: str, count: int) -> Times:
    """One moment for each place along a horizontal dim, turning through the months, as casts have it."""
    chosen = [MONTHS[number % len(MONTHS)] for number in range(count)]
    middle = month_bounds(chosen, "days since 2010-01-01", "standard").mean(axis=1)
    years = xr.DataArray(_years(chosen).values, dims=dim)
    attributes = {"standard_name": "time", "long_name": "time of the cast", "units": "days since 2010-01-01",
                  "calendar": "standard"}
    return Times(years, {"time": xr.Variable(dim, middle, attributes)}, {"coordinates": "time"})
