"""Laws that hold at every place, depth and time."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from synthetic_grids import carbon, geography, water
from synthetic_grids.ocean import state
from synthetic_grids.place import places
from synthetic_grids.sphere import point

LONGITUDE = st.floats(-180.0, 360.0)
LATITUDE = st.floats(-90.0, 90.0)
YEAR = st.floats(1950.0, 2050.0)
DEPTH = st.floats(0.0, 6000.0)

quick = settings(max_examples=60, deadline=None)


@quick
@given(LONGITUDE, LATITUDE, YEAR)
def test_deeper_water_comes_from_deeper(lon: float, lat: float, year: float) -> None:
    """Lifting and mixing never turn a column over."""
    origin = water.origin_depth(places(lon, lat), np.arange(0.0, 6000.0, 2.0), year)
    assert origin[0] >= 0.0
    assert np.all(np.diff(origin) > 0.0)


@quick
@given(LONGITUDE, LATITUDE, DEPTH, YEAR)
def test_a_turn_around_the_planet_changes_nothing(lon: float, lat: float, depth: float, year: float) -> None:
    here, round_trip = state(lon, lat, depth, year), state(lon + 360.0, lat, depth, year)
    for key, value in here.items():
        assert round_trip[key] == pytest.approx(float(value), rel=1e-9, abs=1e-9), key


@quick
@given(st.floats(-1200.0, 1200.0), st.floats(0.0, 18.0), YEAR)
def test_river_and_sea_mix_conservatively(east: float, depth: float, year: float) -> None:
    """Along the Mirrel Sea the salt says how much river water there is; alkalinity is mixed in the same share."""
    here = places(geography.OSHEL_MOUTH[0] + east / 77.0, geography.OSHEL_MOUTH[1])
    salt, sea = water.salinity(here, depth, year), water.sea_salinity(here, depth, year)
    share = 1.0 - salt / sea
    assert 0.0 <= share <= 6.0 / 7.0 + 1e-12
    marine = (carbon.alkalinity(here, depth, year) - 1150.0 * share) / (1.0 - share)
    assert 2200.0 < marine < 2450.0
    assert marine - 66.0 * sea == pytest.approx(float(carbon.polar_excess(here)), abs=5.0)


@quick
@given(LONGITUDE, LATITUDE)
def test_floor_lies_under_the_sea_and_nowhere_else(lon: float, lat: float) -> None:
    coast, depth = geography.coast_distance(point(lon, lat)), geography.sea_floor_depth(lon, lat)
    assert bool(geography.is_land(lon, lat)) == (float(depth) == 0.0) == (float(coast) <= 0.0)
    assert 0.0 <= depth < 10000.0
