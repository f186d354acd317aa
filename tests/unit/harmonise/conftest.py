"""An invented raw ocean, as the sources would hand it over, which each test bends its own way."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
import xarray as xr

ATTRIBUTES: dict[str, dict[str, Any]] = {
    "temperature": {"standard_name": "sea_water_potential_temperature", "units": "degC"},
    "salinity": {"standard_name": "sea_water_practical_salinity", "units": "1"},
    "dic": {"standard_name": "mole_concentration_of_dissolved_inorganic_carbon_in_sea_water", "units": "mol m-3"},
    "alkalinity": {"standard_name": "sea_water_alkalinity_expressed_as_mole_equivalent", "units": "mol m-3"},
    "phosphate": {"standard_name": "mole_concentration_of_phosphate_in_sea_water", "units": "mol m-3"},
    "silicate": {"standard_name": "mole_concentration_of_silicate_in_sea_water", "units": "mol m-3"},
}
DEPTHS = (5.0, 100.0, 1000.0, 4000.0)


def build(
    *, depths: tuple[float, ...] = DEPTHS, steps: int = 2, rows: int = 5, columns: int = 6,
    attributes: dict[str, dict[str, Any] | None] | None = None, scale: dict[str, float] | None = None,
) -> xr.Dataset:
    """A raw ocean on time, depth, lat, lon; the south-western cell is land (1e20).

    attributes : role -> attributes put in place of the usual ones; None drops the role.
    scale : role -> factor on its numbers.
    """
    shape = (steps, len(depths), rows, columns)
    wave = np.sin(np.arange(np.prod(shape))).reshape(shape)
    deep = np.minimum(np.array(depths) / 4000.0, 1.0)[None, :, None, None]
    numbers = {
        "temperature": 20 - 18.5 * deep + wave, "salinity": 34.8 + 0.3 * wave, "dic": 2.1 + 0.25 * deep + 0.02 * wave,
        "alkalinity": 2.37 + 0.1 * deep + 0.02 * wave, "phosphate": 1e-3 * (0.5 + 2 * deep + 0.1 * wave),
        "silicate": 1e-3 * (5 + 120 * deep + wave),
    }
    variables = {}
    for role, usual in numbers.items():
        attrs = (attributes or {}).get(role, ATTRIBUTES[role])
        if attrs is None:
            continue
        values = usual * (scale or {}).get(role, 1.0)
        values[..., 0, 0] = 1e20
        variables[role] = (("time", "depth", "lat", "lon"), values, {"_FillValue": 1e20, **attrs})
    return xr.Dataset(variables, coords={
        "time": ("time", np.arange(steps, dtype=float), {"units": "days since 2000-01-01", "standard_name": "time"}),
        "depth": ("depth", np.array(depths), {"units": "m", "positive": "down", "standard_name": "depth"}),
        "lat": ("lat", np.linspace(-60.0, 60.0, rows), {"units": "degrees_north", "standard_name": "latitude"}),
        "lon": ("lon", np.linspace(-150.0, 100.0, columns), {"units": "degrees_east", "standard_name": "longitude"}),
    })


@pytest.fixture
def ocean() -> Callable[..., xr.Dataset]:
    return build
