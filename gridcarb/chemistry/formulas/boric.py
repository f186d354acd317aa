"""Boric acid."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula


@formula(
    units="mol kg-1", scale="total", citation="dickson1990b",
    check=Check(-19.7964, 0.00005, "Dickson, Sabine & Christian 2007, chapter 5"),
)
def ln_kb_dickson1990(tk: float, ln_tk: float, s: float, sqrt_s: float) -> float:
    """ln KB, total scale; S 5-45, T 0-45 degC."""
    return (
        (-8966.90 - 2890.53 * sqrt_s - 77.942 * s + 1.728 * s * sqrt_s - 0.0996 * s * s) / tk
        + (148.0248 + 137.1942 * sqrt_s + 1.62142 * s)
        - (24.4344 + 25.085 * sqrt_s + 0.2474 * s) * ln_tk
        + 0.053105 * sqrt_s * tk
    )
