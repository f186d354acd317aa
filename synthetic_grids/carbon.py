"""Phosphate, silicate, alkalinity and dissolved inorganic carbon of the invented ocean, in umol per kg of sea water."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from synthetic_grids.place import Place, bell, hump
from synthetic_grids.sphere import Numbers
from synthetic_grids.water import origin_depth, river_share, sea_salinity, summer_cap, summer_warmth, surface_climate

RIVER = {"phosphate": 1.2, "silicate": 160.0, "alkalinity": 1150.0, "dic": 1175.0}
"""The water of the Oshel, umol/kg, salinity 0."""

CARBON_TO_PHOSPHORUS = 117.0
SILICON_TO_PHOSPHORUS = 16.0

YEAR_OF_REFERENCE = 2000.0
RISE_TIME = 50.0
"""Years in which the carbon taken up from the air grows by a factor e."""


def mixed_with_river(sea: Numbers, river: float, share: Numbers) -> Numbers:
    """Conservative mixing: sea (1 - share) + river share."""
    return np.asarray(sea + share * (river - sea))


def deepening(place: Place, origin: Numbers) -> Numbers:
    """0 at the surface to 1 in the deep: 1 - exp(-o / (0.8 bowl + 110))."""
    return np.asarray(1.0 - np.exp(-origin / (0.8 * place.bowl + 110.0)))


def winter_phosphate(place: Place) -> Numbers:
    """Phosphate of the winter surface: 0.12 + (1.15 + 0.4 old) / (1 + exp((47 - c) / 4.5)), c the climate latitude."""
    return np.asarray(0.12 + (1.15 + 0.4 * place.old) / (1.0 + np.exp((47.0 - place.climate_latitude) / 4.5)))


def bloom(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """Phosphate taken up by the summer's bloom: 40 % of the winter surface's, times the share of summer."""
    return np.asarray(0.4 * winter_phosphate(place) * summer_cap(place, depth, year))


def phosphate(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """W + (1.05 + 1.5 age - W) deepening + (0.15 + 0.4 age) hump(o, 900) - bloom; the river brings 1.2.

    W is `winter_phosphate`.
    """
    origin = origin_depth(place, depth, year)
    surface = winter_phosphate(place)
    sea = surface + (1.05 + 1.5 * place.age - surface) * deepening(place, origin)
    sea = sea + (0.15 + 0.4 * place.age) * hump(origin, 900.0)
    return mixed_with_river(np.asarray(sea - bloom(place, depth, year)), RIVER["phosphate"], river_share(place, depth))


def silicate(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """W + (22 + 133 age - W) (1 - exp(-o / 1100)) - 16 bloom; the river brings 160.

    W = 2 + 16 (0.8 + 0.6 old) (winter phosphate) is the winter surface.
    """
    origin = origin_depth(place, depth, year)
    surface = 2.0 + 16.0 * winter_phosphate(place) * (0.8 + 0.6 * place.old)
    sea = surface + (22.0 + 133.0 * place.age - surface) * (1.0 - np.exp(-origin / 1100.0))
    sea = sea - SILICON_TO_PHOSPHORUS * bloom(place, depth, year)
    return mixed_with_river(np.asarray(sea), RIVER["silicate"], river_share(place, depth))


def polar_excess(place: Place) -> Numbers:
    """Alkalinity that the cold surface has beyond its salinity, umol/kg: 45 bell(c, 68, 20)."""
    return np.asarray(45.0 * bell(place.climate_latitude, 68.0, 20.0))


def alkalinity(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """66 S + X exp(-o / 450) + (22 + 100 age) (1 - exp(-o / 1600)); the river brings 1150.

    S is the salinity of the sea, X the `polar_excess`.
    """
    origin = origin_depth(place, depth, year)
    dissolved = (22.0 + 100.0 * place.age) * (1.0 - np.exp(-origin / 1600.0))
    sea = 66.0 * sea_salinity(place, depth, year) + polar_excess(place) * np.exp(-origin / 450.0) + dissolved
    return mixed_with_river(np.asarray(sea), RIVER["alkalinity"], river_share(place, depth))


def equilibrium_carbon(warmth: Numbers, alkaline: Numbers) -> Numbers:
    """DIC of water in balance with about 280 uatm: 2013.5 - 8.5 (T - 15) - 0.037 (T - 15)^2 + 0.83 (A - 2300).

    T in degC, A the alkalinity. A fit made for this ocean, near salinity 35.
    """
    off = warmth - 15.0
    return np.asarray(2013.5 - 8.5 * off - 0.037 * off * off + 0.83 * (alkaline - 2300.0))


def added_carbon(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """Carbon from the air since the world was natural: (40 + 0.75 W) exp((year - 2000) / 50) exp(-o / v).

    W is the winter temperature of the surface (warm water takes up more); the reach
    v = bowl + 120 + 900 (1 - old) bell(c, 60, 25) + 1500 formation is deep where water is young.
    """
    origin = origin_depth(place, depth, year)
    young = (1.0 - place.old) * bell(place.climate_latitude, 60.0, 25.0)
    reach = place.bowl + 120.0 + 900.0 * young + 1500.0 * place.formation
    rise = np.exp((np.asarray(year, dtype=np.float64) - YEAR_OF_REFERENCE) / RISE_TIME)
    return np.asarray((40.0 + 0.75 * surface_climate(place)) * rise * np.exp(-origin / reach))


def dic(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """E + (2130 + 155 age - E) deepening + (10 + 45 age) hump(o, 850) + added - 117 bloom; the river brings 1175.

    E is `equilibrium_carbon` of the surface at its mean temperature of the year.
    """
    origin = origin_depth(place, depth, year)
    surface_alkalinity = np.asarray(66.0 * sea_salinity(place, 0.0, year) + polar_excess(place))
    surface = equilibrium_carbon(np.asarray(surface_climate(place) + 0.5 * summer_warmth(place)), surface_alkalinity)
    sea = surface + (2130.0 + 155.0 * place.age - surface) * deepening(place, origin)
    sea = sea + (10.0 + 45.0 * place.age) * hump(origin, 850.0) + added_carbon(place, depth, year)
    sea = sea - CARBON_TO_PHOSPHORUS * bloom(place, depth, year)
    return mixed_with_river(np.asarray(sea), RIVER["dic"], river_share(place, depth))
