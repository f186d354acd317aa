"""Buffer factors: how the carbonate system answers to added carbon."""

from __future__ import annotations

from gridcarb.chemistry.declare import column, derived
from gridcarb.chemistry.solver import carbonate, noncarbonate
from gridcarb.fields import Field, Ink


@column
def noncarbonate_buffer(
    h: float, kb: float, kw: float, kp1: float, kp2: float, kp3: float, ksi: float, ks: float, kf: float,
    bt: float, st: float, ft: float, pt: float, sit: float,
) -> float:  # fmt: skip
    """d(non-carbonate alkalinity)/d(-ln h), mol/kg: W of the extended buffer factors."""
    alkalinity_and_buffer: tuple[float, float] = noncarbonate(h, kb, kw, kp1, kp2, kp3, ksi, ks, kf, bt, st, ft, pt, sit)
    return alkalinity_and_buffer[1]


@derived(Field(
    key="revelle_factor", long_name="Revelle factor of sea water", units="1", sane_range=(1.0, 30.0), digits=2,
    ink=Ink("cividis"), comment="dln(CO2)/dln(DIC) at constant alkalinity, with every term of total alkalinity.",
    citations=("egleston2010",),
))  # fmt: skip
def revelle_factor(h: float, k1: float, k2: float, dic: float, noncarbonate_buffer: float) -> float:
    """DIC / gamma_DIC = (HCO3 + 4 CO3 + W) / (DIC var + W); no difference of like numbers is taken."""
    charged = dic * k1 * (h + 4.0 * k2) / (h * (h + k1) + k1 * k2)
    alkalinity_and_buffer: tuple[float, float] = carbonate(h, k1, k2, dic)
    return (charged + noncarbonate_buffer) / (alkalinity_and_buffer[1] + noncarbonate_buffer)
