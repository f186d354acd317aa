"""Phosphate and silicate where the files do not give them: zero, or one amount everywhere."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import xarray as xr

from gridcarb.errors import InputError, Notice
from gridcarb.fields import NUTRIENTS
from gridcarb.harmonise.amounts import AmountReading, amount_in, per_kilogram, quantity
from gridcarb.harmonise.decisions import Decided, Decision
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.units import Linear

SHALLOW = 50.0
"""Down to here (m or dbar) the data count as surface data, where zero nutrients may be assumed with a notice."""


@dataclass(frozen=True)
class NutrientReading:
    """One amount of a nutrient everywhere: a number, and its units."""

    number: float
    amount: AmountReading


NONE_AT_ALL = NutrientReading(0.0, AmountReading(False, Linear(1.0)))


def read_nutrients(
    present: Collection[str], settings: ReadingSettings, deepest: float
) -> Decided[dict[str, NutrientReading]]:
    """Decide the nutrients that are not taken from the files; roles not in the result are.

    `present` are the roles the files give, `deepest` the depth of the lowest level (m or dbar).
    Raises InputError for a nutrient that is absent in interior water and not stated.
    """
    readings: dict[str, NutrientReading] = {}
    decisions: list[Decision] = []
    notices: list[Notice] = []
    for role in NUTRIENTS:
        stated: str | None = getattr(settings, role)
        if stated:
            readings[role] = _stated(role, stated)
            decisions.append(Decision(role, _words(stated), "stated in the recipe"))
            if role in present:
                notices.append(Notice("nutrient_overruled", f"the files give {role}; it is set to {_words(stated)}, as the "
                                      "recipe states", f"reading: {{{role}: {stated}}}"))
        elif role not in present:
            if deepest > SHALLOW:
                raise InputError(
                    f"{role} is not given, and there is water at {deepest:g} m: leaving out the nutrients would change pH "
                    "there by about 0.01 and the saturation states by about 3 %", where=role,
                    mend=f"write `reading: {{{role}: assume zero}}` in the recipe, or one amount such as `{role}: 1.5 umol "
                    f"kg-1`, or name a variable by `inputs: {{{role}: ...}}`",
                )
            readings[role] = NONE_AT_ALL
            decisions.append(Decision(role, "zero everywhere", "not given, and the data lie at the surface"))
            notices.append(Notice("nutrient_assumed_zero", f"{role} is not given and is taken as zero, which changes "
                                  "little at the surface", f"reading: {{{role}: assume zero}}"))
    return Decided(readings, tuple(decisions), tuple(notices))


def constant(reading: NutrientReading, of_water: xr.DataArray | None) -> xr.DataArray:
    """The amount in umol/kg: a scalar, or a field where the density is one."""
    return per_kilogram(xr.DataArray(reading.number), reading.amount, of_water)


def _stated(role: str, stated: str) -> NutrientReading:
    parts = quantity(stated)
    return NutrientReading(parts[0], amount_in(parts[1], role, f"reading.{role}")) if parts else NONE_AT_ALL


def _words(stated: str) -> str:
    return "zero everywhere" if stated == "assume zero" else f"{stated} everywhere"
