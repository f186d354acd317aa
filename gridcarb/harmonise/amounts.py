"""Amounts of the tracers in umol per kg of sea water, and the one density that turns volume into mass for all of them."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, Literal

import gsw
import numpy as np
import xarray as xr

from gridcarb import units
from gridcarb.errors import InputError, Notice, UnitsError
from gridcarb.harmonise.decisions import Decided, Decision
from gridcarb.harmonise.settings import ReadingSettings

USUAL_DENSITY = 1025.0
"""kg m-3; taken where nothing says otherwise, the practice of ocean model intercomparisons (Orr et al. 2017)."""
DENSITY_RANGE = (1000.0, 1060.0)

SUBSTANCES: dict[str, frozenset[str]] = {
    "dic": frozenset({"C", "carbon", "CO2", "DIC"}),
    "alkalinity": frozenset({"eq"}),
    "phosphate": frozenset({"P", "PO4", "phosphorus", "phosphate"}),
    "silicate": frozenset({"Si", "SiO2", "SiO3", "SiO4", "silicon", "silicate"}),
}
"""What the units of a role may say is counted ("eq": mole equivalents)."""

_DENSITY_MEND = "write for instance `reading: {density: 1025 kg m-3}` in the recipe (or `from file`, or `in situ`)"
_DENSITY_NAME = (
    r"rho_?0|rau_?0|rho_?const|rho_?ref|ref(?:erence)?_?rho|(?:boussinesq_|sea_?water_)?(?:ref(?:erence)?_density|density_ref)"
)
_DENSITY_KEY = re.compile(rf"(?i)(?:{_DENSITY_NAME})")
_DENSITY_TEXT = re.compile(
    rf"(?i)(?<![A-Za-z_])(?:{_DENSITY_NAME}|reference density)\s*(?:=|:|is|of)\s*(\d+(?:\.\d*)?(?:e[-+]?\d+)?)"
    r"\s*(kg[ .*]?m(?:\^|\*\*)?-3|kg/m(?:\^|\*\*)?3|g[ .*]?cm(?:\^|\*\*)?-3|g/cm(?:\^|\*\*)?3)?"
)
_QUANTITY = re.compile(r"\s*([-+]?\d+(?:\.\d*)?(?:[eE][-+]?\d+)?)\s*(.*)")


@dataclass(frozen=True)
class AmountReading:
    """Whether a tracer is given per volume, and the conversion of its numbers to umol kg-1 (or umol m-3)."""

    per_volume: bool
    to_micromoles: units.Linear


@dataclass(frozen=True)
class DensityReading:
    """The density between volume and mass (kg m-3): one constant, or of every cell; `none` if nothing needs it."""

    kind: Literal["none", "constant", "in situ"]
    value: float = 0.0


def read_amount(role: str, attrs: Mapping[Any, Any], settings: ReadingSettings) -> Decided[AmountReading]:
    """Decide the units of one tracer; UnitsError if they are missing, unreadable, or of another kind or substance."""
    said = settings.units.get(role, attrs.get("units"))
    reading = amount_in(str(said) if said is not None else None, role, role)
    standard_name = str(attrs.get("standard_name", ""))
    by_name = "per_unit_mass" not in standard_name if standard_name else reading.per_volume
    notice = Notice("units_against_name", f"standard_name {standard_name} of {role} means an amount per "
                    f"{'volume' if by_name else 'mass'}, its units '{said}' do not; the units are followed",
                    f"reading: {{units: {{{role}: {said}}}}}")
    how = f"{said} to umol kg-1" + (" by density" if reading.per_volume else "")
    because = "units stated in the recipe" if role in settings.units else "units of the file"
    return Decided(reading, (Decision(role, how, because),), (notice,) if by_name != reading.per_volume else ())


def amount_in(said: str | None, role: str, where: str) -> AmountReading:
    """The reading of numbers of `role` in the units `said`."""
    mend = f"write `reading: {{units: {{{role}: mol m-3}}}}` in the recipe, with the units that are true"
    found = units.read(said, where=where, mend=mend, expected=("amount per mass", "amount per volume"))
    per_volume = "volume" in found.kind
    target = "umol m-3" if per_volume else "umol kg-1"
    return AmountReading(
        per_volume, units.conversion(said, target, where=where, mend=mend, substances=SUBSTANCES[role])
    )


def quantity(text: str) -> tuple[float, str] | None:
    """Number and units of a text such as "0.5 umol kg-1"; None if it does not begin with a number."""
    match = _QUANTITY.fullmatch(text)
    return (float(match[1]), match[2].strip()) if match else None


def read_density(
    per_volume: Mapping[str, Mapping[Any, Any]], settings: ReadingSettings, file_attributes: Mapping[Any, Any]
) -> Decided[DensityReading]:
    """Decide the density for all tracers given per volume; `per_volume` maps these roles to their attributes.

    Where there is none, a density stated in the recipe is kept, for output per volume.

    Raises InputError for different densities in the metadata, for `from file` without one, and for no density of sea water.
    """
    stated = settings.density
    whom = ", ".join(per_volume) or "output per volume alone: every tracer is given per mass"
    if stated == "in situ":
        return _density(whom, DensityReading("in situ"), "in situ of every cell (TEOS-10)", "stated in the recipe")
    if stated and stated != "from file":
        value = _stated_density(stated, settings)
        return _density(whom, DensityReading("constant", value), f"{value:g} kg m-3", "stated in the recipe")
    if not per_volume:
        return Decided(DensityReading("none"))
    found = dict(_metadata_densities(per_volume, file_attributes))
    if len(set(found.values())) > 1:
        listed = ", ".join(f"{value:g} in {place}" for place, value in found.items())
        raise InputError(f"the metadata give different densities (kg m-3): {listed}; all tracers need the same",
                         where="density", mend=_DENSITY_MEND)
    if found:
        place, value = next(iter(found.items()))
        notice = Notice("density_from_file", f"amounts per volume ({whom}) are divided by the density {value:g} kg m-3 "
                        f"found in {place}", "reading: {density: from file}")
        return _density(whom, DensityReading("constant", value), f"{value:g} kg m-3", f"found in {place}",
                        () if stated else (notice,))
    if stated:
        raise InputError("the recipe takes the density from the file, and its metadata name none", where="density",
                         mend=_DENSITY_MEND)
    notice = Notice("density_assumed", f"amounts per volume ({whom}) are divided by a density of {USUAL_DENSITY:g} kg m-3, "
                    "the practice of ocean model intercomparisons (Orr et al. 2017): the files name none",
                    f"reading: {{density: {USUAL_DENSITY:g} kg m-3}}")
    return _density(whom, DensityReading("constant", USUAL_DENSITY), f"{USUAL_DENSITY:g} kg m-3", "assumed", (notice,))


def density(
    reading: DensityReading, absolute_salinity: xr.DataArray | None, temperature: xr.DataArray, pressure: xr.DataArray
) -> xr.DataArray | None:
    """Density (kg m-3) by the reading: None, a scalar, or of every cell from in-situ temperature (TEOS-10, 75 terms)."""
    if reading.kind == "none":
        return None
    if reading.kind == "constant" or absolute_salinity is None:
        return xr.DataArray(reading.value)
    with np.errstate(all="ignore"):
        conservative = xr.apply_ufunc(gsw.CT_from_t, absolute_salinity, temperature, pressure)
        in_cells: xr.DataArray = xr.apply_ufunc(gsw.rho, absolute_salinity, conservative, pressure)
    return in_cells


def per_kilogram(numbers: xr.DataArray, reading: AmountReading, of_water: xr.DataArray | None) -> xr.DataArray:
    """Amount in umol/kg; `of_water` is the density (kg m-3), needed for amounts per volume."""
    converted: xr.DataArray = reading.to_micromoles(numbers)
    return converted / of_water if reading.per_volume and of_water is not None else converted


def _density(
    whom: str, reading: DensityReading, how: str, because: str, notices: tuple[Notice, ...] = ()
) -> Decided[DensityReading]:
    return Decided(reading, (Decision("density", f"{how}, for {whom}", because),), notices)


def _stated_density(text: str, settings: ReadingSettings) -> float:
    parts = quantity(text)
    assert parts is not None  # the settings allow nothing else
    value = float(units.conversion(parts[1], "kg m-3", where="density", mend=_DENSITY_MEND)(parts[0]))
    if settings.unusual_values == "refuse" and not DENSITY_RANGE[0] <= value <= DENSITY_RANGE[1]:
        raise InputError(f"a density of {value:g} kg m-3 is not that of sea water", where="density",
                         mend=f"{_DENSITY_MEND}, or `unusual_values: accept` if it is meant")
    return value


def _metadata_densities(
    per_volume: Mapping[str, Mapping[Any, Any]], file_attributes: Mapping[Any, Any]
) -> Iterator[tuple[str, float]]:
    """Place and value (kg m-3) of every reference density in the metadata that can be one of sea water."""
    holders = [(f"attribute of {role}", attrs) for role, attrs in per_volume.items()]
    for holder, attrs in [*holders, ("global attribute", file_attributes)]:
        for key, value in attrs.items():
            for index, found in enumerate(_densities(str(key), value)):
                if DENSITY_RANGE[0] <= found <= DENSITY_RANGE[1]:
                    yield f"{holder} '{key}'" + (f" ({index + 1})" if index else ""), found


def _densities(key: str, value: object) -> list[float]:
    if _DENSITY_KEY.fullmatch(key):
        parts = quantity(str(np.asarray(value).ravel()[0]))
        return [_in_kilograms(*parts)] if parts else []
    if isinstance(value, str):
        return [_in_kilograms(float(match[1]), match[2] or "") for match in _DENSITY_TEXT.finditer(value)]
    return []


def _in_kilograms(number: float, said: str) -> float:
    """kg m-3; numbers in units that cannot be read are given back as 0, which is no density of sea water."""
    try:
        return float(units.conversion(said or "kg m-3", "kg m-3")(number))
    except UnitsError:
        return 0.0
