"""A small invented result on a latitude/longitude grid, in any clothes a test asks for."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
import xarray as xr
from matplotlib.image import imread

import gridcarb.chemistry  # noqa: F401  (declares the derived fields)
from gridcarb.figures.drawing import theme
from gridcarb.figures.map import MapSettings, draw

Pixels = npt.NDArray[np.uint8]


def make_result(*, step: float = 10.0, levels: tuple[float, ...] = (5.0, 500.0), months: int = 2) -> xr.Dataset:
    """Dissolved carbon and status; land is a block 20E-60E, 20S-40N, and the sea floor is higher between 100E and 140E."""
    lon, lat = np.arange(step / 2, 360, step), np.arange(-90 + step / 2, 90, step)
    lev, time = np.array(levels), np.arange(months) * 30 + 15
    y, x = np.meshgrid(lat, lon, indexing="ij")
    carbon = 2000 + 100 * np.cos(np.radians(y)) * np.sin(np.radians(x)) + lev[:, None, None] / 10
    status = np.zeros((months, lev.size, *y.shape), dtype=np.int8)
    status[:, :, (x > 20) & (x < 60) & (y > -20) & (y < 40)] = 2
    status[:, 1:, (x > 100) & (x < 140)] = 2
    values = np.where(status < 2, carbon[None] + time[:, None, None, None] / 10, np.nan)
    dims = ("time", "lev", "lat", "lon")
    return xr.Dataset(
        {"dic": (dims, values, {"long_name": "dissolved inorganic carbon", "units": "umol kg-1"}),
         "solution_status": (dims, status)},
        coords={
            "time": ("time", time, {"units": "days since 2001-01-01", "calendar": "360_day", "standard_name": "time"}),
            "lev": ("lev", lev, {"units": "m", "positive": "down", "standard_name": "depth"}),
            "lat": ("lat", lat, {"units": "degrees_north", "standard_name": "latitude"}),
            "lon": ("lon", lon, {"units": "degrees_east", "standard_name": "longitude"}),
        },
        attrs={"geography": "invented"},
    )


@pytest.fixture
def result() -> xr.Dataset:
    return make_result()


@pytest.fixture(autouse=True)
def small(monkeypatch: pytest.MonkeyPatch) -> None:
    """Pictures of fewer pixels, so that the tests are quick."""
    monkeypatch.setattr(theme, "DPI", 80)


@pytest.fixture
def picture(tmp_path: Path) -> Callable[..., Pixels]:
    """Draw and read back: (rows, columns, 3) of 0..255."""

    def taken(ds: xr.Dataset, **words: object) -> Pixels:
        settings = MapSettings.model_validate({"kind": "map", "field": "dic", **words})
        image = imread(draw(ds, settings, tmp_path))
        return np.asarray(np.round(image[..., :3] * 255), dtype=np.uint8)

    return taken


def share(image: Pixels, colour: str) -> float:
    """The share of pixels in exactly this colour (#rrggbb)."""
    wanted = np.array([int(colour[at : at + 2], 16) for at in (1, 3, 5)], dtype=np.uint8)
    return float((image == wanted).all(axis=-1).mean())
