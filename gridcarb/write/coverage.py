"""Where and when a grid lies, in the terms of ACDD 1.3, derived from its coordinates and their bounds."""

from __future__ import annotations

import warnings

import cftime
import numpy as np
import xarray as xr
from numpy.typing import NDArray

from gridcarb.axes import Axes
from gridcarb.write.coordinates import plain_numbers
from gridcarb.write.encoding import pieces, split_chunks

_GREGORIAN = ("standard", "gregorian", "proleptic_gregorian")
_DAY = 86400.0


def geospatial(template: xr.Dataset, axes: Axes) -> dict[str, object]:
    """The attributes ``geospatial_*``: extremes of latitude, longitude and the vertical, bounds included where present."""
    found: dict[str, object] = {}
    for word, name, units in (("lat", axes.latitude, "degrees_north"), ("lon", axes.longitude, "degrees_east")):
        values = _ends(template, name)
        if name and values.size:
            if str(template[name].attrs.get("units", "")).startswith("rad"):
                values = np.degrees(values)
            found |= _extremes(word, values) | {f"geospatial_{word}_units": units}
    values = _ends(template, axes.vertical_coordinate)
    attrs = template[axes.vertical_coordinate].attrs if axes.vertical_coordinate in template.coords else {}
    if values.size and "formula_terms" not in attrs:  # a fraction of the water column is no place
        found |= _extremes("vertical", values)
        found |= {f"geospatial_vertical_{key}": str(attrs[key]) for key in ("units", "positive") if key in attrs}
    return found


def time_coverage(template: xr.Dataset, axes: Axes) -> dict[str, object]:
    """The attributes ``time_coverage_*``, in the calendar of the input; none where its times cannot be dated."""
    return {} if axes.time_coordinate is None else coverage_of(template, axes.time_coordinate)


def coverage_of(template: xr.Dataset, name: str) -> dict[str, object]:
    """The same of the coordinate of that name, decoded or not."""
    if name not in template.coords:
        return {}
    attrs = template[name].attrs
    units, calendar = str(attrs.get("units", "")), str(attrs.get("calendar", "standard")).lower()
    steps, reach = _finite(template[name].variable), _ends(template, name)
    if not reach.size:
        return {}
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # year zero, a base date before the Gregorian reform: still a date
            first, last = cftime.num2date([reach.min(), reach.max()], units, calendar)
            dates = cftime.num2date(np.sort(steps), units, calendar)
            days = np.diff(cftime.date2num(dates, "days since 2000-01-01", calendar))
    except (ValueError, OverflowError):
        return {}
    found: dict[str, object] = {
        "time_coverage_start": _iso(first), "time_coverage_end": _iso(last),
        "time_coverage_duration": _duration((last - first).total_seconds()),
    }
    if days.size:
        found["time_coverage_resolution"] = _resolution(float(np.median(days)))
    if calendar not in _GREGORIAN:
        found["time_coverage_comment"] = f"dates are of the {calendar} calendar, durations nominal"
    return found


def _ends(template: xr.Dataset, name: str | None) -> NDArray[np.float64]:
    """Least and greatest finite numbers of a coordinate and of its bounds, piece by piece; fills of the source are none."""
    if name is None or name not in template.coords:
        return np.empty(0)
    attrs = template[name].attrs
    names = [name, *(str(attrs[key]) for key in ("bounds", "climatology") if key in attrs)]
    found: list[float] = []
    for variable in (template[key].variable for key in names if key in template):
        for piece in pieces(variable.shape, split_chunks(variable.shape, 8)):
            values = _finite(variable[piece])
            found += [values.min(), values.max()] if values.size else []
    return np.asarray(found)


def _finite(variable: xr.Variable) -> NDArray[np.float64]:
    flat: NDArray[np.float64] = plain_numbers(variable).ravel()
    return flat[np.isfinite(flat)]


def _extremes(word: str, values: NDArray[np.float64]) -> dict[str, object]:
    return {f"geospatial_{word}_min": float(values.min()), f"geospatial_{word}_max": float(values.max())}


def _iso(date: cftime.datetime) -> str:
    return f"{date.year:04d}-{date.month:02d}-{date.day:02d}T{date.hour:02d}:{date.minute:02d}:{date.second:02d}Z"


def _duration(seconds: float) -> str:
    days = seconds / _DAY
    return f"P{days:.0f}D" if days >= 1 or days == 0 else f"PT{seconds:.0f}S"


def _resolution(days: float) -> str:
    for name, least, most in (("P1D", 0.999, 1.001), ("P1M", 27.9, 31.1), ("P1Y", 359.9, 366.1)):
        if least <= days <= most:
            return name
    return _duration(days * _DAY)
