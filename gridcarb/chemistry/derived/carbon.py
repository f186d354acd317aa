"""The three species of dissolved inorganic carbon."""

from __future__ import annotations

from gridcarb.chemistry.declare import column, derived
from gridcarb.fields import Field, Ink


@column
def carbon_share(dic: float, h: float, k1: float, k2: float) -> float:
    """DIC over h^2 + K1 h + K1 K2, in umol/kg over mol2/kg2: times a species' term it gives the species."""
    return 1e6 * dic / (h * (h + k1) + k1 * k2)


@derived(Field(
    key="aqueous_co2", long_name="dissolved carbon dioxide (including carbonic acid) in sea water", units="umol kg-1",
    sane_range=(0.1, 500.0), digits=2, ink=Ink("cividis"), citations=("guide2007",),
))  # fmt: skip
def aqueous_co2(carbon_share: float, h: float) -> float:
    """[CO2*]."""
    return carbon_share * h * h


@derived(Field(
    key="bicarbonate_ion", long_name="bicarbonate ion in sea water", units="umol kg-1", sane_range=(50.0, 4500.0),
    digits=1, ink=Ink("cividis"), citations=("guide2007",),
))  # fmt: skip
def bicarbonate_ion(carbon_share: float, h: float, k1: float) -> float:
    """[HCO3-]."""
    return carbon_share * k1 * h


@derived(Field(
    key="carbonate_ion", long_name="carbonate ion in sea water", units="umol kg-1", sane_range=(0.1, 1000.0), digits=1,
    ink=Ink("viridis"), citations=("guide2007",),
    volume_standard_name="mole_concentration_of_carbonate_expressed_as_carbon_in_sea_water",
))  # fmt: skip
def carbonate_ion(carbon_share: float, k1: float, k2: float) -> float:
    """[CO3--]."""
    return carbon_share * k1 * k2
