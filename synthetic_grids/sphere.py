"""Geometry on the unit sphere, and the seed-free ripples that make the invented ocean look grown.

Every function is elementwise arithmetic on numpy arrays that broadcast: no reduction over cells and no matrix product,
so a point has the same value to the last bit alone or inside any grid.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

Numbers = NDArray[np.float64]

RADIUS_KM = 6371.0
"""Radius of the invented planet, that of a sphere of the Earth's volume."""

GOLDEN_ANGLE = 2.399963229728653
GOLDEN_FRACTION = 0.6180339887498949
PLASTIC_FRACTION = 0.7548776662466927
"""Irrational steps: they spread directions and phases evenly and need no random numbers."""


@dataclass(frozen=True)
class Point:
    """Unit vectors from the planet's centre: x towards 0 E on the equator, y towards 90 E, z towards the north pole."""

    x: Numbers
    y: Numbers
    z: Numbers


def point(longitude: ArrayLike, latitude: ArrayLike) -> Point:
    """The unit vectors of places given in degrees east and degrees north; any longitude convention."""
    lam = np.radians(np.asarray(longitude, dtype=np.float64))
    phi = np.radians(np.asarray(latitude, dtype=np.float64))
    lam, phi = (np.array(part, order="C") for part in np.broadcast_arrays(lam, phi))
    return Point(np.cos(phi) * np.cos(lam), np.cos(phi) * np.sin(lam), np.sin(phi))


def ripples(where: Point, first: int, count: int, lowest: float, growth: float = 1.32) -> Numbers:
    """A smooth field of about unit standard deviation: `count` plane waves cut by the sphere.

    Wave i of the series first, first + 1, ... is a sin(k d.x + phase) with wave number k = lowest growth^n (radian per
    planet radius, n counts from 0), amplitude a proportional to growth^-n, direction d the i-th of a golden spiral and
    phase 2 pi times the fractional part of i 0.7549. Sampled on a sphere it has no seam at the date line and none at
    the poles.
    """
    total = np.zeros_like(where.z)
    power = 0.0
    for n in range(count):
        i = first + n
        up = 1.0 - 2.0 * ((i * GOLDEN_FRACTION) % 1.0)
        flat = np.sqrt(1.0 - up * up)
        turn = i * GOLDEN_ANGLE
        along = flat * np.cos(turn) * where.x + flat * np.sin(turn) * where.y + up * where.z
        amplitude = growth**-n
        total = total + amplitude * np.sin(lowest * growth**n * along + 2.0 * np.pi * ((i * PLASTIC_FRACTION) % 1.0))
        power += amplitude * amplitude / 2.0
    return np.asarray(total / np.sqrt(power))


def warp(where: Point, first: int, count: int, lowest: float, share: float) -> Point:
    """Each point moved by three ripple fields of standard deviation `share` (planet radii), then put back on the sphere."""
    x = where.x + share * ripples(where, first, count, lowest)
    y = where.y + share * ripples(where, first + 100, count, lowest)
    z = where.z + share * ripples(where, first + 200, count, lowest)
    length = np.sqrt(x * x + y * y + z * z)
    return Point(x / length, y / length, z / length)


def distance(a: Point, b: Point) -> Numbers:
    """Great-circle distance in km."""
    dx, dy, dz = a.x - b.x, a.y - b.y, a.z - b.z
    chord = np.sqrt(dx * dx + dy * dy + dz * dz)
    return np.asarray(2.0 * RADIUS_KM * np.arcsin(np.minimum(chord / 2.0, 1.0)))


@dataclass(frozen=True)
class Stroke:
    """A brush stroke along a great circle: from one place to another (degrees), with a radius (km) at either end."""

    start: tuple[float, float]
    end: tuple[float, float]
    start_radius: float
    end_radius: float

    def distance(self, where: Point) -> Numbers:
        """Distance from the edge of the stroke in km, negative inside it."""
        a, b = point(*self.start), point(*self.end)
        bx, by, bz = b.x - a.x, b.y - a.y, b.z - a.z
        share = ((where.x - a.x) * bx + (where.y - a.y) * by + (where.z - a.z) * bz) / (bx * bx + by * by + bz * bz)
        share = np.clip(share, 0.0, 1.0)
        x, y, z = a.x + share * bx, a.y + share * by, a.z + share * bz
        length = np.sqrt(x * x + y * y + z * z)
        nearest = Point(np.asarray(x / length), np.asarray(y / length), np.asarray(z / length))
        return np.asarray(distance(where, nearest) - (self.start_radius + share * (self.end_radius - self.start_radius)))
