"""Meshes: they tile the sphere, their folds repeat what they say, and all hold the landmarks."""

from __future__ import annotations

from collections import Counter

import cartopy.crs as ccrs
import numpy as np
import pytest

from synthetic_grids import plain_meshes, planes, unstructured
from synthetic_grids.areas import polygon_area
from synthetic_grids.geography import sea_floor_depth
from synthetic_grids.landmarks import MERIDIANS, eastward, landmarks
from synthetic_grids.scene import Mesh
from synthetic_grids.sphere import RADIUS_KM

SPHERE = 4.0 * np.pi * (1e3 * RADIUS_KM) ** 2

WHOLE = {
    "raster": plain_meshes.raster(), "westward": plain_meshes.raster(-180.0, southward=True, westward=True),
    "tripolar edge": planes.tripolar(), "tripolar centre": planes.tripolar(fold="centre", halo=False, west=72.5),
    "tripolar edge at sea": planes.tripolar(south=True),
    "tripolar centre at sea": planes.tripolar(south=True, fold="centre", halo=False),
    "bipolar": planes.bipolar(), "rotated": planes.rotated(),
}
PARTIAL = {
    "triangles": unstructured.triangles(), "polygons": unstructured.polygons(), "cells": unstructured.bounded_cells(),
    "stations": plain_meshes.scattered("station", "timeseries_id"),
}


def places(mesh: Mesh) -> list[tuple[float, float]]:
    return list(zip(mesh.longitude.ravel().tolist(), mesh.latitude.ravel().tolist(), strict=True))


def test_landmarks_lie_over_deep_water() -> None:
    lon, lat = np.array(landmarks()).T
    assert len(set(landmarks())) == 50
    assert sea_floor_depth(lon, lat).min() > 1100.0
    np.testing.assert_array_equal(np.degrees(np.radians(lat)), lat)
    assert sum(place[0] in MERIDIANS for place in landmarks()) > 15


def test_grid_poles_lie_on_land() -> None:
    poles = np.array([planes.FOLD_LONGITUDE, planes.FOLD_LONGITUDE - 180.0, planes.BIPOLE_LONGITUDE,
                      planes.BIPOLE_LONGITUDE - 180.0, planes.ROTATED_POLE[0]])
    assert np.all(sea_floor_depth(poles[:4], planes.CAP) == 0.0)


@pytest.mark.parametrize("name", [*WHOLE, *PARTIAL])
def test_every_mesh_holds_the_landmarks(name: str) -> None:
    mesh = {**WHOLE, **PARTIAL}[name]
    held = set(places(mesh))
    wanted = [place for place in landmarks() if place[0] in MERIDIANS] if name in ("bipolar", "rotated") else landmarks()
    assert not [place for place in wanted if place not in held]
    assert np.all((mesh.longitude >= 0.0) & (mesh.longitude < 360.0))
    assert np.all(np.abs(mesh.latitude) <= 90.0)


@pytest.mark.parametrize("name", WHOLE)
def test_cells_tile_the_sphere(name: str) -> None:
    """Anticlockwise corners round their centre, and without copies exactly one planet."""
    mesh = WHOLE[name]
    assert mesh.corners is not None
    lon, lat = mesh.corners
    area = polygon_area(lon, lat)
    repeats = np.zeros(area.shape, dtype=bool) if mesh.repeats is None else mesh.repeats
    assert area.min() > 0.0
    assert area[~repeats].sum() == pytest.approx(SPHERE, rel=1e-12)
    for corner in range(4):
        pair = [corner, (corner + 1) % 4]
        wedge = polygon_area(*(np.concatenate([centre[..., None], sides[..., pair]], axis=-1)
                               for centre, sides in ((mesh.longitude, lon), (mesh.latitude, lat))))
        assert wedge.min() >= -1e-3, corner


@pytest.mark.parametrize("name", [name for name in WHOLE if name.startswith("tripolar")])
def test_copies_repeat_a_cell_that_counts(name: str) -> None:
    mesh = WHOLE[name]
    assert mesh.repeats is not None
    near = [(round(lon, 8) % 360.0, round(lat, 8)) for lon, lat in places(mesh)]
    repeats = mesh.repeats.ravel()
    once = Counter(place for place, copy in zip(near, repeats, strict=True) if not copy)
    assert set(once.values()) == {1}
    assert all(place in once for place, copy in zip(near, repeats, strict=True) if copy)
    assert repeats.sum() == (50 + 2 * 24 if "edge" in name else 48 + 24)


def test_fold_joins_the_two_halves_of_the_top_row() -> None:
    """Upper sides of mirrored cells are the same; the ends of the fold are the grid poles."""
    mesh = planes.tripolar(halo=False)
    assert mesh.corners is not None
    lon, lat = (part[-2] for part in mesh.corners)
    np.testing.assert_allclose(lat[:, 2], lat[::-1, 3], atol=1e-9)
    place = np.cos(np.radians(lat)) * np.exp(1j * np.radians(lon))
    np.testing.assert_allclose(place[:, 2], place[::-1, 3], atol=1e-9)
    assert lat[0, 3] == pytest.approx(planes.CAP)
    assert lon[0, 3] == pytest.approx(planes.FOLD_LONGITUDE)
    assert lat[23, 2] == pytest.approx(planes.CAP)
    assert lat[:24, 2].max() == pytest.approx(90.0)


