"""Every kind of file through `gridcarb audit`: what can be read has no stop, and the recipe it writes is one that runs."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from click.testing import CliRunner, Result

import gridcarb
from gridcarb.cli.main import main
from gridcarb.cli.progress import watcher
from gridcarb.errors import InputError
from gridcarb.recipe import load
from gridcarb.run import conduct, prepare
from synthetic_grids.kinds import KINDS, scene_of
from tests.integration.conftest import RecipeFor

pytestmark = pytest.mark.kinds

STOPPED = {
    "mask_lacking_10_percent": "missing in different places",
    "time_months_since": "no fixed length",
}
RUN = (
    "grid_raster_from_75_east", "grid_tripolar_edge_fold", "grid_triangles_from_1", "grid_polygons_from_0",
    "grid_cells_in_radians", "grid_single_column", "grid_single_cell", "grid_stations", "vertical_pressure_levels",
    "vertical_ocean_s_g2", "time_climatology", "time_none", "mask_silent_minus_999", "measures_tripolar",
    "form_netcdf4_group", "form_zarr2", "form_file_a_year_and_variable",
)
"""The kinds whose recipes are carried out as well."""


def audit(*words: object) -> Result:
    return CliRunner().invoke(main, ["audit", *map(str, words)])


@pytest.mark.parametrize("kind", [name for name in KINDS if name not in STOPPED])
def test_the_audit_has_no_stop_and_its_recipe_can_be_used(kind: str, tmp_path: Path) -> None:
    files = KINDS[kind](tmp_path)
    place = tmp_path / "starter.yaml"
    result = audit(*files, "--recipe-out", place, "--quiet")
    assert result.exit_code == 0, result.output
    recipe = load(place)
    plan = prepare(recipe)
    assert not [finding for finding in plan.findings if finding.level == "stop"]
    if kind in RUN:
        outcome = conduct(plan, watcher(quiet=True))
        wet = int(scene_of(kind).truth["salinity"].notnull().sum())
        assert outcome.status_counts["solved"] + outcome.status_counts["outside_validity"] == wet


@pytest.mark.parametrize("kind", STOPPED)
def test_what_cannot_be_read_is_stopped_with_the_cure(kind: str, tmp_path: Path, recipe_for: RecipeFor) -> None:
    files = KINDS[kind](tmp_path)
    result = audit(*files)
    assert result.exit_code == 3
    assert STOPPED[kind] in " ".join(result.output.split())
    with pytest.raises(InputError, match=STOPPED[kind]) as caught:
        prepare(recipe_for(files))
    assert caught.value.mend


def test_an_axis_called_pressure_for_the_lazy_face() -> None:
    """Its name is not in the way of the pressure of the cells."""
    given = scene_of("vertical_pressure_levels").dataset
    found = gridcarb.derive(given, ["ph_total_scale", "sea_pressure"])
    assert found["ph_total_scale"].dims == ("time", "pressure", "lat", "lon")
    levels = xr.broadcast(given["pressure"], found["sea_pressure"])[0].transpose(*found["sea_pressure"].dims)
    np.testing.assert_array_equal(found["sea_pressure"], levels)
    np.testing.assert_array_equal(found["pressure"], given["pressure"])
