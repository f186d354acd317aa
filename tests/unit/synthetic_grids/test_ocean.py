"""The formulas: values worked out by hand, and the features the invented ocean must have."""

from __future__ import annotations

import gsw
import numpy as np
import pytest

from synthetic_grids import carbon, geography, water
from synthetic_grids.ocean import TRACERS, state
from synthetic_grids.place import places
from synthetic_grids.sphere import RADIUS_KM, distance, point, ripples, warp

LORRIN, VASHT, HALVREN = (130.0, 20.0), (265.0, 30.0), (110.0, -77.0)
GRAMS_PER_PRACTICAL = 35.16504 / 35.0


@pytest.fixture(scope="module")
def september() -> dict[str, np.ndarray]:
    """A global 6 degree ocean at 41 depths in September 2010, NaN on land and below the floor, and where its cells are."""
    lon, lat = np.meshgrid(np.arange(3.0, 360.0, 6.0), np.arange(-87.0, 90.0, 6.0))
    depth = np.concatenate([np.arange(5.0, 300.0, 15.0), np.arange(350.0, 5500.0, 250.0)])[:, None, None]
    wet = depth < geography.sea_floor_depth(lon, lat)
    found = {key: np.where(wet, values, np.nan) for key, values in state(lon, lat, depth, 2010.7).items()}
    here = places(lon, lat)
    return {**found, "lat": lat, "depth": depth, "old": here.old, "river": here.river, "wet": wet}


def test_deep_cell_by_hand() -> None:
    """272 E on the equator, 4000 m: the climate latitude is 0, old 1, and no summer, bloom or lift is felt.

    n = (1 + tanh(-5/30)) / 2 = 0.41743; age = 0.72 + 0.28 n = 0.83688.
    T  = 1.7 - 0.5 age + 3.3 exp(-4000/1300) + 0.304 + 0.064 = 1.28156 + 0.15214 + 0.368 = 1.8017
    S  = 34.88 - 0.18 age - 0.30 (5.3333 exp(-4.3333)) = 34.72936 - 0.02100 = 34.7084
    A  = 66 S + (22 + 83.688) (1 - exp(-2.5)) = 2290.75 + 97.01 = 2387.77
    P  = 1.05 + 1.5 age + (0.15 + 0.4 age) (4.4444 exp(-3.4444)) = 2.30532 + 0.48475 * 0.14187 = 2.3741
    Si = 133.305 - (133.305 - 4.689) exp(-4000/1100) = 129.92
    C  = 2130 + 155 age + (10 + 45 age) (4.7059 exp(-3.7059)) = 2259.716 + 47.660 * 0.11567 = 2265.23
    """
    cell = state(272.0, 0.0, 4000.0, 2010.0)
    assert cell["temperature"] == pytest.approx(1.8017, abs=2e-4)
    assert cell["salinity"] == pytest.approx(34.7084, abs=2e-4)
    assert cell["alkalinity"] == pytest.approx(2387.77, abs=0.02)
    assert cell["phosphate"] == pytest.approx(2.3741, abs=2e-4)
    assert cell["silicate"] == pytest.approx(129.92, abs=0.02)
    assert cell["dic"] == pytest.approx(2265.23, abs=0.02)


def test_river_mouth_by_hand() -> None:
    """At the mouth six sevenths are river water: S is a seventh of the sea's, A = A_sea / 7 + 1150 * 6/7."""
    mouth = places(*geography.OSHEL_MOUTH)
    sea = water.sea_salinity(mouth, 0.0, 2010.0)
    cell = state(*geography.OSHEL_MOUTH, 0.0, 2010.0)
    assert cell["salinity"] == pytest.approx(float(sea) / 7.0, rel=1e-12)
    assert cell["salinity"] == pytest.approx(4.9, abs=0.15)
    alkaline = 66.0 * float(sea) + float(carbon.polar_excess(mouth))
    assert cell["alkalinity"] == pytest.approx(alkaline / 7.0 + 985.714, abs=0.01)


