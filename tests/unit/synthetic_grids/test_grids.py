"""Axes, areas, and the truth on grids of any kind."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from synthetic_grids import grids
from synthetic_grids.ocean import TRACERS
from synthetic_grids.sphere import RADIUS_KM

EDGES = (0.0, 10.0, 60.0, 400.0, 3000.0, 6000.0)


@pytest.fixture(scope="module")
def grid() -> xr.Dataset:
    return grids.rectilinear(18, 36)


@pytest.fixture(scope="module")
def truth(grid: xr.Dataset) -> xr.Dataset:
    time = grids.months(2010, 2010, "noleap")
    return grids.sample(grid["lon"], grid["lat"], grids.levels(EDGES)["lev"], time["year"].isel(time=[0, 6]))


def test_axes_lie_in_the_middle_of_their_bounds(grid: xr.Dataset) -> None:
    depth = grids.levels(EDGES)
    for axis, source in (("lat", grid), ("lon", grid), ("lev", depth)):
        np.testing.assert_allclose(source[f"{axis}_bnds"].mean("bnds"), source[axis])
    np.testing.assert_array_equal(depth["lev_bnds"].values[1:, 0], depth["lev_bnds"].values[:-1, 1])
    assert grids.rectilinear(2, 4, west=-180.0)["lon"].values.tolist() == [-135.0, -45.0, 45.0, 135.0]


@pytest.mark.parametrize(("calendar", "days"), [("noleap", (365, 365)), ("360_day", (360, 360)), ("standard", (365, 366))])
def test_months_follow_their_calendar(calendar: str, days: tuple[int, int]) -> None:
    time = grids.months(2011, 2012, calendar)
    assert time.sizes["time"] == 24
    assert time["time_bnds"].values[-1, 1] == sum(days)
    february = time["time_bnds"].values[13]
    assert february[1] - february[0] == {"noleap": 28, "360_day": 30, "standard": 29}[calendar]
    assert np.all(np.diff(time["year"]) > 0.07)
    january = (31 if calendar != "360_day" else 30) / 2.0 / days[1]
    assert time["year"].values[12] == pytest.approx(2012.0 + january)


def test_cells_add_up_to_the_sphere(grid: xr.Dataset) -> None:
    assert float(grids.cell_area(grid).sum()) == pytest.approx(4.0 * np.pi * (1e3 * RADIUS_KM) ** 2, rel=1e-12)


def test_water_ends_at_the_coast_and_at_the_floor(grid: xr.Dataset, truth: xr.Dataset) -> None:
    floor = grids.sea_floor(grid["lon"], grid["lat"])
    wet = truth["dic"].notnull().isel(time=0)
    assert truth["dic"].dims == ("time", "lev", "lat", "lon")
    assert bool((wet == (wet["lev"] < floor.fillna(0.0))).all())
    assert 0.55 < float(wet.isel(lev=0).mean()) < 0.8
    for key in TRACERS:
        assert bool((truth[key].notnull() == wet).all()), key


def test_any_kind_of_grid_has_the_same_values(grid: xr.Dataset, truth: xr.Dataset) -> None:
    """A list of cells, 2-D coordinates, and depths that change from place to place, to the last bit."""
    years = grids.months(2010, 2010, "noleap")["year"].sel(time=truth["time"])
    lat, lon = xr.broadcast(grid["lat"], grid["lon"])
    flat_lon, flat_lat = (xr.DataArray(field.values.ravel(), dims="cell") for field in (lon, lat))
    level = truth["lev"].isel(lev=2)
    cells = grids.sample(flat_lon, flat_lat, level.drop_vars("lev"), years)
    plane = grids.sample(xr.DataArray(lon.values, dims=("y", "x")), xr.DataArray(lat.values, dims=("y", "x")), level, years)
    sloping = grids.sample(flat_lon, flat_lat, xr.DataArray(np.linspace(5.0, 500.0, flat_lon.size), dims="cell"), years)
    for key in TRACERS:
        expected = truth[key].isel(lev=2).values
        np.testing.assert_array_equal(cells[key].values.reshape(expected.shape), expected)
        np.testing.assert_array_equal(plane[key].values, expected)
        assert sloping[key].dims == ("time", "cell")


def test_a_depth_field_may_move_with_time() -> None:
    """Layers that follow a moving surface: dims time, layer, cell; each value is that of its own depth."""
    place = (xr.DataArray([100.0, 265.0], dims="cell"), xr.DataArray([10.0, 30.0], dims="cell"))
    year = xr.DataArray([2010.2, 2010.7], dims="time")
    depth = xr.DataArray(np.arange(8.0).reshape(2, 2, 2) * 40.0 + 5.0, dims=("layer", "cell", "time"))
    moved = grids.sample(*place, depth, year)
    assert moved["temperature"].dims == ("time", "layer", "cell")
    here = (place[0].isel(cell=1), place[1].isel(cell=1))
    alone = grids.sample(*here, depth.isel(cell=1, layer=1, time=0), year.isel(time=0))
    assert float(moved["temperature"].isel(time=0, layer=1, cell=1)) == float(alone["temperature"])
