"""The committed files: what the generator makes, no larger than allowed, valid CF, and true."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

from synthetic_grids import make
from synthetic_grids.clothes import ROUNDING
from synthetic_grids.ocean import state

NAMES = ("thetao", "so", "dissic", "talk", "po4", "si")


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    return make.make(tmp_path_factory.mktemp("first_look"))


def opened(path: Path) -> xr.Dataset:
    with xr.open_dataset(path, decode_cf=False) as dataset:
        return dataset.load()


def test_generator_makes_the_committed_files(made: list[Path]) -> None:
    """The same files, attributes and axes; values equal but for rare single steps on another machine's arithmetic."""
    assert sorted(path.name for path in made) == sorted(path.name for path in make.FOLDER.iterdir())
    for path in made:
        fresh, committed = opened(path), opened(make.FOLDER / path.name)
        xr.testing.assert_allclose(fresh, committed, rtol=0.0, atol=2.0**-6)
        assert fresh.attrs == committed.attrs
        name = path.name.split("_")[0]
        assert str(fresh[name].attrs) == str(committed[name].attrs)
        assert np.mean(fresh[name].values != committed[name].values) < 1e-4


def test_committed_files_are_small() -> None:
    folder = make.FOLDER.parent
    total = sum(path.stat().st_size for path in folder.rglob("*") if "__pycache__" not in path.parts and path.is_file())
    assert total <= 5_000_000


@pytest.mark.parametrize("name", [f"thetao_model_{make.YEAR}.nc", f"dissic_model_{make.YEAR}.nc", "deptho_model_fixed.nc"])
def test_cf_checks_pass(name: str, tmp_path: Path) -> None:
    checker = shutil.which("compliance-checker", path=str(Path(sys.executable).parent))
    assert checker, "the test extra installs compliance-checker"
    report = tmp_path / "report.json"
    ran = subprocess.run(
        [checker, "--test", "cf:1.11", "--format", "json", "--output", str(report), str(make.FOLDER / name)],
        capture_output=True, text=True, check=False,
    )
    found = json.loads(report.read_text())["cf:1.11"]
    complaints = [entry for level in ("high", "medium", "low") for entry in found[f"{level}_priorities"] if entry["msgs"]]
    assert ran.returncode == 0, ran.stdout + ran.stderr
    assert not complaints


def test_a_committed_cell_is_the_formula() -> None:
    """22.5 N 265.5 E at 27.5 m in mid-May, day 135.5 of 365: carbon and alkalinity per volume at 1026 kg m-3."""
    truth = state(265.5, 22.5, 27.5, make.YEAR + 135.5 / 365.0)
    found = {}
    for name in NAMES:
        with netCDF4.Dataset(make.FOLDER / f"{name}_model_{make.YEAR}.nc") as file:
            assert file["time"][4] == 135.5
            assert (file["lev"][2], file["lat"][37], file["lon"][88]) == (27.5, 22.5, 265.5)
            found[name] = float(file[name][4, 2, 37, 88])
    assert found["thetao"] == pytest.approx(float(truth["temperature"]) - 0.006, abs=0.01)  # 27.5 dbar cool it by 6 mK
    assert found["so"] == pytest.approx(float(truth["salinity"]), abs=ROUNDING["salinity"])
    for name, key in (("dissic", "dic"), ("talk", "alkalinity"), ("po4", "phosphate"), ("si", "silicate")):
        assert found[name] == pytest.approx(1026e-6 * float(truth[key]), abs=0.51 * ROUNDING[key])


def test_plume_reaches_salinity_five() -> None:
    with netCDF4.Dataset(make.FOLDER / f"so_model_{make.YEAR}.nc") as file:
        surface = file["so"][:, 0]
        assert 4.5 < surface.min() < 6.0
        assert np.percentile(surface.compressed(), 99.5) < 37.0
        assert np.mean(surface.compressed() < 30.0) < 0.02


def test_fixed_fields_fit_the_masks() -> None:
    with netCDF4.Dataset(make.FOLDER / f"so_model_{make.YEAR}.nc") as file:
        wet = ~np.ma.getmaskarray(file["so"][0, 0])
    with netCDF4.Dataset(make.FOLDER / "areacello_model_fixed.nc") as file:
        area = file["areacello"][:]
    with netCDF4.Dataset(make.FOLDER / "deptho_model_fixed.nc") as file:
        floor = file["deptho"][:]
    assert np.array_equal(wet, ~np.ma.getmaskarray(area))
    assert np.array_equal(wet, ~np.ma.getmaskarray(floor))
    assert float(area.sum(dtype=np.float64)) == pytest.approx(3.6e14, rel=0.01)