def test_winter_by_hand() -> None:
    """45 N is in deepest winter 0.17 of a year after New Year, in high summer half a year later; the equator never."""
    north, line = places(80.0, 45.0), places(80.0, 0.0)
    reach = np.tanh(4.5)
    assert water.winter(north, 2010.17) == pytest.approx((1.0 + reach) / 2.0)
    assert water.winter(north, 2010.67) == pytest.approx((1.0 - reach) / 2.0)
    assert water.winter(line, 2010.4) == pytest.approx(0.5)
    assert water.winter(places(80.0, -45.0), 2010.67) == pytest.approx((1.0 + reach) / 2.0)


def test_carbon_rise_by_hand() -> None:
    """On the equator W = 29.8 - 1.85 - 1.1 (1 + p) bell(0, 6, 14); between 1980 and 2030 the carbon grows by a factor e."""
    tropics = places(180.0, 0.0)  # p = 0, and 1.1 exp(-(6/14)^2) = 0.91544
    warm = 29.8 - 1.85 - 0.91544
    origin = water.origin_depth(tropics, 0.0, 2000.0)
    then = carbon.added_carbon(tropics, 0.0, 2000.0)
    assert then == pytest.approx((40.0 + 0.75 * warm) * np.exp(-origin / (tropics.bowl + 120.0)), rel=1e-3)
    ratio = carbon.added_carbon(tropics, 0.0, 2030.0) / carbon.added_carbon(tropics, 0.0, 1980.0)
    assert ratio == pytest.approx(np.e, rel=1e-12)


def test_one_point_equals_the_grid_to_the_last_bit() -> None:
    lon, lat = np.meshgrid(np.arange(1.5, 360.0, 9.0), np.arange(-88.5, 90.0, 9.0))
    grid = state(lon, lat, np.array([5.0, 80.0, 900.0])[:, None, None], np.array([2010.1, 2031.6])[:, None, None, None])
    for row, column in ((0, 0), (7, 3), (12, 31), (19, 39)):
        alone = state(lon[row, column], lat[row, column], 80.0, 2031.6)
        for key in TRACERS:
            assert alone[key] == grid[key][1, 1, row, column], key


def test_planet_is_whole_at_the_date_line_and_the_poles() -> None:
    lat = np.linspace(-90.0, 90.0, 37)
    west, east = (geography.coast_distance(point(lon, lat)) for lon in (0.0, 360.0))
    np.testing.assert_allclose(west, east, atol=1e-6)
    at_pole = geography.sea_floor_depth(np.arange(0.0, 360.0, 30.0), -90.0)
    assert np.ptp(at_pole) < 1e-6 * at_pole[0]


def test_ripples_have_unit_spread_and_warping_stays_on_the_sphere() -> None:
    index = np.arange(20000)
    everywhere = point(index * 137.50776405, np.degrees(np.arcsin(1.0 - (2.0 * index + 1.0) / index.size)))
    assert np.std(ripples(everywhere, 11, 8, 9.0)) == pytest.approx(1.0, abs=0.15)
    moved = warp(everywhere, 11, 6, 3.1, 0.05)
    np.testing.assert_allclose(moved.x**2 + moved.y**2 + moved.z**2, 1.0, atol=1e-12)
    assert distance(point(10.0, 0.0), point(100.0, 0.0)) == pytest.approx(RADIUS_KM * np.pi / 2.0)


def test_sea_covers_what_a_global_grid_must_have() -> None:
    """Within 1 % of 3.6e14 m2, which global area checks expect."""
    lon, lat = np.meshgrid(np.arange(0.5, 360.0, 2.0), np.arange(-89.5, 90.0, 1.0))
    weight = np.cos(np.radians(lat))
    share = np.sum(weight * ~geography.is_land(lon, lat)) / np.sum(weight)
    assert share * 4.0 * np.pi * (1e3 * RADIUS_KM) ** 2 == pytest.approx(3.6e14, rel=0.01)


def test_sea_floor_has_shelf_slope_ridge_and_trench() -> None:
    lon, lat = np.meshgrid(np.arange(0.25, 360.0, 0.5), np.arange(-89.75, 90.0, 0.5))
    coast, depth = geography.coast_distance(point(lon, lat)), geography.sea_floor_depth(lon, lat)
    assert np.all((depth == 0.0) == (coast <= 0.0))
    assert depth[coast > 0.0].min() >= 25.0
    assert np.median(depth[(coast > 0.0) & (coast < 30.0)]) < 200.0
    trench = (lon > 185.0) & (lon < 235.0) & (np.abs(lat) < 50.0)
    assert 7500.0 < depth[trench].max() < 9500.0
    assert depth[~trench].max() < 7000.0
    crest = geography.sea_floor_depth(np.array([296.0, 250.0]), np.array([12.0, 30.0]))
    assert crest[1] - crest[0] > 1000.0


