"""Carbon dioxide as a gas: solubility and fugacity coefficient."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula


@formula(
    units="mol kg-1 atm-1", citation="weiss1974",
    check=Check(-3.5617, 0.00005, "Dickson, Sabine & Christian 2007, chapter 5"),
)
def ln_k0_weiss1974(tk: float, ln_tk: float, s: float) -> float:
    """ln K0; S 0-45, T -1-45 degC. 100/tk and ln(tk/100) as printed, with ln 100 taken out."""
    hundredth = tk * 0.01
    return (
        -60.2409
        + 93.4517 / hundredth
        + 23.3585 * (ln_tk - 4.605170185988091368)
        + s * (0.023517 - 0.023656 * hundredth + 0.0047036 * hundredth * hundredth)
    )


@formula(
    units="1", citation="weiss1974",
    check=Check(-0.003195, 0.000005, "own re-derivation from the printed virial coefficients: 0.99681 at 25 degC"),
)
def ln_fugacity_coefficient_weiss1974(tk: float) -> float:
    """ln of the fugacity coefficient of CO2 at 1 atm total pressure and vanishing mole fraction.

    (B + 2 delta) P / (R T) with R = 82.05746 cm3 atm mol-1 K-1.
    """
    virial = -1636.75 + tk * (12.0408 + tk * (-0.0327957 + tk * 3.16528e-5))
    cross = 57.7 - 0.118 * tk
    return (virial + 2.0 * cross) / (82.05746 * tk)
