"""Calcium carbonate: stoichiometric solubility products."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula

_SOURCE = "Mucci 1983, as restated in Zeebe & Wolf-Gladrow 2001"
LN10 = 2.302585092994045684
PER_LN10 = 0.4342944819032518276


@formula(units="mol2 kg-2", citation="mucci1983", check=Check(-6.369 * LN10, 0.0005 * LN10, _SOURCE))
def ln_k_calcite_mucci1983(tk: float, ln_tk: float, s: float, sqrt_s: float) -> float:
    """ln of the solubility product of calcite; S 5-44, T 5-40 degC."""
    return LN10 * (
        -171.9065
        - 0.077993 * tk
        + 2839.319 / tk
        + 71.595 * PER_LN10 * ln_tk
        + (-0.77712 + 0.0028426 * tk + 178.34 / tk) * sqrt_s
        - 0.07711 * s
        + 0.0041249 * s * sqrt_s
    )


@formula(units="mol2 kg-2", citation="mucci1983", check=Check(-6.188 * LN10, 0.0005 * LN10, _SOURCE))
def ln_k_aragonite_mucci1983(tk: float, ln_tk: float, s: float, sqrt_s: float) -> float:
    """ln of the solubility product of aragonite; S 5-44, T 5-40 degC."""
    return LN10 * (
        -171.945
        - 0.077993 * tk
        + 2903.293 / tk
        + 71.595 * PER_LN10 * ln_tk
        + (-0.068393 + 0.0017276 * tk + 88.135 / tk) * sqrt_s
        - 0.10018 * s
        + 0.0059415 * s * sqrt_s
    )