def test_ranges_of_the_open_ocean(september: dict[str, np.ndarray]) -> None:
    salt = september["salinity"][september["wet"] & (september["river"] < 0.001)]
    assert -1.9 < np.nanmin(september["temperature"]) < -1.2
    assert 28.0 < np.nanmax(september["temperature"]) < 31.0
    assert salt.min() > 32.5
    assert 36.0 < salt.max() < 37.0
    deep = (september["depth"] > 1500.0) & september["wet"]
    young, old = deep & (september["old"] < 0.1), deep & (september["old"] > 0.9)
    assert 2130.0 < september["dic"][young].min() < np.median(september["dic"][young]) < 2185.0
    assert 2290.0 < september["dic"][old].max() < 2340.0
    assert 2300.0 < september["alkalinity"][deep].min() < september["alkalinity"][deep].max() < 2420.0
    assert np.nanmin(september["phosphate"]) > 0.0
    assert np.nanmin(september["silicate"]) > 0.0


def test_water_is_stably_layered(september: dict[str, np.ndarray]) -> None:
    """Density grows downward, compared at the pressure between two depths: no inversion above 0.01 kg m-3."""
    absolute = GRAMS_PER_PRACTICAL * september["salinity"]
    pressure = gsw.p_from_z(-september["depth"], september["lat"])
    conservative = gsw.CT_from_t(absolute, september["temperature"], pressure)
    between = (pressure[1:] + pressure[:-1]) / 2.0
    step = gsw.rho(absolute[1:], conservative[1:], between) - gsw.rho(absolute[:-1], conservative[:-1], between)
    known = step[np.isfinite(step)]
    assert known.min() > -0.01
    assert np.mean(known < -0.002) < 0.01


def test_old_basin_is_rich_and_young_basin_is_not() -> None:
    young, old = state(*LORRIN, 1000.0, 2010.0), state(*VASHT, 1000.0, 2010.0)
    assert old["dic"] - young["dic"] > 100.0
    assert old["phosphate"] > 1.8 * young["phosphate"]
    assert old["silicate"] > 3.0 * young["silicate"]


def test_polar_sea_mixes_deep_in_winter() -> None:
    assert water.mixed_layer_depth(places(*HALVREN), 2010.67) > 800.0
    assert water.mixed_layer_depth(places(*HALVREN), 2010.17) < 60.0


def test_upwelling_coast_is_cold_and_rich() -> None:
    coast, offshore = (state(lon, 25.5, np.array([5.0, 115.0]), 2010.6) for lon in (331.5, 310.5))
    assert np.all(coast["temperature"] < offshore["temperature"] - 4.0)
    assert np.all(coast["dic"] > offshore["dic"] + 70.0)


def test_season_warms_and_draws_carbon_down() -> None:
    """Mid-latitude surface: 3 to 10 K of annual range, less carbon in summer, seasons opposite across the equator."""
    year = 2010.0 + np.arange(12) / 12.0
    for lat, coldest in ((47.0, 2), (-47.0, 8)):
        surface = state(80.0, lat, 5.0, year)
        assert 3.0 < np.ptp(surface["temperature"]) < 10.0
        assert np.argmin(surface["temperature"]) == coldest
        assert np.argmax(surface["dic"]) == coldest
        assert 10.0 < np.ptp(surface["dic"]) < 80.0


def test_carbon_rises_most_at_the_surface_and_deepest_where_water_is_young() -> None:
    """About 1 umol/kg a year at the surface; at 1500 m the polar sea has taken up some, the old ocean hardly any."""
    def rise(place: tuple[float, float], depth: float) -> float:
        return float(state(*place, depth, 2015.0)["dic"] - state(*place, depth, 1985.0)["dic"]) / 30.0

    assert 0.7 < rise(LORRIN, 5.0) < 1.6
    assert rise(VASHT, 1500.0) < 0.1
    assert rise(HALVREN, 1500.0) > 0.2
