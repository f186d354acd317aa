"""The main job through the command line on a real global ocean state: 2.8 degrees, 15 levels, one state in time.

Independent arithmetic: gsw for temperature and pressure, the bisection twin for the chemistry, published ranges.
"""

from __future__ import annotations

import json
import socket
import warnings
from collections.abc import Iterator
from pathlib import Path

import gsw
import matplotlib.image
import netCDF4
import numpy as np
import pytest
import xarray as xr
from click.testing import CliRunner

from gridcarb.cli.main import main
from gridcarb.fields import FIELDS
from tests.naive.twin import Twin

ROOT = Path(__file__).parents[2]
WET = 55_673
DENSITY = 1035.0


@pytest.fixture(scope="module")
def folder(data: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The result folder of one run of the shipped recipe."""
    result = tmp_path_factory.mktemp("real") / "global_state"
    words = ["run", str(ROOT / "recipes" / "global_state.yaml"), "--input", str(data / "global_state_2p8deg.nc"),
             "--result", str(result)]
    ended = CliRunner().invoke(main, words)
    assert ended.exit_code == 0, ended.output
    assert f"{WET:,} of 122,880" in ended.stdout
    return result


@pytest.fixture(scope="module")
def found(folder: Path) -> Iterator[xr.Dataset]:
    with xr.open_dataset(folder / "fields.nc") as opened:
        yield opened.load()


@pytest.fixture(scope="module")
def given(data: Path) -> Iterator[xr.Dataset]:
    with xr.open_dataset(data / "global_state_2p8deg.nc") as opened:
        yield opened[["thetao", "so", "dissic", "talk", "po4"]].load()


def test_all_wet_cells_are_solved(folder: Path, found: xr.Dataset, given: xr.Dataset) -> None:
    wet = np.isfinite(given["dissic"].values)
    assert int(wet.sum()) == WET
    derived = [key for key, entry in FIELDS.items() if entry.part == "derived"]
    assert set(derived) < set(found.data_vars)
    for key in derived:
        assert (np.isfinite(found[key].values) == wet).all(), key
    status = found["solution_status"]
    codes = dict(zip(status.attrs["flag_meanings"].split(), np.atleast_1d(status.attrs["flag_values"]), strict=True))
    counts = {word: int((status.values == code).sum()) for word, code in codes.items()}
    assert counts["solved"] + counts["outside_validity"] == WET
    assert counts["missing_input"] == found["solution_status"].size - WET
    assert counts["unphysical_input"] == counts["unsolved"] == 0
    # outside: the constants of carbonic acid were measured from 2 to 35 degC (Lueker et al. 2000)
    assert counts["outside_validity"] == int((_in_situ(given) < 2).values[wet].sum())
    journal = json.loads((folder / "journal.json").read_text())
    assert journal["state"] == "complete"


def _pressure(given: xr.Dataset) -> xr.DataArray:
    return xr.apply_ufunc(gsw.p_from_z, -given["depth"], given["lat"])


def _in_situ(given: xr.Dataset) -> xr.DataArray:
    """By conservative temperature, another way than the program's own."""
    pressure = _pressure(given)
    absolute = xr.apply_ufunc(gsw.SA_from_SP, given["so"], pressure, given["lon"], given["lat"])
    conservative = xr.apply_ufunc(gsw.CT_from_pt, absolute, given["thetao"])
    return xr.apply_ufunc(gsw.t_from_CT, absolute, conservative, pressure).transpose("depth", "lat", "lon")


def test_sample_cells_against_the_twin(found: xr.Dataset, given: xr.Dataset) -> None:
    pressure = _pressure(given).broadcast_like(given["so"]).transpose("depth", "lat", "lon").values
    temperature = _in_situ(given).values
    cells = np.argwhere(np.isfinite(given["dissic"].values))[::463]
    assert len(cells) > 100
    for cell in map(tuple, cells):
        dic, alkalinity, phosphate = (float(given[name].values[cell]) / DENSITY * 1e6 for name in ("dissic", "talk", "po4"))
        twin = Twin(float(temperature[cell]), float(given["so"].values[cell]), float(pressure[cell]))
        for key, value in twin.solve(dic, alkalinity, phosphate).items():
            # stored in single precision; the two ways to in-situ temperature agree within 1e-4 degC
            assert found[key].values[cell] == pytest.approx(value, rel=4e-6), (key, cell)


def _top(found: xr.Dataset, key: str) -> xr.DataArray:
    return found[key].isel(depth=0)


def test_surface_ph_lies_where_climatologies_have_it(found: xr.Dataset) -> None:
    """7.9 to 8.2 in the climatology of 2005 (Takahashi et al. 2014, Mar. Chem. 164, 95).

    This state is a model's start, without rivers and with ice-covered seas: 98 % of the open ocean is asked for, with the
    width of the pre-industrial ocean (8.17 to 8.2 on average; Jiang et al. 2019, Sci. Rep. 9, 18624) allowed above.
    """
    ph = _top(found, "ph_total_scale").sel(lat=slice(-60, 60))
    low, high = ph.quantile([0.01, 0.99])
    assert 7.9 < low < high < 8.3
    weights = np.cos(np.radians(ph["lat"]))
    assert 8.03 < float(ph.weighted(weights).mean()) < 8.2


def test_upwelling_water_has_the_lowest_ph_of_the_open_surface(found: xr.Dataset) -> None:
    """Low in the upwelling of the tropical Pacific (Takahashi et al. 2014)."""
    ph = _top(found, "ph_total_scale")
    upwelling = ph.sel(lat=slice(-8, 3), lon=slice(240, 278)).mean()
    gyre = ph.sel(lat=slice(-30, -15), lon=slice(200, 260)).mean()
    assert float(gyre - upwelling) > 0.05


def test_surface_saturation_of_warm_and_cold_seas(found: xr.Dataset) -> None:
    """Aragonite saturation 3.5 to 4.3 in the tropics, 1 to 1.7 in polar water (textbook ranges).

    The first level is 25 m thick water and more, below the warmest skin, hence some room below.
    """
    aragonite = _top(found, "aragonite_saturation")
    west_pacific = aragonite.sel(lat=slice(-15, 15), lon=slice(150, 200))
    assert 3.2 < float(west_pacific.median()) < 4.3
    southern = aragonite.sel(lat=slice(-78, -60))
    assert 1.0 < float(southern.median()) < 2.0
    assert float((_top(found, "calcite_saturation") / aragonite).median()) == pytest.approx(1.53, abs=0.06)


def test_revelle_factor_of_warm_and_cold_seas(found: xr.Dataset) -> None:
    """8 to 9 and somewhat more in the warm tropics, 13 to 16 in polar water."""
    revelle = _top(found, "revelle_factor")
    assert 8 < float(revelle.sel(lat=slice(-15, 15)).median()) < 10.5
    assert 12.5 < float(revelle.sel(lat=slice(-78, -60)).median()) < 16


@pytest.mark.parametrize(("name", "lat", "lon", "supersaturated", "undersaturated"), [
    # horizons of aragonite: North Pacific 100 to 600 m, North Atlantic 2000 to 2600 m (Feely et al. 2004; textbooks)
    ("North Pacific", slice(30, 50), slice(160, 220), 50, 800),
    ("North Atlantic", slice(25, 50), slice(310, 340), 1500, 3500),
])
def test_the_depth_of_aragonite_saturation(
    found: xr.Dataset, *, name: str, lat: slice, lon: slice, supersaturated: float, undersaturated: float,
) -> None:
    column = found["aragonite_saturation"].sel(lat=lat, lon=lon).median(["lat", "lon"])
    assert float(column.interp(depth=supersaturated)) > 1, name
    below = column.sel(depth=slice(undersaturated, None)).dropna("depth")
    assert below.size >= 3
    assert (below < 1).all(), name


def test_the_deep_north_pacific_is_undersaturated_everywhere(found: xr.Dataset) -> None:
    deep = found["aragonite_saturation"].sel(lat=slice(25, 60), lon=slice(150, 230), depth=slice(1000, None))
    assert deep.notnull().sum() > 1000
    assert float(deep.max()) < 1


def test_both_copies_hold_the_same(folder: Path, found: xr.Dataset) -> None:
    with xr.open_zarr(folder / "fields.zarr", consolidated=False, chunks=None) as store:
        for key in found.data_vars:
            np.testing.assert_array_equal(store[key].values, found[key].values)


def test_the_netcdf_passes_the_cf_checks(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*words: object, **_: object) -> None:
        raise AssertionError(f"the network was asked for: {words}")

    monkeypatch.setattr(socket.socket, "connect", refuse)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of the checker's own dependencies
        from compliance_checker.runner import CheckSuite

        suite = CheckSuite()
        suite.load_all_available_checkers()
        dataset = suite.load_dataset(str(folder / "fields.nc"))
        try:
            groups, errors = suite.run_all(dataset, ["cf:1.11"])["cf:1.11"]
        finally:
            dataset.close()
    assert not errors
    assert len(groups) > 15
    failed = [f"{group.name}: {group.msgs}" for group in groups if group.value[0] < group.value[1]]
    assert not failed


def test_what_the_file_says_of_itself(folder: Path) -> None:
    with netCDF4.Dataset(folder / "fields.nc") as file:
        assert "CF-1.11" in file.Conventions.split(", ")
        told = " ".join(str(file.getncattr(name)) for name in file.ncattrs())
        assert "1035 kg m-3" in told
        assert "silicate" in told.lower()
        for key, entry in FIELDS.items():
            if entry.part == "derived":
                assert file[key].units == entry.units
                assert getattr(file[key], "standard_name", None) == entry.standard_name
        for name in ("lat", "lon", "depth"):
            assert "_FillValue" not in file[name].ncattrs()


def test_the_figures_are_there_and_not_blank(folder: Path) -> None:
    pictures = sorted((folder / "figures").iterdir())
    assert [path.name for path in pictures] == [
        "aragonite_saturation_25m.png", "aragonite_saturation_935m.png", "ph_total_scale_25m.png",
    ]
    for path in pictures:
        pixels = (matplotlib.image.imread(path)[..., :3] * 255).astype(int)
        coloured = (np.ptp(pixels, axis=-1) > 20).mean()  # land, coast and letters are grey
        assert coloured > 0.15, path
        assert len(np.unique(pixels[::4, ::4].reshape(-1, 3), axis=0)) > 100, path
