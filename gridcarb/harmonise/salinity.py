"""Salinity: which kind it is; practical salinity for the chemistry, Absolute Salinity for TEOS-10."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import gsw
import numpy as np
import xarray as xr

from gridcarb import units
from gridcarb.errors import InputError, Notice
from gridcarb.harmonise.decisions import Decided, Decision
from gridcarb.harmonise.depth import Place
from gridcarb.harmonise.settings import ReadingSettings, SalinityKind

KINDS: dict[str, SalinityKind] = {
    "sea_water_practical_salinity": "practical",
    "sea_water_absolute_salinity": "absolute",
    "sea_water_preformed_salinity": "preformed",
}
"""CF standard names that settle the kind; sea_water_salinity and sea_surface_salinity leave it open."""

_SOUTHERNMOST = -86.0
"""No sea lies south of it, and the TEOS-10 atlas of salinity anomalies ends there (degrees north)."""


@dataclass(frozen=True)
class SalinityReading:
    """The kind of salinity, and the conversion of its numbers to g/kg (or to the practical scale)."""

    kind: SalinityKind
    to_grams_or_practical: units.Linear


def read_salinity(attrs: Mapping[Any, Any], settings: ReadingSettings) -> Decided[SalinityReading]:
    """Decide kind and units.

    Raises UnitsError for units missing or unreadable, InputError where name and units contradict each other.
    """
    standard_name = str(attrs.get("standard_name", ""))
    said = settings.units.get("salinity", attrs.get("units"))
    if said is None and "practical" in (KINDS.get(standard_name), settings.salinity):
        said = "1"  # CF lets a number without dimension go without units
    unit = units.read(said, where="salinity", mend="write `reading: {units: {salinity: psu}}` in the recipe",
                      expected=("practical salinity", "mass fraction"))
    grams = unit.kind == "mass fraction"
    kind, because, notices = _kind(standard_name, settings.salinity, grams, str(said))
    factor = units.conversion(said, "g kg-1") if grams else units.Linear(1.0)
    if kind != "practical" and not grams:
        notices += (Notice("salinity_units", f"{kind} salinity in units of '{said}' is read as g/kg", "reading: {units: "
                           "{salinity: g kg-1}}"),)
    how = "practical (PSS-78)" if kind == "practical" else f"{kind}, converted to practical (TEOS-10)"
    return Decided(SalinityReading(kind, factor), (Decision("salinity", how, because),), notices)


def practical_salinity(numbers: xr.DataArray, kind: SalinityKind, place: Place) -> xr.DataArray:
    """Practical salinity from salinity of the `kind` given (g/kg, or the practical scale)."""
    if kind == "practical":
        return numbers
    return _by_place(gsw.SP_from_SA if kind == "absolute" else gsw.SP_from_Sstar, numbers, place)


def absolute_salinity(numbers: xr.DataArray, kind: SalinityKind, place: Place) -> xr.DataArray:
    """Absolute Salinity (g/kg) from salinity of the `kind` given."""
    if kind == "absolute":
        return numbers
    return _by_place(gsw.SA_from_SP if kind == "practical" else gsw.SA_from_Sstar, numbers, place)


def _by_place(function: Any, numbers: xr.DataArray, place: Place) -> xr.DataArray:
    latitude, longitude = place.horizontal("salinity")
    with np.errstate(all="ignore"):
        converted: xr.DataArray = xr.apply_ufunc(
            function, numbers, place.pressure, longitude, latitude.clip(min=_SOUTHERNMOST)
        )
    return converted


def _kind(
    standard_name: str, stated: SalinityKind | None, grams: bool, said: str
) -> tuple[SalinityKind, str, tuple[Notice, ...]]:
    by_name = KINDS.get(standard_name)
    if stated:
        notice = Notice("salinity_kind_overruled", f"standard_name {standard_name} says the salinity is {by_name}; it is "
                        f"read as {stated}, as the recipe states", _line(stated))
        return stated, "stated in the recipe", (notice,) if by_name and by_name != stated else ()
    if by_name == "practical" and grams:
        raise InputError(f"standard_name {standard_name} says practical salinity, units '{said}' say grams per kilogram",
                         where="salinity", mend=f"write `{_line('practical')}` or `{_line('absolute')}` in the recipe")
    if by_name:
        return by_name, f"standard_name is {standard_name}", ()
    if grams:
        notice = Notice("salinity_kind_by_units", f"units of '{said}' make the salinity absolute", _line("absolute"))
        return "absolute", f"units are {said}", (notice,)
    notice = Notice("salinity_kind_assumed", f"{standard_name or 'no standard_name'} in units of '{said}' leaves the kind "
                    "of salinity open; taken as practical", _line("practical"))
    return "practical", f"units are {said}", (notice,)


def _line(kind: str) -> str:
    return f"reading: {{salinity: {kind}}}"
