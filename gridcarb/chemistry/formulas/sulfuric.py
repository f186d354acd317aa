"""Bisulfate."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula


@formula(
    units="mol kg-1", scale="free", citation="dickson1990s",
    check=Check(-2.30, 0.005, "Dickson, Sabine & Christian 2007, chapter 5"),
)
def ln_ks_dickson1990(tk: float, ln_tk: float, ionic: float, sqrt_ionic: float, ln_water_fraction: float) -> float:
    """ln KS, free scale; S 5-45, T 0-45 degC."""
    return (
        -4276.1 / tk
        + 141.328
        - 23.093 * ln_tk
        + (-13856.0 / tk + 324.57 - 47.986 * ln_tk) * sqrt_ionic
        + (35474.0 / tk - 771.54 + 114.723 * ln_tk) * ionic
        - 2698.0 / tk * ionic * sqrt_ionic
        + 1776.0 / tk * ionic * ionic
        + ln_water_fraction
    )
