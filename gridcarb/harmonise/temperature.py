"""Temperature: which kind it is, and its conversion to in-situ degC (ITS-90) by TEOS-10."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import gsw
import numpy as np
import xarray as xr

from gridcarb import units
from gridcarb.errors import InputError, Notice
from gridcarb.harmonise.decisions import Decided, Decision
from gridcarb.harmonise.settings import ReadingSettings, TemperatureKind

KINDS: dict[str, TemperatureKind] = {
    "sea_water_temperature": "in situ",
    "sea_surface_temperature": "in situ",
    "sea_water_potential_temperature": "potential",
    "sea_water_conservative_temperature": "conservative",
}
"""CF standard names that settle the kind."""

_SHORT_NAMES: dict[str, TemperatureKind] = {"thetao": "potential", "bigthetao": "conservative", "tos": "in situ"}
_SHORT_NAME_KEYS = ("variable_id", "original_name", "short_name", "name")
_WORDS: tuple[tuple[str, TemperatureKind], ...] = (
    (r"conservative", "conservative"), (r"potential", "potential"), (r"in[-_ ]?situ", "in situ"),
)
DEEP = 200.0
"""Below this (m or dbar) the kind must be known; above it the kinds differ by less than 0.04 degC."""


@dataclass(frozen=True)
class TemperatureReading:
    """The kind of temperature, and the conversion of its numbers to degC."""

    kind: TemperatureKind
    to_celsius: units.Linear


def read_temperature(
    attrs: Mapping[Any, Any], settings: ReadingSettings, deepest: float, file_attributes: Mapping[Any, Any]
) -> Decided[TemperatureReading]:
    """Decide kind and units; `deepest` is the depth of the lowest level (m or dbar).

    Raises InputError if the kind is not known and there is water below 200 m, UnitsError for units.
    """
    kind, because, notices = _kind(attrs, settings, deepest, file_attributes)
    said = settings.units.get("temperature", attrs.get("units"))
    mend = "write `reading: {units: {temperature: degC}}` in the recipe"
    reading = TemperatureReading(kind, units.conversion(said, "degC", where="temperature", mend=mend))
    how = kind if kind == "in situ" else f"{kind}, converted to in situ (TEOS-10)"
    return Decided(reading, (Decision("temperature", f"{how}, from {said}", because),), notices)


def in_situ(
    celsius: xr.DataArray, kind: TemperatureKind, absolute_salinity: xr.DataArray | None, pressure: xr.DataArray
) -> xr.DataArray:
    """In-situ temperature (degC) from the `kind` given; NaN where salinity or temperature is missing.

    Potential temperature refers to 0 dbar. `absolute_salinity` (g/kg) may be None for in-situ temperature only.
    """
    if kind == "in situ" or absolute_salinity is None:
        return celsius
    with np.errstate(all="ignore"):
        if kind == "conservative":
            warm: xr.DataArray = xr.apply_ufunc(gsw.t_from_CT, absolute_salinity, celsius, pressure)
        else:  # the adiabatic map runs both ways: water of this temperature at 0 dbar, brought to `pressure`
            warm = xr.apply_ufunc(gsw.pt_from_t, absolute_salinity, celsius, 0.0, pressure)
    return warm


def _kind(
    attrs: Mapping[Any, Any], settings: ReadingSettings, deepest: float, file_attributes: Mapping[Any, Any]
) -> tuple[TemperatureKind, str, tuple[Notice, ...]]:
    standard_name = str(attrs.get("standard_name", ""))
    by_name = KINDS.get(standard_name)
    hinted, hint = _hint(attrs, file_attributes)
    stated = settings.temperature
    if stated:
        notice = Notice("temperature_kind_overruled", f"standard_name {standard_name} says the temperature is {by_name}; "
                        f"it is read as {stated}, as the recipe states", _line(stated))
        return stated, "stated in the recipe", (notice,) if by_name and by_name != stated else ()
    if by_name:
        notice = Notice("temperature_kind_doubtful", f"standard_name {standard_name} says the temperature is {by_name}, "
                        f"but {hint} speaks of {hinted}; the standard_name is followed", _line(by_name))
        return by_name, f"standard_name is {standard_name}", (notice,) if hinted and hinted != by_name else ()
    if hinted:
        notice = Notice("temperature_kind_by_words", f"no standard_name settles the kind of temperature; {hint} makes it "
                        f"{hinted}", _line(hinted))
        return hinted, hint, (notice,)
    if deepest > DEEP:
        raise InputError(
            "nothing says whether the temperature is in situ, potential or conservative, and there is water at "
            f"{deepest:g} m, where that matters", where="temperature",
            mend="write `reading: {temperature: potential}` in the recipe (or `in situ`, or `conservative`)",
        )
    notice = Notice("temperature_kind_assumed", "nothing says which kind of temperature it is; taken as in situ, as there "
                    f"is no water below {DEEP:g} m", _line("in situ"))
    return "in situ", "nothing says otherwise, and the water is shallow", (notice,)


def _line(kind: str) -> str:
    return f"reading: {{temperature: {kind}}}"


def _hint(attrs: Mapping[Any, Any], file_attributes: Mapping[Any, Any]) -> tuple[TemperatureKind | None, str]:
    """The kind that the other attributes speak of, and which attribute it was."""
    for holder in (attrs, file_attributes):
        for key in _SHORT_NAME_KEYS:
            kind = _SHORT_NAMES.get(str(holder.get(key, "")))
            if kind:
                return kind, f"{key} {holder[key]}"
    long_name = str(attrs.get("long_name", "")).lower()
    found = [kind for pattern, kind in _WORDS if re.search(pattern, long_name)]
    return (found[0], f"long_name '{attrs['long_name']}'") if len(found) == 1 else (None, "")
