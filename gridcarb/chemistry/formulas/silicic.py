"""Silicic acid, in the Guide's total-scale form."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula


@formula(
    units="mol kg-1", scale="total", citation="millero1995",
    check=Check(-21.61, 0.005, "Dickson, Sabine & Christian 2007, chapter 5"),
)
def ln_ksi_millero1995(tk: float, ln_tk: float, ionic: float, sqrt_ionic: float, ln_water_fraction: float) -> float:
    """ln KSi, total scale."""
    return (
        -8904.2 / tk
        + 117.385
        - 19.334 * ln_tk
        + (-458.79 / tk + 3.5913) * sqrt_ionic
        + (188.74 / tk - 1.5998) * ionic
        + (-12.1652 / tk + 0.07871) * ionic * ionic
        + ln_water_fraction
    )
