"""Vertical coordinates: what the file says gives the depth of the truth, checked by hand and with another reader."""

from __future__ import annotations

import math

import cf_xarray  # noqa: F401
import gsw
import numpy as np
import pytest
import xarray as xr

from synthetic_grids import parametric, plain_meshes, times, uprights
from synthetic_grids.landmarks import DEPTHS, LATITUDES, LONGITUDES, landmarks
from synthetic_grids.scene import Mesh, Upright, stage

MESH = plain_meshes.raster(latitudes=LATITUDES[3:21], longitudes=LONGITUDES[::2])
TIMES = times.monthly()
DEEP = max(
    (place for place in landmarks() if place[0] in MESH.longitude),
    key=lambda place: np.sin(np.radians(place[0])) * np.cos(np.radians(place[1])),
)
"""The landmark at which the sea surface moves most."""


def at(upright: Upright, lon: float, lat: float) -> xr.DataArray:
    row, column = (int(np.argmax(axis == value)) for axis, value in
                   ((MESH.latitude[:, 0], lat), (MESH.longitude[0], lon)))
    return upright.depth.isel(lat=row, lon=column)


@pytest.mark.parametrize(("how", "metres"), [
    ({}, 1.0), ({"unit": "cm"}, 0.01), ({"unit": "km"}, 1000.0), ({"height": True}, -1.0), ({"from_bottom": True}, 1.0),
    ({"height": True, "from_bottom": True, "unit": "cm"}, -0.01),
])
def test_levels_come_back_in_metres(how: dict[str, object], metres: float) -> None:
    upright = uprights.levels(**how)  # type: ignore[arg-type]
    written = upright.variables["lev"]
    np.testing.assert_array_equal(metres * written.values if abs(metres) >= 1.0 else written.values / (1.0 / metres),
                                  upright.depth.values)
    assert (upright.depth.values[0] == 4500.0) == ("from_bottom" in how)
    assert written.attrs["positive"] == ("up" if metres < 0.0 else "down")
    assert upright.bounds is not None
    np.testing.assert_array_equal(upright.bounds.mean("bnds"), upright.depth)
    np.testing.assert_allclose(upright.variables["lev_bnds"].values * metres, upright.bounds.values)


def test_levels_may_say_nothing() -> None:
    bare = uprights.levels(height=True, says_positive=False, named=False, bounds=False)
    assert set(bare.variables["lev"].attrs) == {"long_name", "units", "axis"}
    assert list(bare.variables) == ["lev"]


def test_pressure_stands_for_depth() -> None:
    """800 dbar lie at 791 to 795 m; a column of depths has the pressures of the standard to the last bit."""
    by_pressure = uprights.pressure_levels(MESH)
    depth = by_pressure.depth.isel(pressure=5)
    assert 790.0 < depth.min() < depth.max() < 796.0
    column = plain_meshes.single_column()
    written = uprights.pressure_of_depths(column).variables["level"]
    np.testing.assert_array_equal(written.values, gsw.p_from_z(-uprights.MIDDLES, column.latitude))
    field = uprights.pressure_of_depths(MESH).variables["pressure"]
    assert field.dims == ("level", "lat", "lon")


@pytest.mark.parametrize("name", parametric.PARAMETRIC)
def test_layers_lie_in_the_water_in_order(name: str) -> None:
    depth = parametric.PARAMETRIC[name](MESH, TIMES).depth
    wet = stage(MESH, Upright(depth, {}), TIMES).truth["salinity"].notnull()
    assert wet.any()
    assert float(depth.min()) > 0.0
    assert bool((depth.diff("layer").fillna(1.0) > 0.0).all())
    if name != "ocean_sigma_z":
        assert bool((wet.any("time") == depth.notnull().broadcast_like(wet).any("time")).all())


@pytest.mark.parametrize("name", parametric.PARAMETRIC)
def test_landmarks_are_met_exactly(name: str) -> None:
    depth = at(parametric.PARAMETRIC[name](MESH, TIMES), *DEEP)
    first = depth.isel(time=0) if "time" in depth.dims else depth
    assert tuple(first.values[:6]) == DEPTHS
    if "time" in depth.dims:
        assert float(np.abs(depth.isel(time=2) - first).max()) > 0.1


