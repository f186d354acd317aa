"""Temperature and salinity of the invented ocean, and the vertical coordinate all its tracers share.

The ocean is stirred by one device: every tracer is a profile of *origin depth*, the depth a parcel of water came from.
The mixed layer makes the origin depth flat, upwelling makes it larger than the depth itself.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from synthetic_grids.place import Place, bell, hump
from synthetic_grids.sphere import Numbers

WINTER_NORTH = 0.17
"""Fraction of the year at which the northern winter mixes deepest (early March)."""


def winter(place: Place, year: ArrayLike) -> Numbers:
    """How much of winter it is: 1 at its deepest, 0 in high summer, 1/2 at the equator.

    (1 + tanh(f / 10) cos(2 pi (year - 0.17))) / 2, f the latitude; `year` in decimal years.
    """
    turn = 2.0 * np.pi * (np.asarray(year, dtype=np.float64) - WINTER_NORTH)
    return np.asarray(0.5 * (1.0 + np.tanh(place.latitude / 10.0) * np.cos(turn)))


def mixed_layer_depth(place: Place, year: ArrayLike) -> Numbers:
    """Depth of the mixed layer in m: 25 + winter^2 (45 + 190 bell(climate latitude, 52, 12) + 900 formation)."""
    cold = winter(place, year)
    depth = 45.0 + 190.0 * bell(place.climate_latitude, 52.0, 12.0) + 900.0 * place.formation
    return np.asarray(25.0 + cold * cold * depth)


def origin_depth(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """Depth in m whose water is found at `depth` (m, positive down).

    z^3 / (z^2 + h^2) with a mixed layer of depth h, plus what upwelling lifts, l (0.45 exp(-z / 400) + 0.55 hump(z, 120)),
    with l = lift + 100 coastal (1 - 2 winter).
    """
    z = np.asarray(depth, dtype=np.float64)
    mixed = mixed_layer_depth(place, year)
    lift = place.lift + 100.0 * place.coastal * (1.0 - 2.0 * winter(place, year))
    lifted = lift * (0.45 * np.exp(-z / 400.0) + 0.55 * hump(z, 120.0))
    return np.asarray(z * z * z / (z * z + mixed * mixed) + lifted)


def summer_cap(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """Share of the summer's warming and blooming felt at a depth: (1 - winter) exp(-(z / 45)^2)."""
    scaled = np.asarray(depth, dtype=np.float64) / 45.0
    return np.asarray((1.0 - winter(place, year)) * np.exp(-scaled * scaled))


def surface_climate(place: Place) -> Numbers:
    """Winter temperature of the sea surface in degC: 29.8 / (1 + (c / 39)^6) - 1.85 - 1.1 (1 + p) bell(c, 6, 14).

    c is the climate latitude, p the position across the basin: the tropics are warmest in the west.
    """
    ratio = place.climate_latitude / 39.0
    cube = ratio * ratio * ratio
    cool_east = 1.1 * (1.0 + place.across) * bell(place.climate_latitude, 6.0, 14.0)
    return np.asarray(29.8 / (1.0 + cube * cube) - 1.85 - cool_east)


def summer_warmth(place: Place) -> Numbers:
    """What summer adds to the winter temperature of the surface, in K: 1 + 7 bell(c, 40, 15)."""
    return np.asarray(1.0 + 7.0 * bell(place.climate_latitude, 40.0, 15.0))


def middle_water(place: Place) -> Numbers:
    """1 where warm middle water lies over the deep, 0 in the polar seas: 1 / (1 + exp((c - 56) / 4))."""
    return np.asarray(1.0 / (1.0 + np.exp((place.climate_latitude - 56.0) / 4.0)))


def temperature(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """In-situ temperature in degC (ITS-90).

    D(o) + (W - D(0)) exp(-o / bowl) + summer warmth * summer cap + 7.6e-5 z + 4e-9 z^2, at depth z and origin depth o.
    W is the winter surface, D(o) = 1.7 - 0.5 age - 2.1 formation + 3.3 exp(-o / 1300) (share of middle water) the deep
    water; the last two terms are the warming by compression.
    """
    z = np.asarray(depth, dtype=np.float64)
    origin = origin_depth(place, z, year)
    bottom = 1.7 - 0.5 * place.age - 2.1 * place.formation
    middle = 3.3 * middle_water(place)
    deep = bottom + middle * np.exp(-origin / 1300.0)
    summer = summer_warmth(place) * summer_cap(place, z, year)
    thermocline = (surface_climate(place) - bottom - middle) * np.exp(-origin / place.bowl)
    return np.asarray(deep + thermocline + summer + 7.6e-5 * z + 4.0e-9 * z * z)


def river_share(place: Place, depth: ArrayLike) -> Numbers:
    """Share of river water at a depth: river exp(-(z / 18)^4)."""
    scaled = np.asarray(depth, dtype=np.float64) / 18.0
    square = scaled * scaled
    return np.asarray(place.river * np.exp(-square * square))


def sea_salinity(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """Practical salinity before any river water.

    D + (S - D) exp(-o / (bowl + 150)) - 0.30 old (share of middle water) hump(o, 750), with the surface
    S = 34.6 - 0.5 old + 1.7 bell(c, 26, 12) - 0.5 bell(c, 4, 6) - (0.3 + 0.65 old) bell(c, 62, 16)
    - 0.3 (1 - p) bell(c, 5, 8), drawn to 34.58 by the share of formation, and the deep
    D = 34.88 - 0.18 age - 0.1 formation; c is the climate latitude, p the position across the basin.
    """
    climate = place.climate_latitude
    origin = origin_depth(place, depth, year)
    surface = 34.6 - 0.5 * place.old + 1.7 * bell(climate, 26.0, 12.0) - 0.5 * bell(climate, 4.0, 6.0)
    surface = surface - (0.3 + 0.65 * place.old) * bell(climate, 62.0, 16.0)
    surface = surface - 0.3 * (1.0 - place.across) * bell(climate, 5.0, 8.0)
    surface = surface + place.formation * (34.58 - surface)
    deep = 34.88 - 0.18 * place.age - 0.10 * place.formation
    tongue = 0.30 * place.old * middle_water(place) * hump(origin, 750.0)
    return np.asarray(deep + (surface - deep) * np.exp(-origin / (place.bowl + 150.0)) - tongue)


def salinity(place: Place, depth: ArrayLike, year: ArrayLike) -> Numbers:
    """Practical salinity: that of the sea times (1 - share of river water)."""
    return np.asarray(sea_salinity(place, depth, year) * (1.0 - river_share(place, depth)))
