"""Saturation states of calcium carbonate."""

from __future__ import annotations

from gridcarb.chemistry.declare import derived
from gridcarb.fields import Field, Ink

_COMMENT = "Below 1 the mineral tends to dissolve. Thresholds for organisms are a user's choice, not part of this field."


@derived(Field(
    key="calcite_saturation", long_name="saturation state of sea water with respect to calcite", units="1",
    sane_range=(0.05, 15.0), digits=3, ink=Ink("BrBG", centre=1.0), comment=_COMMENT,
    citations=("mucci1983", "millero1995"),
))  # fmt: skip
def calcite_saturation(ca: float, carbonate_ion: float, k_calcite: float) -> float:
    """[Ca][CO3] / Ksp(calcite)."""
    return ca * 1e-6 * carbonate_ion / k_calcite


@derived(Field(
    key="aragonite_saturation", long_name="saturation state of sea water with respect to aragonite", units="1",
    sane_range=(0.05, 10.0), digits=3, ink=Ink("BrBG", centre=1.0), comment=_COMMENT,
    citations=("mucci1983", "millero1995"),
))  # fmt: skip
def aragonite_saturation(ca: float, carbonate_ion: float, k_aragonite: float) -> float:
    """[Ca][CO3] / Ksp(aragonite)."""
    return ca * 1e-6 * carbonate_ion / k_aragonite
