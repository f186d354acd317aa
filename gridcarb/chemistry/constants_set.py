"""What a set of constants is: one published equation for each equilibrium and each conservative total."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields

from gridcarb.chemistry.declare import Formula
from gridcarb.chemistry.formulas.pressure import MILLERO1995, Volumes
from gridcarb.shelf import Shelf


@dataclass(frozen=True, kw_only=True)
class ConstantsSet:
    """One declared choice.

    key, title : the word for recipes, and a line for people.
    k0 ... k_aragonite : natural logarithms of the constants at surface pressure.
    bt, st, ft, ca : total boron, sulfate, fluoride and calcium from salinity.
    ln_fugacity_coefficient : of CO2 at 1 atm.
    volumes : the pressure table, constant by constant.
    temperature_range, salinity_range : where the set's K1 and K2 were measured (degC, practical salinity); outside,
        cells are computed and flagged.
    """

    key: str
    title: str
    k0: Formula
    k1: Formula
    k2: Formula
    kb: Formula
    kw: Formula
    kp1: Formula
    kp2: Formula
    kp3: Formula
    ksi: Formula
    ks: Formula
    kf: Formula
    k_calcite: Formula
    k_aragonite: Formula
    bt: Formula
    st: Formula
    ft: Formula
    ca: Formula
    ln_fugacity_coefficient: Formula
    temperature_range: tuple[float, float]
    salinity_range: tuple[float, float]
    volumes: Mapping[str, Volumes] = field(default_factory=lambda: MILLERO1995)
    pressure_citations: tuple[str, ...] = ("millero1995", "orr2015")

    def formulas(self) -> dict[str, Formula]:
        """Column name -> equation."""
        found = {item.name: getattr(self, item.name) for item in fields(self)}
        return {name: value for name, value in found.items() if isinstance(value, Formula)}

    def citations(self) -> dict[str, tuple[str, ...]]:
        """What the set takes from whom: column name -> citation keys."""
        sources = {name: (formula.citation,) for name, formula in self.formulas().items()}
        return {**sources, "pressure": self.pressure_citations}


CONSTANTS: Shelf[ConstantsSet] = Shelf("set of constants")


def declare_constants(entry: ConstantsSet) -> ConstantsSet:
    """Put a set on the shelf."""
    return CONSTANTS.put(entry.key, entry)
