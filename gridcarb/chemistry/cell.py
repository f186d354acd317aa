"""Columns of a cell that come before the solution: the arguments of the equations, and the changes of pH scale.

t degC, s practical salinity, p_bar bar; amounts and constants in mol/kg.
"""

from __future__ import annotations

import math

from gridcarb.chemistry.declare import column


@column
def tk(t: float) -> float:
    """Temperature in kelvin."""
    return t + 273.15


@column
def sqrt_s(s: float) -> float:
    """Square root of salinity."""
    return math.sqrt(s)


@column
def ionic(s: float) -> float:
    """Ionic strength of sea water (mol/kg of water), Dickson, Sabine & Christian 2007."""
    return 19.924 * s / (1000.0 - 1.005 * s)


@column
def sqrt_ionic(ionic: float) -> float:
    """Square root of ionic strength."""
    return math.sqrt(ionic)


@column
def water_fraction(s: float) -> float:
    """Mass of water in a mass of sea water."""
    return 1.0 - 0.001005 * s


@column
def kf(kf_surface_free: float, kf_pressure_factor: float, st: float, ks: float) -> float:
    """KF at pressure: corrected on the free scale, then put on the total scale at pressure."""
    return kf_surface_free * kf_pressure_factor * (1.0 + st / ks)


@column
def shift_total(ft: float, kf_surface: float, kf: float) -> float:
    """Factor of the detour total scale -> seawater scale at the surface -> total scale at pressure."""
    return (1.0 + ft / kf_surface) / (1.0 + ft / kf)


@column
def shift_seawater(ft: float, kf: float) -> float:
    """Factor from the seawater scale to the total scale at pressure."""
    return 1.0 / (1.0 + ft / kf)


@column
def free_fraction(st: float, ks: float) -> float:
    """Free over total hydrogen ion: 1 / (1 + ST/KS)."""
    return ks / (ks + st)


@column
def seawater_ratio(ft: float, kf: float) -> float:
    """Hydrogen ion on the seawater scale over that on the total scale: 1 + FT/KF with KF on the total scale."""
    return 1.0 + ft / kf
