"""The sea area of real grids against that of the ocean: 3.6e14 m2."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import find_axes
from gridcarb.harmonise.extent import read_measures
from gridcarb.harmonise.masks import read_mask
from gridcarb.harmonise.measures import cell_areas, find_areas
from gridcarb.harmonise.settings import ReadingSettings
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


def test_the_sea_of_a_real_tripolar_grid_counts_once() -> None:
    """Two degrees, with the fold along its last row: 35 sea cells twice; 0.8 % less than 3.6e14 m2."""
    sample = Path(pytest.importorskip("iris_sample_data").path) / "orca2_votemper.nc"
    with xr.open_dataset(sample, decode_cf=False) as opened:
        raw = opened.rename(votemper="temperature").load()
    raw = raw.set_coords([name for name in raw.data_vars if name != "temperature"])
    kelvin = raw["temperature"].copy(data=raw["temperature"].values + np.float32(273.15))
    raw["salinity"] = kelvin.where(raw["temperature"] < 1e30, np.nan)  # what is sea is asked of the salinity
    axes = find_axes(raw)
    marks = {name: read_mask(raw[name], name) for name in ("salinity", str(axes.latitude), str(axes.longitude))}
    decided = read_measures(raw, axes, marks, 0, ReadingSettings(coverage="global"))
    assert decided.reading.kind == "polygons"
    assert [notice.text.split(" (")[0] for notice in decided.notices] == ["35 sea cells repeat the place of others"]
    assert "dim0 = 147" in decided.notices[0].text
    assert any("3.57e14 m2" in str(decision) for decision in decided.decisions)
