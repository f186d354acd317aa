"""Real files, as their makers wrote them."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import InputError
from gridcarb.harmonise import clothe, understand
from gridcarb.harmonise.settings import ReadingSettings

FOLDER = Path(__file__).parents[4] / "shared" / "data"
pytestmark = [
    pytest.mark.real,
    pytest.mark.skipif(not FOLDER.exists(), reason="the shared real data are not beside the checkout"),
]


@pytest.fixture(scope="module")
def state() -> xr.Dataset:
    with xr.open_dataset(FOLDER / "global_state_2p8deg.nc", decode_cf=False) as opened:
        names = {"thetao": "temperature", "so": "salinity", "dissic": "dic", "talk": "alkalinity", "po4": "phosphate"}
        return opened[list(names)].rename(names).load()


def test_global_state(state: xr.Dataset) -> None:
    understanding = understand(state, ReadingSettings(silicate="assume zero"))
    assert understanding.density.value == 1035.0
    assert [notice.code for notice in understanding.notices] == ["density_from_file"]
    assert "'source'" in understanding.notices[0].text
    clothed = clothe(state, understanding)
    wet = np.isfinite(clothed["dic"].values)
    assert int(wet.sum()) == 55_673
    for key in ("temperature", "salinity", "alkalinity", "phosphate"):
        assert (np.isfinite(clothed[key].values) == wet).all()
    assert 2050 < float(clothed["dic"].median()) < 2300
    warmer = (clothed["temperature"] - state["temperature"].where(state["temperature"] < 1e19)).isel(depth=13)
    assert 0.2 < float(warmer.median()) < 0.6


def test_global_state_asks_for_silicate(state: xr.Dataset) -> None:
    with pytest.raises(InputError, match="silicate is not given"):
        understand(state, ReadingSettings())


def test_annual_climatology_with_its_odd_longitudes() -> None:
    with xr.open_dataset(FOLDER / "levitus_annual_4deg.nc", decode_cf=False) as opened:
        raw = opened.rename(temp="temperature", salt="salinity").load()
    blank = raw["temperature"] >= 1e19
    for role, value, units in (("dic", 2.1, "mol m-3"), ("alkalinity", 2.35, "mol m-3")):
        raw[role] = xr.full_like(raw["temperature"], value).where(~blank, np.float32(1e20))
        raw[role].attrs = {"units": units, "_FillValue": np.float32(1e20)}
    settings = ReadingSettings(phosphate="assume zero", silicate="assume zero", density="in situ")
    understanding = understand(raw, settings)
    assert understanding.temperature.kind == "in situ"
    clothed = clothe(raw, understanding)
    deep = clothed.sel(depth=4000, lat=30.5, lon=200.5, method="nearest")
    assert deep["temperature"].item() == pytest.approx(1.49, abs=0.02)
    assert 1022 < float(clothed["density"].isel(depth=0).median()) < 1028
    assert 1044 < float(clothed["density"].sel(depth=4000).median()) < 1048