# cf_xarray 0.11 departs from the conventions in ocean_s (a factor tanh(a / 2) for its inverse), in ocean_s_g1 (s for S in
# the part of the sea surface) and in ocean_double_sigma (k_c against the values of the coordinate): these by hand below.
@pytest.mark.parametrize("name", ["ocean_sigma", "ocean_sigma_still", "ocean_s_g2", "ocean_sigma_z"])
def test_another_reader_finds_the_same_depths(name: str) -> None:
    """What cf_xarray makes of the formula terms, on the whole map and at all times."""
    upright = parametric.PARAMETRIC[name](MESH, TIMES)
    file = xr.Dataset({**upright.variables, **TIMES.variables}).set_coords("layer")
    for key in ("surface", "floor", "sigma", "heights"):
        if key in file:
            file[key] = file[key].where(file[key] != 1e20)
    if name == "ocean_sigma_z":  # a term that older conventions asked for
        file["layer"].attrs["formula_terms"] += " nsigma: critical"
    file.cf.decode_vertical_coords(outnames={"layer": "found"})
    difference = (file["found"] + upright.depth).transpose("layer", "lat", "lon", ...)
    assert float(np.abs(difference).max()) < 1e-9
    assert int(difference.notnull().sum()) > 1000


def test_stretched_s_by_hand() -> None:
    """The published curve runs from 0 to -1; the formula for one cell, a month with a moved surface."""
    a, b = parametric.STRETCHING
    assert parametric._stretched(np.array([0.0, -1.0])).tolist() == pytest.approx([0.0, -1.0])
    upright = parametric.stretched(MESH, TIMES)
    s = float(upright.variables["layer"].values[3])
    curve = (1 - b) * math.sinh(a * s) / math.sinh(a) + b * (math.tanh(a * (s + 0.5)) / (2 * math.tanh(0.5 * a)) - 0.5)
    lon, lat = DEEP
    wave = round(8.0 * math.sin(math.radians(lon)) * math.cos(math.radians(lat))) / 8.0
    z = 2.0 * wave * (1.0 + s) + 16.0 * s + (1024.0 - 16.0) * curve
    assert float(at(upright, lon, lat).isel(time=2, layer=3)) == pytest.approx(-z, rel=1e-12)
    assert float(at(upright, lon, lat).isel(time=0, layer=3)) == 150.0


def test_first_generic_s_by_hand() -> None:
    """S = 512 s + (floor - 512) C, z = S + eta (1 + S / floor), over the shelf where s and C differ in their weight."""
    flat = Mesh((), np.asarray(27.0), np.asarray(43.0), {})
    upright = parametric.generic(1, flat, TIMES)
    s, curve = upright.variables["layer"].values[2], upright.variables["curve"].values[2]
    assert (s, curve) == (-75.0 / 1024.0 - 2.0**-9, -75.0 / 1024.0 + 2.0**-9)
    whole = 512.0 * s + (73.0 - 512.0) * curve
    eta = 2.0 * round(8.0 * math.sin(math.radians(27.0)) * math.cos(math.radians(43.0))) / 8.0 * 73.0 / 1024.0
    assert eta > 0.05
    assert float(upright.depth.isel(layer=2, time=2)) == pytest.approx(-(whole + eta * (1.0 + whole / 73.0)), rel=1e-14)


def test_double_sigma_by_hand() -> None:
    """Over 1024 m the parting lies at 512 m; sigma 0.78125 is 400 m, 1.5625 is 800 m. Over 73 m it is at 16 m."""
    upright = parametric.double_sigma(MESH, TIMES)
    sigma = upright.variables["layer"].values
    assert sigma[4:6].tolist() == [0.78125, 1.5625]
    assert at(upright, *DEEP).values[4:6].tolist() == [400.0, 800.0]
    flat = Mesh((), np.asarray(27.0), np.asarray(43.0), {})
    floor = float(parametric.model(flat, TIMES).floor)
    assert floor == 73.0
    found = parametric.double_sigma(flat, TIMES).depth.values
    np.testing.assert_allclose(found[:5], 16.0 * sigma[:5])
    np.testing.assert_allclose(found[5:], 16.0 + (sigma[5:] - 1.0) * (floor - 16.0))


def test_sea_surface_moves_the_layers_of_sigma() -> None:
    """eta + sigma (floor + eta) with eta = month round(8 sin(lon) cos(lat)) / 8 over 1024 m."""
    lon, lat = DEEP
    wave = round(8.0 * np.sin(np.radians(lon)) * np.cos(np.radians(lat))) / 8.0
    found = at(parametric.sigma(MESH, TIMES), lon, lat).isel(time=2)
    expected = [depth - 2.0 * wave * (1.0 - depth / 1024.0) for depth in DEPTHS]
    assert found.values[:6].tolist() == pytest.approx(expected, rel=1e-14)
