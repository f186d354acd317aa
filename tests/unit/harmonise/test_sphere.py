"""Areas on the sphere against the whole, against fifty digits by the half-angle formula, and under turns."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.harmonise import sphere


@pytest.mark.parametrize(("rows", "columns"), [(1, 1), (3, 4), (180, 360), (719, 1440)])
def test_boxes_cover_the_sphere(rows, columns):
    lat, lon = np.linspace(-90, 90, rows + 1), np.linspace(-180, 180, columns + 1)
    high = sphere.heights(np.stack([lat[:-1], lat[1:]], -1))
    wide = sphere.widths(np.stack([lon[:-1], lon[1:]], -1), (lon[1:] + lon[:-1]) / 2)
    assert (high[:, None] * wide).sum() == pytest.approx(4 * np.pi, rel=1e-12)


@pytest.mark.parametrize("west", [-180.0, 0.0, 0.5, 20.5, 180.0, 359.5])
@pytest.mark.parametrize("turn", [-360.0, 0.0, 720.0])
def test_widths_do_not_care_for_turns_or_order(west, turn):
    edges = west + np.arange(0.0, 361.0, 2.0)
    pairs = np.stack([edges[:-1], edges[1:]], -1)
    centres = pairs.mean(-1)
    given_edges = (pairs[:, ::-1] + 180.0) % 360.0 - 180.0 + turn
    assert sphere.widths(given_edges, centres) == pytest.approx(np.radians(2.0), rel=1e-12)


def test_edges_beyond_a_pole_are_cut_off():
    assert sphere.heights(np.array([[89.0, 91.0]])) == sphere.heights(np.array([[89.0, 90.0]]))


def excess(corners):
    """Spherical excess of a triangle by l'Huilier's formula, with sides by haversine, in fifty digits."""
    with mpmath.workdps(50):
        at = [[mpmath.radians(mpmath.mpf(float(part))) for part in corner] for corner in corners]

        def side(one, two):
            half = mpmath.sin((two[1] - one[1]) / 2) ** 2
            half += mpmath.cos(one[1]) * mpmath.cos(two[1]) * mpmath.sin((two[0] - one[0]) / 2) ** 2
            return 2 * mpmath.asin(mpmath.sqrt(half))

        a, b, c = side(at[1], at[2]), side(at[2], at[0]), side(at[0], at[1])
        s = (a + b + c) / 2
        product = mpmath.tan(s / 2) * mpmath.tan((s - a) / 2) * mpmath.tan((s - b) / 2) * mpmath.tan((s - c) / 2)
        return float(4 * mpmath.atan(mpmath.sqrt(product)))


CORNERS = [
    [(0, 0), (90, 0), (0, 90)],
    [(10, 20), (11, 20.5), (10.2, 21)],
    [(179.9, 70), (-179.9, 70.05), (180, 70.2)],
    [(30.0, -45.0), (30.001, -45.0), (30.0005, -44.999)],
    [(0, 80), (120, 80), (240, 80)],
]


@pytest.mark.parametrize("corners", CORNERS)
@pytest.mark.parametrize("order", [1, -1])
def test_triangles_against_fifty_digits(corners, order):
    lon, lat = np.array(corners, dtype=float)[::order].T
    assert sphere.polygon_angles(lon[None], lat[None])[0] == pytest.approx(excess(corners), rel=1e-9)


def test_the_octant_is_an_eighth():
    assert sphere.polygon_angles(np.array([[0.0, 90.0, 45.0]]), np.array([[0.0, 0.0, 90.0]]))[0] == pytest.approx(np.pi / 2)


@settings(deadline=None, max_examples=50)
@given(st.floats(-400, 400), st.floats(-89, 80), st.floats(0.01, 20), st.integers(0, 3))
def test_a_quadrilateral_is_the_sum_of_its_triangles_from_any_corner(lon, lat, size, start):
    x = np.roll(lon + size * np.array([0.0, 1.0, 1.2, -0.1]), start)
    y = np.roll(np.minimum(lat + 0.5 * size * np.array([0.0, 0.1, 1.0, 0.9]), 90.0), start)
    parts = sum(excess([(x[0], y[0]), (x[n], y[n]), (x[n + 1], y[n + 1])]) for n in (1, 2))
    assert sphere.polygon_angles(x[None], y[None])[0] == pytest.approx(parts, rel=1e-7)


def test_repeated_and_missing_corners_add_nothing():
    lon, lat = np.array([[10.0, 12.0, 11.0]]), np.array([[50.0, 50.0, 52.0]])
    alone = sphere.polygon_angles(lon, lat)
    for x, y in ((11.0, 52.0), (np.nan, np.nan)):
        again = sphere.polygon_angles(np.append(lon, [[x, x]], 1), np.append(lat, [[y, y]], 1))
        assert again == pytest.approx(alone, rel=1e-14)
    assert np.isnan(sphere.polygon_angles(np.full((1, 3), np.nan), lat)[0])
    assert sphere.polygon_angles(np.full((1, 4), 5.0), np.full((1, 4), 6.0))[0] == 0.0


@pytest.mark.parametrize("turn", [0, 1, 2, 3])
@pytest.mark.parametrize("way", [1, -1])
@pytest.mark.parametrize("west", [10.0, 359.0, -180.5])
def test_a_cell_between_parallels_and_meridians_is_a_box(turn, way, west):
    lon, lat = np.array([west, west + 2, west + 2, west]) % 360, np.array([60.0, 60.0, 61.0, 61.0])
    found = sphere.polygon_angles(np.roll(lon, turn)[None, ::way], np.roll(lat, turn)[None, ::way])[0]
    assert found == pytest.approx(np.radians(2) * (np.sin(np.radians(61)) - np.sin(np.radians(60))), rel=1e-13)


def test_polygons_against_points_thrown_at_the_sphere():
    """A pole inside, and a cell across the date line: shares of points that lie on the inner side of all sides."""
    number = np.random.default_rng(8)
    points = number.normal(size=(400_000, 3))
    points /= np.linalg.norm(points, axis=1)[:, None]
    for lon, lat in (([0.0, 80, 190, 270], [60.0, 70, 50, 65]), ([160.0, -150, -160, 150], [-20.0, -10, 40, 30])):
        lam, phi = np.radians(lon), np.radians(lat)
        corners = np.stack([np.cos(phi) * np.cos(lam), np.cos(phi) * np.sin(lam), np.sin(phi)], -1)
        inside = np.all([points @ np.cross(corners[n], corners[(n + 1) % 4]) > 0 for n in range(4)], axis=0)
        thrown = 4 * np.pi * inside.mean()
        assert sphere.polygon_angles(np.array([lon]), np.array([lat]))[0] == pytest.approx(thrown, rel=0.02)


def test_a_cell_has_the_same_area_to_the_last_bit_in_any_company():
    number = np.random.default_rng(3)
    lon = number.uniform(0, 360, (5000, 1)) + number.uniform(0, 1, (5000, 4))
    lat = np.clip(number.uniform(-90, 90, (5000, 1)) + number.uniform(0, 1, (5000, 4)), -90, 90)
    whole = sphere.polygon_angles(lon, lat)
    for part in (slice(17, 18), slice(3, 4000), slice(None, None, 7)):
        assert np.array_equal(sphere.polygon_angles(lon[part], lat[part]), whole[part])
