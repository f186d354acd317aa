"""The coastlines, basins and sea floor of the invented planet.

Two continents stand about 180 degrees apart. *Tarvane* (around 0 E) and *Quellorn* (around 178 E) meet in the north
under the cap of *Norrask*, and taper to capes in the south. Between them lie the *Lorrin Ocean* (20 to 155 E, young
water) and the wider *Vasht Ocean* (200 to 345 E, old water). The south pole is open: the *Halvren Sea*, where deep
water is made, leads freely into the Lorrin, while *Yskerra* and the submarine *Sebbin Rise* shut most of it off from
the Vasht. The *Mirrel Sea* is a shelf sea cut into the east coast of Tarvane; the river *Oshel* enters its head. The
*Ombary Coast*, the west coast of Tarvane between 10 and 38 N, is where deep Vasht water wells up. The *Dravask Trench*
follows the east coast of Quellorn.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from synthetic_grids.sphere import Numbers, Point, Stroke, distance, point, ripples, warp

LANDS: dict[str, tuple[Stroke, ...]] = {
    "Tarvane": (
        Stroke((-14.0, 66.0), (4.0, 32.0), 1700.0, 2150.0),
        Stroke((4.0, 32.0), (-6.0, 2.0), 2150.0, 1800.0),
        Stroke((-6.0, 2.0), (9.0, -37.0), 1800.0, 420.0),
        Stroke((12.0, 30.0), (44.0, 16.0), 1000.0, 380.0),
        Stroke((-20.0, 44.0), (-44.0, 50.0), 900.0, 320.0),
    ),
    "Quellorn": (
        Stroke((160.0, 62.0), (186.0, 38.0), 1600.0, 1900.0),
        Stroke((186.0, 38.0), (172.0, 9.0), 1900.0, 900.0),
        Stroke((172.0, 9.0), (184.0, -18.0), 900.0, 1600.0),
        Stroke((184.0, -18.0), (172.0, -45.0), 1600.0, 300.0),
        Stroke((188.0, 36.0), (217.0, 44.0), 1100.0, 380.0),
        Stroke((176.0, -14.0), (152.0, -22.0), 800.0, 330.0),
    ),
    "Norrask": (
        Stroke((-20.0, 74.0), (80.0, 82.0), 1300.0, 1150.0),
        Stroke((80.0, 82.0), (168.0, 72.0), 1150.0, 1100.0),
        Stroke((80.0, 83.0), (250.0, 79.0), 900.0, 800.0),
    ),
    "Yskerra": (
        Stroke((212.0, -63.0), (262.0, -70.0), 330.0, 900.0),
        Stroke((262.0, -70.0), (322.0, -60.0), 900.0, 320.0),
    ),
    "Great Orrel": (
        Stroke((84.0, -22.0), (108.0, -33.0), 850.0, 420.0),
        Stroke((104.0, -20.0), (112.0, -13.0), 260.0, 200.0),
    ),
    "Pellowen Isles": (
        Stroke((64.0, 3.0), (69.0, 8.0), 240.0, 160.0),
        Stroke((78.0, 12.0), (80.0, 12.5), 190.0, 140.0),
        Stroke((88.0, 14.0), (93.0, 19.0), 170.0, 220.0),
    ),
    "Sebbin Isles": (
        Stroke((236.0, -9.0), (240.0, -4.0), 230.0, 150.0),
        Stroke((248.0, 2.0), (251.0, 3.0), 190.0, 160.0),
        Stroke((259.0, 9.0), (264.0, 14.0), 190.0, 180.0),
        Stroke((283.0, -33.0), (290.0, -39.0), 420.0, 260.0),
    ),
}
"""Land by name: the union of its strokes."""

MIRREL_SEA = (Stroke((12.0, 46.0), (31.0, 43.0), 430.0, 850.0), Stroke((31.0, 43.0), (54.0, 44.0), 650.0, 450.0))
"""Sea cut out of the land after the strokes of `LANDS` are laid."""

OSHEL_MOUTH = (7.5, 46.5)
"""Longitude and latitude of the mouth of the river."""

RIDGES = (
    Stroke((92.0, 58.0), (78.0, 20.0), 0.0, 0.0), Stroke((78.0, 20.0), (100.0, -8.0), 0.0, 0.0),
    Stroke((100.0, -8.0), (124.0, -55.0), 0.0, 0.0),
    Stroke((292.0, 62.0), (296.0, 12.0), 0.0, 0.0), Stroke((296.0, 12.0), (262.0, -30.0), 0.0, 0.0),
    Stroke((190.0, -58.0), (340.0, -54.0), 0.0, 0.0),
)
"""Crests of the mid-ocean ridges (the last is the Sebbin Rise)."""

DRAVASK_TRENCH = Stroke((221.0, 34.0), (203.0, -34.0), 0.0, 0.0)
"""The line the trench follows at a fixed distance from the coast."""

BASIN_POLE = point(272.0, 12.0)
"""Centre of the Vasht hemisphere; tilted north, so that the south pole belongs to the Lorrin."""

LOWSTAND_KM = 300.0
"""All strokes are widened by this much: it makes the sea cover 71 % of the planet, 3.6e14 m2."""

SHELF_DEPTH = 140.0
SLOPE_FOOT = 4300.0


def _nearest(strokes: Sequence[Stroke], where: Point) -> Numbers:
    """Distance in km from the edge of the nearest stroke."""
    found = strokes[0].distance(where)
    for stroke in strokes[1:]:
        found = np.minimum(found, stroke.distance(where))
    return found


def coast_distance(where: Point) -> Numbers:
    """Distance from the coast in km, positive at sea and negative on land.

    The strokes are measured from a warped point, moved by ripples of 320 km, 130 km and 30 km, which turns their
    outlines into capes, gulfs and sounds. In the Mirrel Sea the distance is that from its own shore.
    """
    moved = warp(warp(warp(where, 11, 6, 3.1, 0.05), 47, 7, 11.0, 0.02), 29, 7, 55.0, 0.0045)
    from_land = _nearest([stroke for strokes in LANDS.values() for stroke in strokes], moved) - LOWSTAND_KM
    return np.asarray(np.maximum(from_land, -_nearest(MIRREL_SEA, moved)))


def is_land(longitude: ArrayLike, latitude: ArrayLike) -> NDArray[np.bool_]:
    """True on land. Degrees east and north, any shapes that broadcast."""
    return np.asarray(coast_distance(point(longitude, latitude)) <= 0.0)


def oldness(where: Point) -> Numbers:
    """0 in the Lorrin and Halvren, 1 in the Vasht: (1 + tanh(b / 0.16)) / 2.

    b is the cosine of the angle from the basin pole plus 0.05 times a ripple field, which makes the front wander.
    """
    straight = where.x * BASIN_POLE.x + where.y * BASIN_POLE.y + where.z * BASIN_POLE.z
    toward = straight + 0.05 * ripples(where, 61, 7, 6.0)
    return np.asarray(0.5 * (1.0 + np.tanh(toward / 0.16)))


def sea_floor_depth(longitude: ArrayLike, latitude: ArrayLike) -> Numbers:
    """Depth of the sea floor in m, at least 25 in the sea and 0 on land. Degrees east and north, shapes that broadcast.

    Shelf, slope and abyss by distance from the coast c (km), with w the width of the shelf:
    25 + 115 tanh(c / w) + 4160 (1 + tanh((c - w - 130) / 75)) / 2, then gently down into the abyss over 900 km.
    Ridges rise 2300 m above that (e-fold 600 km, rough flanks); the trench falls 4200 m below it, 320 km off the coast.
    """
    where = point(longitude, latitude)
    coast = coast_distance(where)
    mirrel = np.exp(-((distance(where, point(27.0, 43.0)) / 1500.0) ** 2))
    width = 70.0 + 40.0 * np.abs(ripples(where, 71, 4, 5.0)) + 900.0 * mirrel
    shelf = 25.0 + (SHELF_DEPTH - 25.0) * np.tanh(np.maximum(coast, 0.0) / width)
    slope = (SLOPE_FOOT - SHELF_DEPTH) * 0.5 * (1.0 + np.tanh((coast - width - 130.0) / 75.0))
    off = np.maximum(coast - width - 130.0, 0.0)
    abyss = (900.0 + 280.0 * ripples(where, 83, 7, 9.0)) * (1.0 - np.exp(-off / 900.0))
    to_ridge = _nearest(RIDGES, warp(where, 91, 5, 6.0, 0.02))
    ridge_height = 2300.0 * np.exp(-to_ridge / 600.0) * (1.0 - np.exp(-off / 500.0))
    beside = np.exp(-((DRAVASK_TRENCH.distance(where) / 2000.0) ** 4))
    trench = 4200.0 * beside * np.exp(-(((coast - 320.0) / 75.0) ** 2))
    depth = shelf + slope + abyss - ridge_height + trench
    return np.asarray(np.where(coast > 0.0, depth, 0.0))
