"""Carbon dioxide as a gas in equilibrium with the water."""

from __future__ import annotations

from gridcarb.chemistry.declare import derived
from gridcarb.fields import Field, Ink

_DEFINITION = "At in-situ temperature and 1 atm total pressure, at depth too: K0 is not corrected for pressure."


@derived(Field(
    key="co2_fugacity", long_name="fugacity of carbon dioxide in sea water", units="uatm",
    standard_name="fugacity_of_carbon_dioxide_in_sea_water", sane_range=(5.0, 10000.0), digits=1, ink=Ink("magma"),
    comment=_DEFINITION, citations=("weiss1974",),
))  # fmt: skip
def co2_fugacity(aqueous_co2: float, k0: float) -> float:
    """[CO2*] / K0, in uatm."""
    return aqueous_co2 / k0


@derived(Field(
    key="co2_partial_pressure", long_name="partial pressure of carbon dioxide in sea water", units="uatm",
    standard_name="partial_pressure_of_carbon_dioxide_in_sea_water", sane_range=(5.0, 10000.0), digits=1,
    ink=Ink("magma"), comment=f"Fugacity over the fugacity coefficient at 1 atm. {_DEFINITION}",
    citations=("weiss1974",),
))  # fmt: skip
def co2_partial_pressure(co2_fugacity: float, fugacity_coefficient: float) -> float:
    """Fugacity over the fugacity coefficient, in uatm."""
    return co2_fugacity / fugacity_coefficient
