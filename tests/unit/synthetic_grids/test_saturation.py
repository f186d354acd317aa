"""The carbonate system of the invented ocean: what the tests and the demonstration count on.

The expectations are wide on purpose: they are about the ocean, not about the chemistry.
"""

from __future__ import annotations

import gsw
import numpy as np
import pytest

from gridcarb.chemistry.tile import speciate
from synthetic_grids import geography
from synthetic_grids.ocean import state
from synthetic_grids.place import places


def carbonate(lon: object, lat: object, depth: object, year: float) -> dict[str, np.ndarray]:
    """pH and aragonite saturation at places and depths that broadcast."""
    pressure = gsw.p_from_z(-np.asarray(depth, dtype=np.float64), np.asarray(lat, dtype=np.float64))
    water = state(lon, lat, depth, year)  # type: ignore[arg-type]
    return speciate(**water, pressure=pressure, fields=["ph_total_scale", "aragonite_saturation"])


def horizon(lon: float, lat: float) -> float:
    """Depth in m where aragonite saturation first falls below 1, to 10 m; must lie above the sea floor."""
    depth = np.arange(5.0, float(geography.sea_floor_depth(lon, lat)), 10.0)
    under = carbonate(lon, lat, depth, 2010.5)["aragonite_saturation"] < 1.0
    assert under.any()
    assert not under[0]
    return float(depth[np.argmax(under)])


@pytest.mark.parametrize(("lon", "lat"), [(130.0, 20.0), (60.0, -45.0), (110.0, -77.0), (130.0, 45.0)])
def test_young_ocean_has_a_deep_horizon(lon: float, lat: float) -> None:
    assert 2000.0 < horizon(lon, lat) < 3500.0


@pytest.mark.parametrize(("lon", "lat"), [(265.0, 30.0), (280.0, 0.0), (220.0, -30.0), (270.0, 50.0)])
def test_old_ocean_has_a_shallow_horizon(lon: float, lat: float) -> None:
    assert 80.0 < horizon(lon, lat) < 700.0


def test_surface_is_an_ocean_of_today() -> None:
    """Open sea surface in 2010, winter and summer: pH 7.85 to 8.3, median near 8.05; aragonite from 1 to 4.3."""
    lon, lat = np.meshgrid(np.arange(3.0, 360.0, 6.0), np.arange(-87.0, 90.0, 6.0))
    open_sea = (geography.sea_floor_depth(lon, lat) > 0.0) & (places(lon, lat).river < 0.001)
    for year in (2010.2, 2010.7):
        surface = carbonate(lon[open_sea], lat[open_sea], 0.0, year)
        ph, aragonite = surface["ph_total_scale"], surface["aragonite_saturation"]
        assert 7.85 < ph.min() < ph.max() < 8.3
        assert np.median(ph) == pytest.approx(8.06, abs=0.03)
        assert 1.0 < aragonite.min() < 1.6
        assert 3.7 < aragonite.max() < 4.3


def test_upwelling_coast_is_sour_and_close_to_saturation() -> None:
    """Near 1 at 115 m in late summer on the Ombary Coast, and pH below 8 at its surface; offshore, nothing of it."""
    coast, offshore = (carbonate(lon, 25.5, np.array([5.0, 115.0]), 2010.6) for lon in (331.5, 310.5))
    assert 0.85 < coast["aragonite_saturation"][1] < 1.2
    assert coast["ph_total_scale"][0] < 7.96
    assert offshore["ph_total_scale"][0] > 8.0
    assert offshore["aragonite_saturation"][1] > 1.7


def test_river_water_is_undersaturated() -> None:
    mouth = carbonate(*geography.OSHEL_MOUTH, 0.0, 2010.5)
    assert mouth["aragonite_saturation"] < 0.7
    assert 7.5 < mouth["ph_total_scale"] < 8.3


def test_surface_acidifies_over_the_decades() -> None:
    """About 0.002 a year at the end of the century, wherever the surface is open."""
    lon, lat = np.array([130.0, 265.0, 60.0]), np.array([20.0, 30.0, -45.0])
    early, late = (carbonate(lon, lat, 5.0, year) for year in (1990.5, 2020.5))
    fall = early["ph_total_scale"] - late["ph_total_scale"]
    assert np.all((fall > 0.03) & (fall < 0.1))
