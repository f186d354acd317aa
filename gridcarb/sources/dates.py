"""What the numbers of a time axis mean: units, calendar, months counted from a date, and stamps in their intervals."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal

import cftime
import numpy as np
import numpy.typing as npt

from gridcarb.errors import InputError

Numbers = npt.NDArray[Any]
Months = Literal["refuse", "calendar", "mean"]
Stamps = Literal["start", "middle", "end", "uneven", "unknown"]

_SAME_CALENDAR = {"gregorian": "standard", "noleap": "365_day", "all_leap": "366_day"}
_LENGTHS = {"month": 1, "months": 1, "year": 12, "years": 12}
_MEAN_MONTH = 365.242198781 / 12
"""Days of a month as UDUNITS has it: a twelfth of the tropical year."""

_ROUNDING = 1e-6
"""Months are told to so many digits: 0.999999999 is the end of a month, not its last moment."""


@dataclass(frozen=True)
class Units:
    """Units and calendar of a time axis; units may be empty (a bare counter)."""

    units: str
    calendar: str

    @classmethod
    def of(cls, attrs: Any) -> Units:
        """As the attributes of a time coordinate say; the calendar of CF is the default."""
        calendar = str(attrs.get("calendar", "standard")).strip().lower()
        return cls(str(attrs.get("units", "")).strip(), _SAME_CALENDAR.get(calendar, calendar))

    def date(self, value: float) -> str:
        """A time for people: a date where the units allow one, else the number with its units."""
        try:
            date = cftime.num2date(float(value), self.units, self.calendar)
        except (ValueError, TypeError, OverflowError):
            return f"{value:g} {self.units}".strip()
        return str(date.strftime("%Y-%m-%d" if (date.hour, date.minute) == (0, 0) else "%Y-%m-%d %H:%M")).strip()

    @property
    def months_each(self) -> int:
        """Calendar months of one unit: 1 for months, 12 for years, 0 for units of one length."""
        unit, since, _ = self.units.partition(" since ")
        if self.calendar == "360_day" and unit.strip().lower() in ("month", "months"):
            return 0  # there every month has thirty days
        return _LENGTHS.get(unit.strip().lower(), 0) if since else 0


def without_months(values: Numbers, units: Units, months: Months, where: str) -> tuple[Numbers, Units]:
    """Times counted in months or years, told in days of their calendar; others as they are.

    'calendar': n months after the date lies n months later in the calendar, a fraction is a share of the month it falls
    into. 'mean': a month is a twelfth of 365.242198781 days (UDUNITS).

    Raises
    ------
    InputError : nothing is stated, or the calendar has no such dates.
    """
    if not units.months_each:
        return values, units
    if months == "refuse":
        raise InputError(
            f"'{units.units}' has no fixed length in the calendar {units.calendar}", where=where,
            mend="write `inputs: {months: calendar}` (each month as long as it is in the calendar) or "
            "`inputs: {months: mean}` (a twelfth of 365.2422 days) in the recipe",
        )
    told = Units(f"days since {units.units.partition(' since ')[2]}", units.calendar)
    counted = values.astype(np.float64) * units.months_each
    if months == "mean":
        return counted * _MEAN_MONTH, told
    try:
        epoch = cftime.num2date(0, told.units, told.calendar)
        return np.vectorize(lambda number: _days(number, epoch, told), otypes=[np.float64])(counted), told
    except (ValueError, TypeError, OverflowError) as error:
        raise InputError(f"'{units.units}' gives no dates in the calendar {units.calendar} ({error})", where=where,
                         mend="write the time axis of the file in `days since` the first day of a month") from None


def _days(number: float, epoch: Any, told: Units) -> float:
    whole = int(np.floor(number + _ROUNDING))
    begin, end = (
        cftime.date2num(_months_later(epoch, count), told.units, told.calendar) for count in (whole, whole + 1)
    )
    share = max(number - whole, 0.0)
    return float(begin + share * (end - begin))


def _months_later(epoch: Any, count: int) -> Any:
    years, month = divmod(epoch.month - 1 + count, 12)
    return epoch.replace(year=epoch.year + years, month=month + 1)


def stamps(values: Numbers, bounds: Numbers | None, climatological: bool) -> Stamps:
    """Where in their intervals the times lie."""
    if bounds is None or climatological or not len(values):
        return "unknown"
    lower, length = bounds[:, 0].astype(np.float64), (bounds[:, 1] - bounds[:, 0]).astype(np.float64)
    if not np.all(length > 0):
        return "unknown"
    share = (values - lower) / length
    # A stamp on the 15th or 16th of a month counts as its middle.
    places: tuple[tuple[Stamps, float, float], ...] = (("start", 0.0, 1e-3), ("end", 1.0, 1e-3), ("middle", 0.5, 0.06))
    return next((word for word, place, near in places if np.all(np.abs(share - place) <= near)), "uneven")
