"""Every vertical clothing of the invented ocean: a cell at the same depth below the surface has the same bits in all."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from gridcarb.harmonise import clothe, understand
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.sources import gather, open_collection
from gridcarb.sources.settings import InputsSettings
from synthetic_grids.kinds import KINDS, scene_of, stated

EXACT = sorted(name for name in KINDS if name.startswith("vertical_") and name not in {
    "vertical_surface", "vertical_pressure_column",  # no depth below the surface; no map
    "vertical_pressure_levels",  # depths follow from pressures
    "vertical_pressure_field",  # and back
    "vertical_kilometres",  # 5 m are not exact in km
    "vertical_ocean_s",  # hyperbolic functions
})
KEYS = ("temperature", "salinity", "sea_pressure", "dic", "alkalinity")


def clothed(name: str, folder: Path) -> xr.Dataset:
    files = KINDS[name](folder)
    raw = open_collection(gather(InputsSettings(files=tuple(str(path) for path in files)), folder))
    settings = ReadingSettings.model_validate({"density": "in situ", **dict(stated(name).get("reading", {}))})  # type: ignore[call-overload]
    return clothe(raw.load(), understand(raw, settings))


def columns(name: str, folder: Path) -> dict[tuple[float, ...], tuple[float, ...]]:
    """(east, north, depth, year) -> numbers, of the first month, in which no sea surface has moved."""
    found = clothed(name, folder)
    cells = scene_of(name).cells()
    dims = scene_of(name).truth["salinity"].dims
    first = min(point[3] for point in cells)
    whole = {key: found[key].broadcast_like(found["salinity"]).transpose(*dims).values for key in KEYS}
    return {point: tuple(float(whole[key][cell]) for key in KEYS) for point, cell in cells.items() if point[3] == first}


@pytest.fixture(scope="module")
def plain(tmp_path_factory: pytest.TempPathFactory) -> dict[tuple[float, ...], tuple[float, ...]]:
    return columns("grid_raster", tmp_path_factory.mktemp("plain"))


@pytest.mark.parametrize("name", EXACT)
def test_the_same_cell_has_the_same_bits(
    name: str, plain: dict[tuple[float, ...], tuple[float, ...]], tmp_path: Path
) -> None:
    found = columns(name, tmp_path)
    shared = [point for point in found if point in plain]
    assert len(shared) >= 50
    for point in shared:
        assert found[point] == plain[point], point


@pytest.mark.parametrize(("name", "close"), [
    ("vertical_kilometres", 1e-12), ("vertical_ocean_s", 1e-12), ("vertical_pressure_field", 1e-12),
])
def test_rounded_depths_are_as_close_as_their_rounding(
    name: str, close: float, plain: dict[tuple[float, ...], tuple[float, ...]], tmp_path: Path
) -> None:
    found = columns(name, tmp_path)
    shared = [point for point in found if point in plain]
    assert len(shared) >= 50
    np.testing.assert_allclose([found[point] for point in shared], [plain[point] for point in shared], rtol=close)
