"""pH on its three scales, and hydrogen ion."""

from __future__ import annotations

from gridcarb.chemistry.declare import derived
from gridcarb.fields import Field, Ink

_PER_LN10 = 0.4342944819032518276
_INK = Ink("viridis")


@derived(Field(
    key="ph_total_scale", long_name="sea water pH reported on total scale", units="1",
    standard_name="sea_water_ph_reported_on_total_scale", scale="total", sane_range=(6.5, 9.0), digits=4, ink=_INK,
    comment="At in-situ temperature and pressure.", citations=("guide2007", "dickson1981"),
))  # fmt: skip
def ph_total_scale(ln_h: float) -> float:
    """-log10 of hydrogen ion on the total scale."""
    return -_PER_LN10 * ln_h


@derived(Field(
    key="ph_free_scale", long_name="sea water pH on free scale", units="1", scale="free", sane_range=(6.5, 9.2),
    digits=4, ink=_INK, comment="At in-situ temperature and pressure.", citations=("guide2007", "dickson1990s"),
))  # fmt: skip
def ph_free_scale(ln_h: float, ln_free_fraction: float) -> float:
    """-log10 of free hydrogen ion: total over 1 + ST/KS."""
    return -_PER_LN10 * (ln_h + ln_free_fraction)


@derived(Field(
    key="ph_seawater_scale", long_name="sea water pH on seawater scale", units="1", scale="seawater",
    sane_range=(6.5, 9.0), digits=4, ink=_INK, comment="At in-situ temperature and pressure.",
    citations=("guide2007", "dickson1990s", "perez1987"),
))  # fmt: skip
def ph_seawater_scale(ln_h: float, ln_seawater_ratio: float) -> float:
    """-log10 of hydrogen ion on the seawater scale: free times 1 + ST/KS + FT/KF(free)."""
    return -_PER_LN10 * (ln_h + ln_seawater_ratio)


@derived(Field(
    key="hydrogen_ion", long_name="hydrogen ion in sea water, total scale", units="mol kg-1", scale="total",
    sane_range=(1e-9, 3e-7), digits=12, ink=Ink("viridis"), comment="At in-situ temperature and pressure.",
    citations=("dickson1981",),
))  # fmt: skip
def hydrogen_ion(h: float) -> float:
    """Hydrogen ion, total scale."""
    return h
