"""The costly mistakes of the science sheet that whole runs show: what the program does, and what it saves its user from.

| mistake | kept from the user by | size |
|---|---|---|
| M1 density, M2 temperature, M3 salinity, M5 pressure, M9 nutrients, M10 fill values | `tests/unit/harmonise` | there |
| M4 scale of pH | total by default, named in every output; a pH is no input yet | 0.041 to 0.108, -0.010 to -0.013 |
| M6 means before chemistry | chemistry at the steps of the input; a mean state is called one; both means of pH | example |
| M7 constants mixed | one set a run, named in every output | 0.006 in pH, 1.2 %, 6 uatm |
| M8 outside the constants | computed, flagged, counted | - |
| M11 calendars | kept; `months since` refused until it is said what a month is | a day and more |
| M12 lengths of months | means over time by the bounds | as computed by hand |
| M13 cells cut by the sea floor | thickness from the files, else told | a sixth of the volume |
| M14 cells twice, cos(latitude) | copies do not count; no areas without bounds; a global claim is checked | 1.65 % here |
| M17 float32 | computed and summed in float64 | digits |
| M18 fugacity, partial pressure, Pa | fields and units of their own | 0.3 to 0.4 %, a factor of 9.87 |
| M19 pCO2 below the surface | the definition is written into the outputs | - |

Not here, because what they are about is not built: M7's refusal to compare two results of different sets (comparing
results), M15 (drift of a control run), M16 (ice: air-sea flux; inland seas: regions), M18's sign of the flux (air-sea
flux), M20 (horizons).
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

import gridcarb
from gridcarb import units
from gridcarb.errors import InputError
from gridcarb.fields import FIELDS
from gridcarb.products import PRODUCTS
from gridcarb.run.conduct import Outcome
from synthetic_grids.forms import write_netcdf
from synthetic_grids.kinds import KINDS, scene_of
from tests.integration.conftest import RecipeFor, Run

SURFACE = {"temperature": 20.0, "salinity": 35.0, "dic": 2050.0, "alkalinity": 2300.0}
ANSWERS = ("aragonite_saturation", "ph_total_scale", "co2_fugacity")


def solve(fields: Any = ANSWERS, constants: str = "practice2022", **state: Any) -> dict[str, Any]:
    return gridcarb.speciate(**{**SURFACE, **state}, fields=fields, constants=constants)


def written(outcome: Outcome) -> xr.Dataset:
    with xr.open_dataset(outcome.written["NetCDF file"], decode_cf=False) as opened:
        return opened.load()


def codes(outcome: Outcome) -> set[str]:
    return {notice.code for notice in outcome.notices}


def sea(outcome: Outcome, extent: str = "surface") -> float:
    return float(outcome.products["means"][extent]["sea"])


@pytest.fixture
def read(tmp_path: Path, run: Run) -> Any:
    """Run a kind of the invented ocean, its dataset bent first; the result lies in a folder of its own each time."""
    def do(kind: str, bend: Any = None, **sections: Any) -> Outcome:
        folder = tmp_path / str(len(list(tmp_path.iterdir())))
        folder.mkdir()
        files = KINDS[kind](folder) if bend is None else [write_netcdf(bend(scene_of(kind).dataset), folder / "bent.nc")]
        output = {"folder": str(folder / "result"), "precision": "float32"} | sections.pop("output", {})
        return run(files, output=output, **sections)
    return do


@pytest.mark.parametrize(("temperature", "free", "seawater"), [(0.0, 0.041, -0.010), (25.0, 0.108, -0.013)])
def test_m4_scales_differ_and_are_named(temperature: float, free: float, seawater: float) -> None:
    found = solve(("ph_total_scale", "ph_free_scale", "ph_seawater_scale"), temperature=temperature)
    assert found["ph_free_scale"] - found["ph_total_scale"] == pytest.approx(free, abs=5e-4)
    assert found["ph_seawater_scale"] - found["ph_total_scale"] == pytest.approx(seawater, abs=5e-4)


def test_m4_every_output_names_its_scale(read: Any) -> None:
    keys = [key for key in FIELDS if key.startswith("ph_")]
    found = written(read("grid_single_cell", chemistry={"fields": keys}))
    assert found["ph_total_scale"].attrs["standard_name"] == "sea_water_ph_reported_on_total_scale"
    for key in keys:
        scale = key.split("_")[1]
        assert found[key].attrs["comment"].startswith(f"pH scale: {scale}"), key
        assert ("standard_name" in found[key].attrs) == (scale == "total")


def test_m4_a_ph_is_no_input(recipe_for: RecipeFor, tmp_path: Path) -> None:
    with pytest.raises(gridcarb.errors.RecipeError, match="no key 'ph'"):
        recipe_for([tmp_path / "model.nc"], inputs={"ph": "ph"})


def test_m6_the_example() -> None:
    """Twelve months of T 12 +- 7, DIC 2080 -+ 45, at alkalinity 2310: mean of the answers against answer of the mean."""
    season = np.cos(2.0 * np.pi * np.arange(12) / 12.0)
    months = solve(temperature=12.0 + 7.0 * season, dic=2080.0 - 45.0 * season, alkalinity=2310.0)
    year = solve(temperature=12.0, dic=2080.0, alkalinity=2310.0)
    means = [float(months[key].mean()) for key in ANSWERS]
    assert means == [pytest.approx(2.473, abs=5e-4), pytest.approx(8.1065, abs=5e-5), pytest.approx(338.9, abs=0.05)]
    assert [float(year[key]) for key in ANSWERS] == [
        pytest.approx(2.460, abs=5e-4), pytest.approx(8.1086, abs=5e-5), pytest.approx(337.7, abs=0.05)]
    hydrogen = -np.log10(np.mean(10.0 ** -months["ph_total_scale"]))
    assert hydrogen - means[1] == pytest.approx(-1.151 * float(months["ph_total_scale"].var()), rel=0.1)


def test_m6_chemistry_first_and_both_means_of_ph(read: Any) -> None:
    """Two months of one cell: each is solved by itself; their mean state is told apart from the mean of the answers."""
    outcome = read("grid_single_cell_column")
    found = written(outcome)
    truth = scene_of("grid_single_cell_column").truth
    assert found["ph_total_scale"].sizes["time"] == truth.sizes["time"] == 3
    comment = found["ph_total_scale"].attrs["comment"]
    assert "the value of the mean state, not the mean of the values" in comment
    assert found["ph_total_scale"].attrs["cell_methods"] == "time: mean"
    means = outcome.products["means"]["volume"]["fields"]["ph_total_scale"]
    assert means["ph_of_mean_hydrogen_ion"] < means["mean"]


def test_m7_one_set_a_run_named_in_every_output(read: Any, recipe_for: RecipeFor, tmp_path: Path) -> None:
    guide, practice = solve(constants="guide2007"), solve(constants="practice2022")
    assert practice["ph_total_scale"] - guide["ph_total_scale"] == pytest.approx(-0.006, abs=5e-4)
    assert practice["aragonite_saturation"] / guide["aragonite_saturation"] - 1 == pytest.approx(-0.012, abs=5e-4)
    assert practice["co2_fugacity"] - guide["co2_fugacity"] == pytest.approx(6.0, abs=0.5)
    with pytest.raises(gridcarb.errors.RecipeError, match=r"chemistry\.constants"):
        recipe_for([tmp_path / "model.nc"], chemistry={"constants": ["guide2007", "practice2022"]})
    for constants in ("guide2007", "practice2022"):
        outcome = read("grid_single_cell", chemistry={"fields": ["ph_total_scale"], "constants": constants})
        assert written(outcome).attrs["constants"] == constants
        assert json.loads(outcome.written["journal"].read_text())["constants"]["key"] == constants


def test_m8_outside_the_constants_is_computed_flagged_and_counted(read: Any) -> None:
    outcome = read("grid_raster")
    truth = scene_of("grid_raster").truth
    warm, salt = truth["temperature"], truth["salinity"]
    outside = int((((warm < 2) | (warm > 35) | (salt < 19) | (salt > 43)) & salt.notnull()).sum())
    assert outcome.status_counts["outside_validity"] == outside > 1000
    found = written(outcome)
    flag = dict(zip(found["solution_status"].attrs["flag_meanings"].split(), found["solution_status"].attrs["flag_values"],
                    strict=True))  # fmt: skip
    flagged = found["solution_status"] == flag["outside_validity"]
    assert int(flagged.sum()) == outside
    assert bool(found["ph_total_scale"].notnull().where(flagged, True).all())
    shares = outcome.products["means"]["volume"]["fields"]["solution_status"]
    assert 0.0 < shares["outside_validity"] < 1.0


def test_m11_months_since_is_refused_until_said(read: Any) -> None:
    with pytest.raises(InputError, match="no fixed length") as caught:
        read("time_months_since")
    assert "inputs: {months: calendar}" in caught.value.mend
    steps = {}
    for months in ("calendar", "mean"):
        found = written(read("time_months_since", inputs={"months": months}))
        assert found["time"].attrs["units"].startswith("days since 2010-11-01")
        steps[months] = found["time"].values
    assert np.abs(steps["calendar"] - steps["mean"]).max() > 0.3


@pytest.mark.parametrize("calendar", ["noleap", "360_day", "julian"])
def test_m11_a_calendar_is_kept(calendar: str, read: Any) -> None:
    found, given = written(read(f"time_calendar_{calendar}")), scene_of(f"time_calendar_{calendar}").dataset
    assert found["time"].attrs["calendar"] == calendar
    np.testing.assert_array_equal(found["time"], given["time"])


def test_m12_months_weigh_what_they_last(read: Any) -> None:
    """The same fields in two calendars: November counts 30 of 92 days, or 30 of 90."""
    means, monthly = {}, []
    for calendar in ("noleap", "360_day"):
        outcome = read(f"time_calendar_{calendar}", output={"precision": "float64"})
        means[calendar] = outcome.products["means"]["surface"]["fields"]["aragonite_saturation"]["mean"]
        rows = np.diff(np.sin(np.radians(scene_of("grid_raster").dataset["lat_bnds"])), axis=1)[:, 0]
        top = written(outcome)["aragonite_saturation"].isel(lev=0)
        monthly = top.weighted(xr.DataArray(rows, dims="lat")).mean(["lat", "lon"]).values
    assert means["noleap"] == pytest.approx(np.average(monthly, weights=[30, 31, 31]), rel=1e-12)
    assert means["360_day"] == pytest.approx(np.average(monthly), rel=1e-12)
    assert abs(means["noleap"] - means["360_day"]) > 1e-5


def test_m13_cells_that_the_floor_cuts(read: Any) -> None:
    """Whole cells down to the floor would be a sixth too much water; that they were assumed is told."""
    cut, whole = read("measures_raster"), read("grid_raster")
    assert sea(whole, "volume") / sea(cut, "volume") == pytest.approx(1.17, abs=0.01)
    assert "thickness_from_edges" in codes(whole)
    assert "thickness_from_edges" not in codes(cut)


def test_m14_copies_do_not_count(read: Any) -> None:
    """Fold and halo of this tripolar grid would be 1.65 % more sea than there is; files that give areas give theirs too."""
    once = read("measures_tripolar")
    scene = scene_of("measures_tripolar")
    repeats = scene.mesh.field(scene.mesh.repeats)
    wet = scene.truth["salinity"].notnull().any(["time", "lev"])
    with xr.open_dataset(once.plan.recipe.inputs.files[-1]) as fixed:
        area = fixed["areacello"].load().where(wet)
    assert "repeated_cells" in codes(once)
    assert sea(once) == pytest.approx(float(area.where(~repeats).sum()), rel=1e-12)
    assert float(area.sum()) / sea(once) == pytest.approx(1.0165, abs=1e-4)


def test_m14_no_areas_by_the_cosine_of_the_latitude(read: Any) -> None:
    """Without bounds and areas a grid with 2-D positions has no means; the cosine would be wrong, and is not used."""
    def bare(dataset: xr.Dataset) -> xr.Dataset:
        bent = dataset.drop_vars([name for name in dataset.variables if str(name).endswith(("bnds", "vertices", "bounds"))])
        for variable in bent.variables.values():
            variable.attrs.pop("bounds", None)
        return bent

    outcome = read("grid_tripolar_without_halo", bare)
    assert outcome.products["means"]["surface"] is None
    assert any("area" in code for code in codes(outcome))


def test_m14_a_global_claim_is_held_against_the_ocean(read: Any) -> None:
    assert sea(read("grid_raster", reading={"coverage": "global"})) == pytest.approx(3.6e14, rel=0.01)
    with pytest.raises(InputError, match=r"3\.6e14"):
        read("grid_raster", lambda dataset: dataset.isel(lat=slice(1, -4)), reading={"coverage": "global"})


def test_m17_sums_keep_their_digits() -> None:
    """A signal of 1e-4 on 35 in a million cells of single precision."""
    values = np.full(1_000_000, 35.0001, dtype=np.float32)
    cells = xr.Dataset({"temperature": ("cell", values)}, coords={
        "cell_area": ("cell", np.ones(values.size)), "sea": ("cell", np.ones(values.size, bool)),
        "top_level": ("cell", np.zeros(values.size, int))})
    tally = PRODUCTS["means"].start([FIELDS["temperature"]])
    tally.add(cells)
    mean = tally.report()["surface"]["fields"]["temperature"]["mean"]
    assert mean == pytest.approx(float(np.float32(35.0001)), rel=1e-14)
    single = np.cumsum(values, dtype=np.float32)[-1] / np.float32(values.size)
    assert abs(float(single) - mean) > 1e-4


def test_m17_single_precision_is_rounded_once(read: Any) -> None:
    single = written(read("grid_single_cell_column"))["ph_total_scale"].values
    double = written(read("grid_single_cell_column", output={"precision": "float64"}))["ph_total_scale"].values
    assert (single.dtype, double.dtype) == (np.float32, np.float64)
    np.testing.assert_array_equal(single, double.astype(np.float32))


def test_m18_fugacity_and_partial_pressure_and_their_units() -> None:
    assert units.conversion("Pa", "uatm").scale == pytest.approx(9.86923, abs=5e-6)
    for temperature, factor in ((0.0, 0.99560), (25.0, 0.99681)):
        found = solve(("co2_fugacity", "co2_partial_pressure"), temperature=temperature)
        assert found["co2_fugacity"] / found["co2_partial_pressure"] == pytest.approx(factor, abs=1e-5)
    for key, name in (("co2_fugacity", "fugacity_of_"), ("co2_partial_pressure", "partial_pressure_of_")):
        said = FIELDS[key].attributes()
        assert said["units"] == "uatm"
        assert str(said["standard_name"]).startswith(name)


def test_m19_the_definition_below_the_surface_is_written(read: Any) -> None:
    found = written(read("grid_single_cell_column", chemistry={"fields": ["co2_partial_pressure", "co2_fugacity"]}))
    for key in ("co2_partial_pressure", "co2_fugacity"):
        assert "in-situ temperature and 1 atm total pressure, at depth too" in found[key].attrs["comment"]
