"""Carbonic acid: the first and second dissociation constants."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula

_GUIDE = "Dickson, Sabine & Christian 2007, chapter 5"
LN10 = 2.302585092994045684


@formula(units="mol kg-1", scale="total", citation="lueker2000", check=Check(-5.8472 * LN10, 0.00005 * LN10, _GUIDE))
def ln_k1_lueker2000(tk: float, ln_tk: float, s: float) -> float:
    """ln K1, total scale; S 19-43, T 2-35 degC."""
    return -LN10 * (3633.86 / tk - 61.2172 + 9.67770 * ln_tk - 0.011555 * s + 0.0001152 * s * s)


@formula(units="mol kg-1", scale="total", citation="lueker2000", check=Check(-8.9660 * LN10, 0.00005 * LN10, _GUIDE))
def ln_k2_lueker2000(tk: float, ln_tk: float, s: float) -> float:
    """ln K2, total scale; S 19-43, T 2-35 degC."""
    return -LN10 * (471.78 / tk + 25.9290 - 3.16967 * ln_tk - 0.01781 * s + 0.0001122 * s * s)