@pytest.mark.parametrize("name", ["tripolar edge at sea", "tripolar centre at sea"])
def test_southern_fold_crosses_water(name: str) -> None:
    """Copies of cells with water, so that a sum that counts them twice is wrong; the first row is the fold's."""
    mesh = WHOLE[name]
    assert mesh.repeats is not None
    assert mesh.repeats[0].all()
    wet = sea_floor_depth(mesh.longitude, mesh.latitude) > 0.0
    assert (wet & mesh.repeats)[:2].sum() > 30
    assert mesh.latitude[0].max() < -60.0
    assert np.all(np.diff(mesh.latitude[6:, 1]) == 7.5)


def test_map_between_poles_by_hand() -> None:
    """Half way between the poles on the parallel and on the fold, and a third of the way along the parallel."""
    lon, lat = planes.between_poles(np.array([90.0, 90.0, 30.0]), np.array([90.0, 180.0, 90.0]), 0.0)
    assert (lon[0], lat[0]) == pytest.approx((90.0, 60.0))
    assert lat[1] == pytest.approx(90.0)
    assert (lon[2], lat[2]) == pytest.approx((30.0, 60.0))


def test_longitudes_are_written_where_asked() -> None:
    written = planes.tripolar().variables["longitude"].values
    assert -280.0 <= written.min() < -180.0
    assert written.max() < 80.0
    np.testing.assert_allclose(eastward(written), planes.tripolar().longitude, atol=1e-9)
    beside = planes.tripolar().variables["longitude_vertices"].values - written[..., None]
    assert np.abs(beside).max() <= 180.0


def test_rotated_mesh_agrees_with_a_map_library() -> None:
    mesh = planes.rotated()
    pole_lon, pole_lat = planes.ROTATED_POLE
    x, y = np.meshgrid(mesh.variables["rlon"].values, mesh.variables["rlat"].values)
    rotation = ccrs.RotatedPole(pole_longitude=pole_lon, pole_latitude=pole_lat)
    expected = ccrs.PlateCarree().transform_points(rotation, x, y)
    np.testing.assert_allclose(mesh.latitude, expected[..., 1], atol=1e-9)
    np.testing.assert_allclose(np.exp(1j * np.radians(mesh.longitude - expected[..., 0])), 1.0, atol=1e-7)


@pytest.mark.parametrize("how", ["masked", "zero"])
def test_land_coordinates_go(how: str) -> None:
    mesh = planes.tripolar()
    land = sea_floor_depth(mesh.longitude, mesh.latitude) <= 0.0
    bare = planes.without_land_coordinates(mesh, land, how)  # type: ignore[arg-type]
    blank = {"masked": 1e20, "zero": 0.0}[how]
    for name in ("latitude", "longitude", "longitude_vertices"):
        assert np.all(bare.variables[name].values[land] == blank)
        np.testing.assert_array_equal(bare.variables[name].values[~land], mesh.variables[name].values[~land])
        assert ("_FillValue" in bare.variables[name].attrs) == (how == "masked")


@pytest.mark.parametrize("web", [unstructured.triangle_web(), unstructured.polygon_web()], ids=["triangles", "polygons"])
def test_webs_have_no_gap(web: unstructured.Web) -> None:
    """Every side belongs to one face or to two that run along it in opposite directions; all faces are anticlockwise."""
    sides = Counter(
        (face[n], face[(n + 1) % len(face)])
        for face in ([int(node) for node in row if node >= 0] for row in web.faces) for n in range(len(face))
        if face[n] != face[(n + 1) % len(face)]
    )
    assert max(sides.values()) == 1
    # A side that was cut on one face only would leave its long form on the other, with corners of the mesh upon it.
    assert np.all(polygon_area(*web.corners()) > 0.0)
    inner = sum((end, start) in sides for start, end in sides)
    assert inner > 0.8 * len(sides)


def test_polygons_have_the_corners_of_their_neighbours() -> None:
    """Wide cells beside narrow ones have more than four corners; their area is that of the cells they were merged from."""
    web = unstructured.polygon_web()
    corners = np.sum(web.faces >= 0, axis=1)
    assert corners.min() == 4
    assert corners.max() > 4
    near = np.abs(web.face_lat) < 50.0
    assert np.all(corners[near] == 4)
    assert len(set(np.round(np.diff(web.face_lon[near]), 6))) > 2


@pytest.mark.parametrize("start", [0, 1])
@pytest.mark.parametrize("make", [unstructured.triangles, unstructured.polygons])
def test_connectivity_counts_from_its_start(make: object, start: int) -> None:
    mesh = make(start)  # type: ignore[operator]
    table = mesh.variables["face_nodes"]
    numbers = table.values[table.values != -999]
    assert (numbers.min(), numbers.max()) == (start, mesh.variables["node_lon"].size - 1 + start)
    assert table.attrs["start_index"] == start


def test_radians_are_radians() -> None:
    plain, turned = unstructured.bounded_cells(), unstructured.bounded_cells("radians")
    np.testing.assert_allclose(np.degrees(turned.variables["lat"].values), plain.variables["lat"].values, rtol=1e-15)
    assert np.abs(turned.variables["lon_vertices"].values).max() < 7.0
    assert turned.variables["lat"].attrs["units"] == "radian"
