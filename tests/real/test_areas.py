"""The sea area of real grids against that of the ocean: 3.6e14 m2."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import find_axes
from gridcarb.harmonise.masks import read_mask
from gridcarb.harmonise.measures import cell_areas, find_areas
from gridcarb.harmonise.sphere import RADIUS

OCEAN = 3.6e14


@pytest.mark.parametrize(
    ("file", "name", "expected"),
    [
        # Everything below sea level at one degree, the Caspian and dry depressions among it.
        ("seafloor_1deg.nc", "elevation", 3.62e14),
        ("levitus_annual_4deg.nc", "salt", 3.59e14),
        # This model has no Arctic Ocean and few shelf seas: 8 % less than the ocean, which the plan tells.
        ("global_state_2p8deg.nc", "so", 3.30e14),
    ],
)
def test_sea_areas(data: Path, file: str, name: str, expected: float) -> None:
    with xr.open_dataset(data / file, decode_times=False) as opened:
        field = opened[name].load()
    raw = field.to_dataset(name="temperature").drop_vars("month", errors="ignore")
    axes = find_axes(raw)
    masks = {each: read_mask(raw[each], each) for each in (axes.latitude, axes.longitude) if each}
    reading, _ = find_areas(raw, axes, masks)
    area = cell_areas(raw, axes, reading, {})
    assert float(area.sum()) == pytest.approx(4 * np.pi * RADIUS**2, rel=1e-4)
    top = field.isel({axes.vertical: 0}) if axes.vertical else field
    sea = top < 0 if name == "elevation" else top > 0
    found = float(area.where(sea).sum())
    print(f"{file}: {found:.4e} m2, {found / OCEAN - 1:+.1%}")
    assert found == pytest.approx(expected, rel=2e-3)
