"""Model clothes: the truth comes back by the definitions, computed here with gsw and plain arithmetic."""

from __future__ import annotations

from pathlib import Path
from typing import NamedTuple

import gsw
import netCDF4
import numpy as np
import pytest
import xarray as xr

from synthetic_grids import grids
from synthetic_grids.clothes import FILL, Clothes, dress, write

GRAMS_PER_PRACTICAL = 35.16504 / 35.0


class Scene(NamedTuple):
    """The truth of a small ocean, its depths and latitudes."""

    truth: xr.Dataset
    depth: xr.DataArray
    latitude: xr.DataArray

    def dressed(self, **clothes: object) -> xr.Dataset:
        return dress(*self, Clothes(**clothes))  # type: ignore[arg-type]


@pytest.fixture(scope="module")
def scene() -> Scene:
    grid = grids.rectilinear(12, 24)
    depth = grids.levels((0.0, 20.0, 900.0, 3000.0, 6000.0))["lev"]
    year = grids.months(2010, 2010, "noleap")["year"].isel(time=[0, 8])
    return Scene(grids.sample(grid["lon"], grid["lat"], depth, year), depth, grid["lat"])


def wet(values: xr.DataArray) -> np.ndarray:
    numbers = values.values.astype(np.float64)
    return np.where(values.values == FILL, np.nan, numbers)


@pytest.mark.parametrize("kelvin", [False, True])
@pytest.mark.parametrize("kind", ["in situ", "potential", "conservative"])
def test_temperature_comes_back(kind: str, kelvin: bool, scene: Scene) -> None:
    truth = scene.truth
    clothed = scene.dressed(temperature=kind, kelvin=kelvin)["thetao"]
    given = wet(clothed) - (273.15 if kelvin else 0.0)
    absolute = GRAMS_PER_PRACTICAL * truth["salinity"].values
    pressure = gsw.p_from_z(-scene.depth.values[:, None, None], scene.latitude.values[:, None])
    back = {
        "in situ": given,
        "potential": gsw.t_from_CT(absolute, gsw.CT_from_pt(absolute, given), pressure),
        "conservative": gsw.t_from_CT(absolute, given, pressure),
    }[kind]
    np.testing.assert_allclose(back, truth["temperature"].values, atol=3e-5)
    assert clothed.attrs["units"] == ("K" if kelvin else "degC")
    deepest = np.nanmax(np.abs(given - truth["temperature"].values))
    assert (deepest > 0.2) == (kind != "in situ")


@pytest.mark.parametrize(("kind", "units", "factor"), [
    ("unsaid", "0.001", 1.0), ("practical", "1", 1.0), ("absolute", "g kg-1", GRAMS_PER_PRACTICAL),
])
def test_salinity_comes_back(kind: str, units: str, factor: float, scene: Scene) -> None:
    clothed = scene.dressed(salinity=kind)["so"]
    np.testing.assert_allclose(wet(clothed) / factor, scene.truth["salinity"].values, rtol=1e-6)
    assert clothed.attrs["units"] == units


@pytest.mark.parametrize(("units", "factor"), [("mol m-3", 1035e-6), ("mmol m-3", 1.035), ("umol kg-1", 1.0)])
def test_tracers_share_one_density(units: str, factor: float, scene: Scene) -> None:
    clothed = scene.dressed(tracer_units=units, density=1035.0)
    for key, name in (("dic", "dissic"), ("alkalinity", "talk"), ("phosphate", "po4"), ("silicate", "si")):
        np.testing.assert_allclose(wet(clothed[name]) / factor, scene.truth[key].values, rtol=1e-6)
        assert clothed[name].attrs["units"] == units
        assert clothed[name].attrs["standard_name"].startswith(("mole", "sea_water_alkalinity"))
        assert ("per_unit_mass" in clothed[name].attrs["standard_name"]) == (units == "umol kg-1")


def test_rounding_stays_within_half_a_step(scene: Scene) -> None:
    plain, rounded = (scene.dressed(rounding=steps)["dissic"] for steps in ({}, {"dic": 0.25}))
    steps = wet(rounded) / 0.25
    np.testing.assert_array_equal(steps, np.round(steps))
    assert np.nanmax(np.abs(wet(rounded) - wet(plain))) <= 0.125


def test_a_file_being_read_can_be_written_again(tmp_path: Path, scene: Scene) -> None:
    clothed = scene.dressed()[["so"]]
    write(clothed, tmp_path / "so.nc")
    with netCDF4.Dataset(tmp_path / "so.nc") as reader:
        write(clothed, tmp_path / "so.nc")
        assert reader["so"][:].count() == int(scene.truth["salinity"].notnull().sum())
    assert [path.name for path in tmp_path.iterdir()] == ["so.nc"]


def test_file_says_what_it_holds(tmp_path: Path, scene: Scene) -> None:
    write(scene.dressed()[["talk"]], tmp_path / "talk.nc", split=("lev",))
    with netCDF4.Dataset(tmp_path / "talk.nc") as file:
        talk = file["talk"]
        assert talk.dtype == np.float32
        assert talk._FillValue == FILL == talk.missing_value
        assert talk.chunking() == [2, 1, 12, 24]
        assert talk[:].count() == int(scene.truth["alkalinity"].notnull().sum())
        assert not [name for name in file.variables if name != "talk" and "_FillValue" in file[name].ncattrs()]
