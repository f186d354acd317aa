"""What a place on the map is like: everything the water columns need that does not depend on depth or time."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from synthetic_grids.geography import OSHEL_MOUTH, coast_distance, oldness
from synthetic_grids.sphere import RADIUS_KM, Numbers, distance, point, ripples

HALVREN = point(110.0, -77.0)
"""Centre of the polar sea that makes deep water."""

OMBARY = point(331.0, 24.0)
"""The middle of the upwelling coast."""

MOUTH = point(*OSHEL_MOUTH)


@dataclass(frozen=True)
class Place:
    """Fields of the map, all of one shape.

    latitude : degN.
    climate_latitude : degrees from the equator, bent by boundary currents and meanders; what the surface climate follows.
    old : 0 in the Lorrin Ocean and the Halvren Sea, 1 in the Vasht Ocean.
    age : 0 (new deep water) to 1 (the oldest), growing northward within each basin.
    across : -1 on the western side of either ocean, +1 on the eastern side, 0 along their middles.
    bowl : scale depth of the thermocline in m: deep in the gyres and in the west, shallow in the east and at the equator.
    lift : how far coastal and equatorial upwelling lifts the water below, in m, in the yearly mean.
    coastal : the part of `lift` that follows the season (0 to 1).
    formation : 1 where deep water is made, 0 far from there.
    river : share of river water at the sea surface, at most 6/7.
    """

    latitude: Numbers
    climate_latitude: Numbers
    old: Numbers
    age: Numbers
    across: Numbers
    bowl: Numbers
    lift: Numbers
    coastal: Numbers
    formation: Numbers
    river: Numbers


def bell(x: Numbers, centre: float, width: float) -> Numbers:
    """exp(-((x - centre) / width)^2)."""
    scaled = (x - centre) / width
    return np.asarray(np.exp(-scaled * scaled))


def hump(x: Numbers, peak: float) -> Numbers:
    """1 at x = peak, 0 at 0 and far above: r exp(1 - r), r = x / peak."""
    ratio = x / peak
    return np.asarray(ratio * np.exp(1.0 - ratio))


def places(longitude: ArrayLike, latitude: ArrayLike) -> Place:
    """The places at given degrees east and north (shapes that broadcast).

    With f the latitude, p = -sin(2 lon) the position across a basin, m and e ripples (meanders and eddies):

    climate latitude = |f| + a (2 m + 0.4 e + (6 p + 1.6 m + 0.9 e) bell(|f|, 36, 20)), a = 1 - bell(f, 0, 9);
    bowl = 110 + (380 - 150 p) bell(|f|, 30, 13) (1 - 0.45 old) + 170 bell(|f|, 52, 9) + 25 a e;
    coastal = bell(c, 0, 480 km) bell(f, 24, 13) bell(g, 0, 24) (0.9 + 0.1 e), c the distance from the coast,
    g the angle from the middle of the Ombary Coast;
    lift = 300 coastal + 40 (0.55 + 0.45 p) bell(f + m, 0, 4);
    age = old (0.72 + 0.28 n) + (1 - old) (0.04 + 0.13 n), n = (1 + tanh((f - 5) / 30)) / 2;
    river = 6/7 exp(-(s / 620 km)^2), s the distance from the mouth of the Oshel.
    """
    where = point(longitude, latitude)
    lat = np.degrees(np.arcsin(where.z))
    lon = np.arctan2(where.y, where.x)
    off_equator = np.abs(lat)
    across = np.asarray(-np.sin(2.0 * lon))
    meander = ripples(where, 300, 10, 5.0, 1.25)
    eddies = ripples(where, 340, 12, 24.0, 1.15)
    coast = np.maximum(coast_distance(where), 0.0)
    old = oldness(where)
    north = 0.5 * (1.0 + np.tanh((lat - 5.0) / 30.0))
    away = 1.0 - bell(off_equator, 0.0, 9.0)
    bending = 2.0 * meander + 0.4 * eddies + (6.0 * across + 1.6 * meander + 0.9 * eddies) * bell(off_equator, 36.0, 20.0)
    gyre = (380.0 - 150.0 * across) * bell(off_equator, 30.0, 13.0) * (1.0 - 0.45 * old)
    ombary = bell(np.degrees(distance(where, OMBARY) / RADIUS_KM), 0.0, 24.0)
    coastal = bell(coast, 0.0, 480.0) * bell(lat, 24.0, 13.0) * ombary * (0.9 + 0.1 * eddies)
    return Place(
        latitude=lat,
        climate_latitude=np.asarray(off_equator + bending * away),
        old=old,
        age=np.asarray(old * (0.72 + 0.28 * north) + (1.0 - old) * (0.04 + 0.13 * north)),
        across=across,
        bowl=np.asarray(110.0 + gyre + 170.0 * bell(off_equator, 52.0, 9.0) + 25.0 * eddies * away),
        lift=np.asarray(300.0 * coastal + 40.0 * (0.55 + 0.45 * across) * bell(lat + meander, 0.0, 4.0)),
        coastal=np.asarray(coastal),
        formation=bell(distance(where, HALVREN), 0.0, 1700.0),
        river=np.asarray(6.0 / 7.0 * bell(distance(where, MOUTH), 0.0, 620.0)),
    )
