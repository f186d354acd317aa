"""Places, depths and months that every kind of grid shares, so that the same cell can be looked up in any clothing.

The *raster* are the centres of a global grid of 7.5 degrees. Its numbers are exact in binary, whatever multiple of 360
is added. A *landmark* is a place of the raster over deep water. All grids that cover the globe hold the landmarks of
the two `MERIDIANS`, one down the middle of either ocean; most hold all. At a landmark the levels of every vertical
coordinate (but those that follow pressure) lie at `DEPTHS`, and every calendar has the `MONTHS`.
"""

from __future__ import annotations

from functools import cache

import numpy as np

from synthetic_grids.geography import sea_floor_depth
from synthetic_grids.sphere import Numbers

STEP = 7.5
LONGITUDES: Numbers = STEP / 2.0 + STEP * np.arange(48.0)
LATITUDES: Numbers = -90.0 + STEP / 2.0 + STEP * np.arange(24.0)

MERIDIANS = (86.25, 266.25)
"""Degrees east: one great circle through both poles, which rotated and bipolar grids keep exactly."""

EDGES = (0.0, 10.0, 40.0, 110.0, 190.0, 610.0, 990.0, 3010.0, 5990.0)
"""Bounds of the levels in m. Their middles are `DEPTHS`, 2000 m and 4500 m."""

DEPTHS = (5.0, 25.0, 75.0, 150.0, 400.0, 800.0)

MONTHS = ((2010, 11), (2010, 12), (2011, 1))
"""Year and month; they cross a new year, so that files can be split there."""

ENOUGH = 50


def _survives_radians(degrees: float) -> bool:
    """Whether the number comes back to the last bit from radians."""
    return bool(np.degrees(np.radians(degrees)) == degrees)


@cache
def landmarks() -> tuple[tuple[float, float], ...]:
    """Fifty places as (degrees east, degrees north): deeper than 1100 m, within 60 degrees of the equator.

    Those of the meridians come first, the rest is spread evenly over the others. Their latitudes, on which pressure
    depends, come back to the last bit from radians.
    """
    deep = [
        (float(lon), float(lat)) for lat in LATITUDES for lon in LONGITUDES
        if abs(lat) < 60.0 and _survives_radians(lat) and sea_floor_depth(lon, lat) > 1100.0
    ]
    first = [place for place in deep if place[0] in MERIDIANS]
    others = [place for place in deep if place not in first]
    wanted = ENOUGH - len(first)
    return (*first, *(others[number * len(others) // wanted] for number in range(wanted)))


def settled(degrees: Numbers) -> Numbers:
    """Numbers within 1e-9 of the raster put onto it: what is left of rounding where a grid meets a landmark."""
    half = STEP / 2.0
    near = np.round(degrees / half) * half
    return np.asarray(np.where(np.abs(degrees - near) < 1e-9, near, degrees) + 0.0)


def eastward(degrees: Numbers) -> Numbers:
    """The same longitudes from 0 to below 360 degrees east: the form in which every grid asks the ocean."""
    turned = np.mod(settled(degrees), 360.0)
    return np.asarray(np.where(turned >= 360.0, 0.0, turned))
