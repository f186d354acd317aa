"""Conservative constituents of sea water, from salinity (mol/kg)."""

from __future__ import annotations

from gridcarb.chemistry.declare import Check, formula

_GUIDE = "Dickson, Sabine & Christian 2007, chapter 5 (composition at S = 35)"


@formula(units="mol kg-1", citation="uppstrom1974", check=Check(0.000416, 5e-7, _GUIDE))
def boron_uppstrom1974(s: float) -> float:
    """Total boron."""
    return 0.000232 / 10.811 * s / 1.80655


@formula(
    units="mol kg-1", citation="lee2010",
    check=Check(0.1336 * 35e-3 / 10.811, 0.00005 * 35e-3 / 10.811, "Lee et al. 2010, abstract", from_memory=False),
)
def boron_lee2010(s: float) -> float:
    """Total boron."""
    return 0.0002414 / 10.811 * s / 1.80655


@formula(units="mol kg-1", citation="morris1966", check=Check(0.02824, 5e-6, _GUIDE))
def sulfate_morris1966(s: float) -> float:
    """Total sulfate."""
    return 0.14 / 96.062 * s / 1.80655


@formula(units="mol kg-1", citation="riley1965", check=Check(0.00007, 5e-6, _GUIDE))
def fluoride_riley1965(s: float) -> float:
    """Total fluoride."""
    return 0.000067 / 18.998 * s / 1.80655


@formula(units="mol kg-1", citation="riley1967", check=Check(0.01028, 5e-6, _GUIDE))
def calcium_riley1967(s: float) -> float:
    """Calcium."""
    return 0.02128 / 40.087 * s / 1.80655
