"""Phosphoric acid: three dissociation constants in the Guide's total-scale form."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula

_GUIDE = "Dickson, Sabine & Christian 2007, chapter 5"


@formula(units="mol kg-1", scale="total", citation="millero1995", check=Check(-3.71, 0.005, _GUIDE))
def ln_kp1_millero1995(tk: float, ln_tk: float, s: float, sqrt_s: float) -> float:
    """ln KP1, total scale."""
    return (
        -4576.752 / tk + 115.525 - 18.453 * ln_tk + (-106.736 / tk + 0.69171) * sqrt_s + (-0.65643 / tk - 0.01844) * s
    )


@formula(units="mol kg-1", scale="total", citation="millero1995", check=Check(-13.727, 0.0011, _GUIDE))
def ln_kp2_millero1995(tk: float, ln_tk: float, s: float, sqrt_s: float) -> float:
    """ln KP2, total scale."""
    return -8814.715 / tk + 172.0883 - 27.927 * ln_tk + (-160.340 / tk + 1.3566) * sqrt_s + (0.37335 / tk - 0.05778) * s


@formula(units="mol kg-1", scale="total", citation="millero1995", check=Check(-20.24, 0.005, _GUIDE))
def ln_kp3_millero1995(tk: float, s: float, sqrt_s: float) -> float:
    """ln KP3, total scale."""
    return -3070.75 / tk - 18.141 + (17.27039 / tk + 2.81197) * sqrt_s + (-44.99486 / tk - 0.09984) * s
