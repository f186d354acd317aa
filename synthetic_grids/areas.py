"""Areas of cells on the sphere, from corners joined by great circles."""

from __future__ import annotations

import numpy as np

from synthetic_grids.sphere import RADIUS_KM, Numbers, Point, point


def _part(where: Point, corner: int) -> Numbers:
    """The unit vectors (..., 3) of one corner."""
    return np.stack([where.x[..., corner], where.y[..., corner], where.z[..., corner]], axis=-1)


def _solid_angle(a: Numbers, b: Numbers, c: Numbers) -> Numbers:
    """Signed solid angle of the triangles of unit vectors (..., 3): 2 atan2(a.(b x c), 1 + a.b + b.c + c.a).

    Van Oosterom and Strackee (1983), IEEE Transactions on Biomedical Engineering 30, 125, eq. 8.
    """
    volume = np.sum(a * np.cross(b, c), axis=-1)
    cosines = np.sum(a * b, axis=-1) + np.sum(b * c, axis=-1) + np.sum(c * a, axis=-1)
    return np.asarray(2.0 * np.arctan2(volume, 1.0 + cosines))


def polygon_area(longitude: Numbers, latitude: Numbers) -> Numbers:
    """Area in m2 of polygons whose corners (..., corner) are anticlockwise in degrees; repeated ones add nothing."""
    where = point(longitude, latitude)
    first = _part(where, 0)
    angle = np.zeros(first.shape[:-1])
    for corner in range(1, longitude.shape[-1] - 1):
        angle = angle + _solid_angle(first, _part(where, corner), _part(where, corner + 1))
    return np.asarray(1e6 * RADIUS_KM**2 * angle)
