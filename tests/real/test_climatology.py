"""A real climatology of temperature and salinity, with DIC and alkalinity by formula beside it, end to end.

Temperature is in situ, longitudes begin at an odd meridian, and the salinities bear units of 1.
"""

from __future__ import annotations

from pathlib import Path

import gsw
import numpy as np
import pytest
import xarray as xr
from click.testing import CliRunner

from gridcarb.cli.main import main
from tests.naive.twin import Twin

RECIPE = """
recipe: 1
inputs:
  temperature: {files: CLIMATOLOGY}
  salinity: {files: CLIMATOLOGY}
  dic: {files: carbon.nc}
  alkalinity: {files: carbon.nc}
reading: {density: in situ, phosphate: assume zero, silicate: "20 umol kg-1"}
chemistry: {constants: practice2022, fields: [ph_total_scale, aragonite_saturation, co2_partial_pressure]}
output: {folder: result, zarr: false}
figures: [{kind: map, field: aragonite_saturation, depth: 3000}]
"""


@pytest.fixture(scope="module")
def given(data: Path) -> xr.Dataset:
    with xr.open_dataset(data / "levitus_annual_4deg.nc") as opened:
        ds = opened.load()
    depth = ds["depth"].broadcast_like(ds["salt"])
    wet = ds["salt"].notnull() & ds["temp"].notnull()
    ds["talk"] = (2.35 * ds["salt"] / 35 + 0.00002 * depth).where(wet).transpose(*ds["salt"].dims)
    ds["dissic"] = (2.02 * ds["salt"] / 35 + 0.25 * (1 - np.exp(-depth / 800))).where(wet).transpose(*ds["salt"].dims)
    for name in ("talk", "dissic"):
        ds[name].attrs = {"units": "mol m-3"}
    return ds


@pytest.fixture(scope="module")
def found(data: Path, given: xr.Dataset, tmp_path_factory: pytest.TempPathFactory) -> xr.Dataset:
    folder = tmp_path_factory.mktemp("climatology")
    given[["talk", "dissic"]].to_netcdf(folder / "carbon.nc")
    recipe = folder / "recipe.yaml"
    recipe.write_text(RECIPE.replace("CLIMATOLOGY", str(data / "levitus_annual_4deg.nc")))
    ended = CliRunner().invoke(main, ["run", str(recipe), "--quiet"])
    assert ended.exit_code == 0, ended.output
    assert len(list((folder / "result" / "figures").glob("*.png"))) == 1
    with xr.open_dataset(folder / "result" / "fields.nc") as opened:
        return opened.load()


def test_every_wet_cell_has_an_answer(given: xr.Dataset, found: xr.Dataset) -> None:
    wet = given["salt"].notnull() & given["temp"].notnull()
    assert int(wet.sum()) > 20_000
    np.testing.assert_array_equal(np.isfinite(found["ph_total_scale"].values), wet.values)


def test_sample_cells_against_the_twin(given: xr.Dataset, found: xr.Dataset) -> None:
    cells = np.argwhere(np.isfinite(found["ph_total_scale"].values))[::397]
    assert len(cells) > 50
    for cell in map(tuple, cells):
        depth, lat, lon = (float(given[dim].values[place]) for dim, place in zip(given["salt"].dims, cell, strict=True))
        salt, warm = float(given["salt"].values[cell]), float(given["temp"].values[cell])
        pressure = gsw.p_from_z(-depth, lat)
        absolute = gsw.SA_from_SP(salt, pressure, lon, lat)
        density = float(gsw.rho_t_exact(absolute, warm, pressure))
        dic, alkalinity = (float(given[name].values[cell]) / density * 1e6 for name in ("dissic", "talk"))
        twin = Twin(warm, salt, float(pressure), constants="practice2022").solve(dic, alkalinity, 0, 20)
        for key in ("ph_total_scale", "aragonite_saturation", "co2_partial_pressure"):
            assert found[key].values[cell] == pytest.approx(twin[key], rel=1e-5), (key, cell)


def test_the_grid_is_kept(given: xr.Dataset, found: xr.Dataset) -> None:
    for name in ("lon", "lat", "depth"):
        np.testing.assert_array_equal(found[name].values, given[name].values)
