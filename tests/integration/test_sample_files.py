"""Files of real models and climatologies, from the package iris-sample-data, end to end.

They hold no carbon: DIC and alkalinity, and salinity where it is absent, are put beside them by formula, on the same grid
in files of their own. The temperatures are read from the files as they were published.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import gsw
import matplotlib.image
import numpy as np
import pytest
import xarray as xr

import gridcarb
from gridcarb.run.conduct import Outcome
from tests.integration.conftest import Run

FOLDER = Path(pytest.importorskip("iris_sample_data", reason="the package iris-sample-data is not installed").path)
FIELDS = ["ph_total_scale", "aragonite_saturation"]
READING = {"phosphate": "assume zero", "silicate": "assume zero", "salinity": "practical"}
UNITS = {"so": "0.001", "dissic": "umol kg-1", "talk": "umol kg-1"}
STANDARD_NAMES = {
    "so": "sea_water_practical_salinity",
    "dissic": "moles_of_dissolved_inorganic_carbon_per_unit_mass_in_sea_water",
    "talk": "sea_water_alkalinity_per_unit_mass_expressed_as_mole_equivalent",
}


def raw(name: str) -> xr.Dataset:
    with xr.open_dataset(FOLDER / name, decode_cf=False) as opened:
        return opened.load()


def carbon_beside(given: xr.Dataset, temperature: str, path: Path, salinity: str | None = None) -> Path:
    """Salinity (if there is none), DIC and alkalinity from the temperature, on its grid, missing where it is."""
    warm = given[temperature]
    celsius = warm.astype("f8") - (273.15 if warm.attrs["units"] == "K" else 0.0)
    salt = given[salinity].astype("f8") if salinity else 34.0 + 0.05 * celsius
    fields = {"dissic": 2150.0 - 8.0 * celsius, "talk": 2300.0 * salt / 35.0} | ({} if salinity else {"so": salt})
    missing = warm == warm.attrs["_FillValue"]
    said = {key: warm.attrs[key] for key in ("coordinates", "cell_methods") if key in warm.attrs}
    beside = given.drop_vars([name for name in (temperature, salinity) if name])
    for name, values in fields.items():
        attrs = {"units": UNITS[name], "standard_name": STANDARD_NAMES[name], "_FillValue": 1e20, **said}
        beside[name] = values.where(~missing, 1e20).assign_attrs(attrs)
    encoding = {str(name): {"_FillValue": None} for name in beside.variables if name not in fields}
    beside.to_netcdf(path, encoding=encoding)
    return path


def expected(temperature: xr.DataArray, depth: Any, lat: Any, lon: Any, so: xr.DataArray | None = None) -> dict[str, Any]:
    """What the fields should be, from decoded potential temperature in degC, worked out with TEOS-10 by hand."""
    warm = temperature.astype("f8")
    salt = 34.0 + 0.05 * warm if so is None else so.astype("f8")
    pressure = gsw.p_from_z(-depth, lat)
    absolute = gsw.SA_from_SP(salt, pressure, lon, np.maximum(lat, -86.0))
    in_situ = gsw.pt_from_t(absolute, warm, 0.0, pressure)
    state = {"temperature": in_situ, "salinity": salt, "dic": 2150.0 - 8.0 * warm, "alkalinity": 2300.0 * salt / 35.0}
    alike = xr.broadcast(*(xr.DataArray(values).transpose(..., *warm.dims[-2:]) for values in state.values()), pressure)
    arrays = [values.transpose(*warm.dims).values for values in alike]
    return gridcarb.speciate(**dict(zip((*state, "pressure"), arrays, strict=True)), fields=FIELDS)


def inputs(temperature: Any, carbon: list[Path], more: Mapping[str, Any] | None = None) -> dict[str, Any]:
    files = [str(path) for path in carbon]
    beside = {role: {"files": files} for role in ("dic", "alkalinity", "salinity")}
    return {"files": [], "temperature": temperature, **beside, **(more or {})}


def assert_drawn(outcome: Outcome, number: int) -> None:
    """A figure has colours on a good part of the page; land, coast and letters are grey."""
    pixels = (matplotlib.image.imread(outcome.written[f"figure {number}"])[..., :3] * 255).astype(int)
    coloured = pixels[np.ptp(pixels, axis=-1) > 20]
    assert len(coloured) > 0.15 * pixels.shape[0] * pixels.shape[1]
    assert len(np.unique(coloured[::4], axis=0)) > 30


def result(outcome: Outcome) -> xr.Dataset:
    with xr.open_dataset(outcome.written["NetCDF file"], decode_times=False) as opened:
        return opened.load()


def test_a_tripolar_level_of_a_360_day_year(tmp_path: Path, run: Run) -> None:
    """Two-dimensional positions in plain `degrees`, four corners, a fold, scalar depth and time."""
    carbon = carbon_beside(raw("orca2_votemper.nc"), "votemper", tmp_path / "carbon.nc")
    outcome = run([], inputs=inputs({"files": str(FOLDER / "orca2_votemper.nc")}, [carbon]), reading=READING,
                  chemistry={"fields": FIELDS}, figures=[
                      {"kind": "map", "field": "aragonite_saturation"},
                      {"kind": "map", "field": "ph_total_scale", "projection": "north"}])
    found = result(outcome)
    with xr.open_dataset(FOLDER / "orca2_votemper.nc", decode_times=False) as opened:
        given = opened.load()
    want = expected(given["votemper"], given["deptht"], given["nav_lat"], given["nav_lon"])
    for key in FIELDS:
        np.testing.assert_allclose(found[key], want[key], rtol=1e-12)
    assert outcome.products["means"]["surface"]["sea"] == pytest.approx(3.57e14, rel=2e-3)
    assert "repeated_cells" in {notice.code for notice in outcome.notices}
    assert found["time_counter"].attrs["calendar"] == "360_day"
    for name in ("nav_lon_bnds", "nav_lat", "deptht"):
        np.testing.assert_array_equal(found[name], given[name])
    for number in (1, 2):
        assert_drawn(outcome, number)


MONTHS = sorted((FOLDER / "NEMO").glob("nemo_1m_*_grid-T.nc"))


def test_months_of_a_tripolar_surface_a_file_each(tmp_path: Path, run: Run) -> None:
    """A time step a file, dated by an auxiliary coordinate of a 360-day calendar; no depth: sea surface temperature."""
    carbon = [carbon_beside(raw(f"NEMO/{path.name}"), "tos", tmp_path / f"carbon_{number}.nc")
              for number, path in enumerate(MONTHS)]
    outcome = run([], inputs=inputs({"files": str(FOLDER / "NEMO" / "nemo_1m_*_grid-T.nc")}, carbon), reading=READING,
                  chemistry={"fields": FIELDS}, figures=[{"kind": "map", "field": "aragonite_saturation", "time": "last"}])
    found = result(outcome)
    assert found.sizes == {"time_counter": 3, "y": 330, "x": 360, "nvertex": 4, "axis_nbounds": 2}
    for step, path in enumerate(MONTHS):
        with xr.open_dataset(path, decode_times=False) as opened:
            given = opened.load()
        want = expected(given["tos"].isel(time_counter=0), 0.0, given["nav_lat"], given["nav_lon"])
        for key in FIELDS:
            np.testing.assert_allclose(found[key][step], want[key], rtol=1e-12)
        assert found["time_centered"].values[step] == given["time_centered"].values[0]
        np.testing.assert_array_equal(found["time_centered_bounds"][step], given["time_centered_bounds"][0])
    # This model has land where the ice shelves are, and the Caspian Sea.
    assert outcome.products["means"]["surface"]["sea"] == pytest.approx(3.63e14, rel=2e-3)
    assert_drawn(outcome, 1)


def test_columns_in_kelvin(tmp_path: Path, run: Run) -> None:
    """Potential temperature in kelvin on 40 levels, longitudes that jump from 0.5 to 325.5 degrees east, a scalar time."""
    carbon = carbon_beside(raw("atlantic_profiles.nc"), "theta", tmp_path / "carbon.nc", "salinity")
    sample = {"files": str(FOLDER / "atlantic_profiles.nc")}
    outcome = run([], inputs=inputs(sample, [carbon], {"salinity": sample}), reading=READING | {"salinity": "practical"},
                  chemistry={"fields": FIELDS}, figures=[{"kind": "map", "field": "aragonite_saturation", "depth": 500}])
    found = result(outcome)
    with xr.open_dataset(FOLDER / "atlantic_profiles.nc", decode_times=False) as opened:
        given = opened.load()
    celsius = given["theta"].astype("f8") - 273.15
    want = expected(celsius, given["depth"], given["lat"], given["lon"], given["salinity"])
    for key in FIELDS:
        np.testing.assert_allclose(found[key], want[key], rtol=1e-11)
    for name in ("lat", "lon", "depth", "time"):
        np.testing.assert_array_equal(found[name], given[name])
    # 5 by 1.667 degrees each, although the first column lies behind the last.
    rows = np.radians(given["lat"].values[:, None] + np.array([-5.0, 5.0]) / 6.0)
    area = 6371008.7714**2 * np.radians(5.0) * np.diff(np.sin(rows), axis=1)[:, 0]
    sea = float((area * celsius[0].notnull().sum("lon")).sum())
    assert outcome.products["means"]["surface"]["sea"] == pytest.approx(sea, rel=1e-5)
    assert_drawn(outcome, 1)
