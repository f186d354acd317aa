"""Water: the ion product."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula


@formula(
    units="mol2 kg-2", scale="total", citation="millero1995",
    check=Check(-30.434, 0.0005, "Dickson, Sabine & Christian 2007, chapter 5"),
)
def ln_kw_millero1995(tk: float, ln_tk: float, s: float, sqrt_s: float) -> float:
    """ln KW in the Guide's total-scale form (0.015 taken off the constant of the seawater-scale equation)."""
    return 148.9652 - 13847.26 / tk - 23.6521 * ln_tk + (118.67 / tk - 5.977 + 1.0495 * ln_tk) * sqrt_s - 0.01615 * s
