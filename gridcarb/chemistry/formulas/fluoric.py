"""Hydrogen fluoride."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula


@formula(
    units="mol kg-1", scale="total", citation="perez1987",
    check=Check(-6.09, 0.005, "Dickson, Sabine & Christian 2007, chapter 5"),
)
def ln_kf_perez1987(tk: float, sqrt_s: float) -> float:
    """ln KF, total scale; S 10-40, T 9-33 degC."""
    return 874.0 / tk - 9.68 + 0.111 * sqrt_s
