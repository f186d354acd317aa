"""Outlines of cells: no overlap, no gap, the right owner, whatever the longitudes."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import shapely
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.axes import Axes
from gridcarb.figures.cells import Grid, grid_of, outlines
from gridcarb.figures.mesh import mesh


def rectilinear(lon: npt.NDArray[np.float64], lat: npt.NDArray[np.float64]) -> Grid:
    ds = xr.Dataset(coords={"lat": ("lat", lat, {}), "lon": ("lon", lon, {})})
    return grid_of(ds, Axes(None, None, ("lat", "lon"), None, None, "lat", "lon"))


@st.composite
def whole_turns(draw: st.DrawFn) -> npt.NDArray[np.float64]:
    """Longitudes of a global grid: from anywhere, either way round, with or without a jump at 360."""
    count = draw(st.integers(4, 200))
    lon = draw(st.floats(-720, 720)) + np.arange(count) * 360 / count
    if draw(st.booleans()):
        lon = np.roll(lon % 360, draw(st.integers(0, 199)))
    return lon[::-1] if draw(st.booleans()) else lon


@settings(deadline=None)  # the first call loads libraries
@given(lon=whole_turns(), centre=st.floats(-180, 180))
def test_a_global_grid_covers_the_turn_once_with_the_right_columns(lon: npt.NDArray[np.float64], centre: float) -> None:
    count = lon.size
    net = mesh(rectilinear(lon, np.array([-45.0, 45.0])), centre)
    assert np.all(np.diff(net.x_edges) > 0)
    assert np.allclose(net.x_edges[[0, -1]], [-180, 180], atol=2e-3)
    assert np.all(net.x_cells >= 0)
    middles = (net.x_edges[1:] + net.x_edges[:-1]) / 2
    apart = np.abs((middles + centre - lon[net.x_cells] + 180) % 360 - 180)
    assert apart.max() <= 180 / count + 2e-3
    assert np.diff(net.x_edges).max() <= 1 + 2e-3


@settings(deadline=None)  # the first call loads libraries
@given(west=st.floats(-360, 360), width=st.floats(5, 200), count=st.integers(4, 40))
def test_a_region_knows_its_extent(west: float, width: float, count: int) -> None:
    edges = west + np.linspace(0, width, count + 1)
    grid = rectilinear((edges[1:] + edges[:-1]) / 2, np.array([10.0, 20.0, 30.0]))
    found = grid.extent()
    assert abs((found[0] - west + 180) % 360 - 180) < 1e-4
    assert np.isclose(found[1] - found[0], width, atol=1e-4)
    assert found[2:] == (5.0, 35.0)
    assert grid.holds(west + width * 0.4, west + width * 0.5, 11, 12)
    assert not grid.holds(west + width + 5, west + width + 10, 11, 12)
    assert not grid.holds(west, west + width, 40, 50)


def test_gaps_between_bounds_stay_gaps() -> None:
    grid = Grid(np.array([[0.0, 10.0], [20.0, 30.0]]), np.array([[0.0, 1.0]]), rectilinear=True)
    net = mesh(grid, 0.0)
    assert net.spread(np.array([[7.0, 8.0]]), 0.0)[0].tolist() == [7.0] * 10 + [0.0] + [8.0] * 10


def test_cells_reach_the_pole_and_not_beyond() -> None:
    grid = rectilinear(np.arange(0.0, 360, 90), np.arange(-90.0, 91, 45))
    assert (grid.latitudes.min(), grid.latitudes.max()) == (-90, 90)


def test_coordinates_in_radians() -> None:
    lon, lat = np.radians([0.0, 90.0, 180.0, 270.0]), np.radians([-45.0, 45.0])
    ds = xr.Dataset(coords={
        "lat": ("lat", lat, {"units": "radian", "standard_name": "latitude"}),
        "lon": ("lon", lon, {"units": "radian", "standard_name": "longitude"}),
    })
    grid = grid_of(ds, Axes(None, None, ("lat", "lon"), None, None, "lat", "lon"))
    assert np.allclose(grid.latitudes, [[-90, 0], [0, 90]])


@settings(deadline=None)  # the first call loads libraries
@given(centre=st.floats(-180, 180), tilt=st.floats(1, 80))
def test_a_tilted_grid_covers_the_globe_once(centre: float, tilt: float) -> None:
    """A grid whose own poles are moved: cells cross the outer meridian and hold the true poles (inside)."""
    lon, lat = np.radians(np.meshgrid(7.3 + np.linspace(0, 360, 25), np.linspace(-90, 90, 13)))
    x, y, z = np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)
    turn = np.radians(tilt)
    x, z = x * np.cos(turn) + z * np.sin(turn), z * np.cos(turn) - x * np.sin(turn)
    nodes = np.degrees(np.arctan2(y, x)), np.degrees(np.arcsin(np.clip(z, -1, 1)))
    corners = [np.stack([n[:-1, :-1], n[:-1, 1:], n[1:, 1:], n[1:, :-1]], axis=-1).reshape(-1, 4) for n in nodes]
    found = outlines(Grid(corners[0], corners[1], rectilinear=False, cells=np.arange(24 * 12)), centre, uncut=False)
    total = shapely.polygons([*found.quads]).tolist() + [shapely.Polygon(ring) for ring in found.rings]
    total = sum(piece.area for piece in total)
    assert np.isclose(total, 360 * 180, rtol=0.02)  # sides are straight in longitude and latitude here
    assert max(np.abs(ring[:, 0]).max() for ring in (*found.quads, *found.rings)) <= 180
    assert {*found.owners, *found.ring_owners} == set(range(24 * 12))


def test_corners_are_derived_for_curved_grids_across_the_date_line() -> None:
    lon, lat = np.meshgrid([170.0, 178.0, -174.0], [0.0, 8.0, 16.0])
    ds = xr.Dataset(coords={
        "lat": (("y", "x"), lat, {"standard_name": "latitude"}), "lon": (("y", "x"), lon, {"standard_name": "longitude"}),
    })
    grid = grid_of(ds, Axes(None, None, ("y", "x"), None, None, "lat", "lon"))
    middle = grid.longitudes[4] % 360, grid.latitudes[4]
    assert np.allclose(middle[0], [174, 182, 182, 174], atol=0.05)
    assert np.allclose(middle[1], [4, 4, 12, 12], atol=0.1)
