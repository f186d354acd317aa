"""Areas on the sphere: boxes between parallels and meridians, and polygons of any number of corners.

A box is exact: R^2 (lon2 - lon1) (sin lat2 - sin lat1). Sides of a polygon are great circles; its area is the spherical
excess, added up from the triangles at its first corner. Every function is arithmetic cell by cell, so that a cell has
the same area to the last bit in any slice of a grid.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Numbers = npt.NDArray[np.float64]
Vector = tuple[Numbers, Numbers, Numbers]

RADIUS = 6371008.7714
"""Mean radius of the Earth, m: a third of twice the equatorial and once the polar radius of GRS80 (Moritz 2000)."""

_PIECE = 16_384
"""Polygons worked on at a time, which bounds the memory of unit vectors."""


def heights(latitude_edges: Numbers) -> Numbers:
    """sin(upper) - sin(lower), positive, of edges (..., 2) in degrees; what lies beyond a pole is cut off."""
    edges = np.radians(np.clip(latitude_edges, -90.0, 90.0))
    one, two = edges[..., 0], edges[..., 1]
    # The difference of two sines as a product keeps all digits of thin rows.
    return np.abs(2.0 * np.cos((one + two) / 2.0) * np.sin((two - one) / 2.0))


def widths(longitude_edges: Numbers, centres: Numbers) -> Numbers:
    """Radians between the meridians of edges (n, 2) in degrees, on any turn, by way of the centres (n)."""
    one, two = ((longitude_edges[..., side] - centres + 180.0) % 360.0 - 180.0 for side in (0, 1))
    across = np.abs(two - one)
    apart = np.abs(longitude_edges[..., 1] - longitude_edges[..., 0])
    around = (across < 1e-9) & (apart > 180.0)
    # Where both edges stand on one turn their own difference is used: it has more digits.
    across = np.where(np.abs(apart - across) < 1e-6, apart, np.where(around, 360.0, across))
    return np.asarray(np.radians(across))


def polygon_angles(longitude: Numbers, latitude: Numbers) -> Numbers:
    """Solid angles (sr) of polygons with corners (n, corner) in degrees, NaN where there are no corners.

    Corners may run either way round. A corner that is NaN, or the same as the one before, adds nothing. Cells whose four
    corners lie on two parallels and two meridians are boxes, not polygons.
    """
    found = np.empty(longitude.shape[0])
    for start in range(0, found.size, _PIECE):
        part = slice(start, start + _PIECE)
        lon, lat = _filled(longitude[part]), _filled(latitude[part])
        angles = _excess(lon, lat)
        box = _boxes(lon, lat)
        if box.any():
            east, west = (lon[box].max(axis=-1), lon[box].min(axis=-1))
            span = np.minimum(east - west, 360.0 - (east - west))
            angles[box] = np.radians(span) * heights(np.stack([lat[box].min(axis=-1), lat[box].max(axis=-1)], axis=-1))
        found[part] = angles
    return found


def _filled(corners: Numbers) -> Numbers:
    """Corners with each NaN replaced by the corner before it."""
    filled = np.array(corners, dtype=np.float64)
    for corner in range(1, filled.shape[-1]):
        filled[:, corner] = np.where(np.isnan(filled[:, corner]), filled[:, corner - 1], filled[:, corner])
    return filled


def _boxes(lon: Numbers, lat: Numbers) -> npt.NDArray[np.bool_]:
    """Whether four corners lie on two parallels and two meridians, going round."""
    if lon.shape[-1] != 4:
        return np.zeros(lon.shape[0], dtype=bool)
    one, two = np.roll(lon, -1, axis=-1) == lon, np.roll(lat, -1, axis=-1) == lat
    first = two[:, 0] & two[:, 2] & one[:, 1] & one[:, 3]
    second = one[:, 0] & one[:, 2] & two[:, 1] & two[:, 3]
    return np.asarray(first | second)


def _excess(lon: Numbers, lat: Numbers) -> Numbers:
    """Spherical excess of closed rings, by tan(E/2) = a.(b x c) / (1 + a.b + b.c + c.a) for each triangle of unit vectors.

    Van Oosterom and Strackee (1983), IEEE Transactions on Biomedical Engineering 30, 125, eq. 8. The triple product is
    taken of differences, which keeps the digits of small cells.
    """
    total = np.zeros(lon.shape[0])
    first, before = _vector(lon[:, 0], lat[:, 0]), _vector(lon[:, 1], lat[:, 1])
    for corner in range(2, lon.shape[-1]):
        after = _vector(lon[:, corner], lat[:, corner])
        volume = _dot(first, _cross(_minus(before, first), _minus(after, first)))
        cosines = 1.0 + _dot(first, before) + _dot(before, after) + _dot(after, first)
        total = total + 2.0 * np.arctan2(volume, cosines)
        before = after
    return np.asarray(np.abs(total))


def _vector(lon: Numbers, lat: Numbers) -> Vector:
    lam, phi = np.radians(lon), np.radians(lat)
    flat = np.cos(phi)
    return flat * np.cos(lam), flat * np.sin(lam), np.sin(phi)


def _minus(one: Vector, two: Vector) -> Vector:
    return one[0] - two[0], one[1] - two[1], one[2] - two[2]


def _cross(one: Vector, two: Vector) -> Vector:
    return one[1] * two[2] - one[2] * two[1], one[2] * two[0] - one[0] * two[2], one[0] * two[1] - one[1] * two[0]


def _dot(one: Vector, two: Vector) -> Numbers:
    return np.asarray(one[0] * two[0] + one[1] * two[1] + one[2] * two[2])
