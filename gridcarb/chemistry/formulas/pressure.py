"""The effect of pressure on equilibrium constants (Millero 1995), with the volumes of the corrected table."""

from __future__ import annotations

from dataclasses import dataclass

from gridcarb.chemistry.compiled import scalar

GAS_CONSTANT = 83.1446261815324
"""R in cm3 bar mol-1 K-1 (8.31446261815324 J mol-1 K-1)."""


@dataclass(frozen=True)
class Volumes:
    """Molal volume change a0 + a1 t + a2 t^2 (cm3 mol-1) and compressibility change b0 + b1 t (cm3 mol-1 bar-1)."""

    a0: float
    a1: float
    a2: float
    b0: float
    b1: float


@scalar
def ln_pressure_factor(
    t: float, p_bar: float, tk: float, a0: float, a1: float, a2: float, b0: float, b1: float
) -> float:
    """ln(K at pressure / K at the surface); t in degC, p_bar in bar above one atmosphere."""
    volume = a0 + t * (a1 + t * a2)
    compressibility = b0 + t * b1
    return (0.5 * compressibility * p_bar - volume) * p_bar / (GAS_CONSTANT * tk)


MILLERO1995: dict[str, Volumes] = {
    "k1": Volumes(-25.5, 0.1271, 0.0, -3.08e-3, 0.0877e-3),
    "k2": Volumes(-15.82, -0.0219, 0.0, 1.13e-3, -0.1475e-3),
    # The t^2 term of boric acid is negative; the sign printed in 1995 is discussed by Orr et al. (2015).
    "kb": Volumes(-29.48, 0.1622, -2.608e-3, -2.84e-3, 0.0),
    "kw": Volumes(-20.02, 0.1119, -1.409e-3, -5.13e-3, 0.0794e-3),
    "ks": Volumes(-18.03, 0.0466, 0.316e-3, -4.53e-3, 0.09e-3),
    "kf": Volumes(-9.78, -0.0090, -0.942e-3, -3.91e-3, 0.054e-3),
    "kp1": Volumes(-14.51, 0.1211, -0.321e-3, -2.67e-3, 0.0427e-3),
    "kp2": Volumes(-23.12, 0.1758, -2.647e-3, -5.15e-3, 0.09e-3),
    "kp3": Volumes(-26.57, 0.2020, -3.042e-3, -4.08e-3, 0.0714e-3),
    "ksi": Volumes(-29.48, 0.1622, -2.608e-3, -2.84e-3, 0.0),
    "k_calcite": Volumes(-48.76, 0.5304, 0.0, -11.76e-3, 0.3692e-3),
    "k_aragonite": Volumes(-45.96, 0.5304, 0.0, -11.76e-3, 0.3692e-3),
}
"""Sea water values; silicic acid is given those of boric acid. Citations: millero1995, orr2015."""
