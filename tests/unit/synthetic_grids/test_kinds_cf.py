"""The kinds against the CF compliance checker: no complaint but those that are meant or that the checker owes."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from synthetic_grids import kinds

pytestmark = pytest.mark.kinds

NAMES = (
    "grid_raster_westward", "grid_tripolar_edge_fold", "grid_rotated_pole", "grid_triangles_from_1", "grid_polygons_from_0",
    "grid_cells_in_degrees", "grid_single_column", "grid_stations", "grid_casts", "vertical_height", "vertical_kilometres",
    "vertical_scalar_depth", "vertical_pressure_levels", "vertical_ocean_sigma", "vertical_ocean_s", "vertical_ocean_s_g1",
    "vertical_ocean_s_g2", "vertical_ocean_sigma_z", "vertical_ocean_double_sigma", "time_climatology", "time_scalar",
    "mask_packed", "measures_tripolar", "form_netcdf3_classic",
)

OWED = (
    r"not in the recommended order",  # horizontal dims without a coordinate variable are not known to it
    r"cf_role",  # it knows none of the roles of mesh topologies, which CF 1.11 takes over from UGRID 1.0
    r"should have standard_name='air_pressure'",  # pressure in the sea is a vertical coordinate too
    r"'layer_bnds' has attr 'formula_terms'",  # CF 1.11 section 7.1 asks for terms that name the bounds
    r"time_bnds specified by time should have at least two dimensions",  # a scalar has bounds of one dim
    r"cell_measures attribute .* is formatted incorrectly",  # it allows area or volume, the conventions both
    r"standard_name of `layer` must map to",  # double sigma: its formula gives depths, for which there is no such name
    r"recommended that the units_metadata",  # leap seconds
)


@pytest.fixture(scope="module")
def reports(tmp_path_factory: pytest.TempPathFactory) -> dict[str, list[str]]:
    checker = shutil.which("compliance-checker", path=str(Path(sys.executable).parent))
    assert checker, "the test extra installs compliance-checker"
    root = tmp_path_factory.mktemp("kinds")
    for name in NAMES:
        (root / name).mkdir()
        kinds.KINDS[name](root / name)
    report = root / "report.json"
    files = [str(path) for name in NAMES for path in sorted((root / name).iterdir())]
    subprocess.run([checker, "--test", "cf:1.11", "--format", "json_new", "--output", str(report), *files],
                   capture_output=True, text=True, check=False)
    found: dict[str, list[str]] = {}
    for path, entry in json.loads(report.read_text()).items():
        for level in ("high", "medium", "low"):
            for complaint in entry["cf:1.11"][f"{level}_priorities"]:
                found.setdefault(Path(path).parent.name, []).extend(complaint["msgs"])
    assert len(json.loads(report.read_text())) == len(files)
    return found


@pytest.mark.parametrize("name", NAMES)
def test_only_owed_complaints(name: str, reports: dict[str, list[str]]) -> None:
    assert not [text for text in reports.get(name, []) if not any(re.search(owed, text) for owed in OWED)]


def test_all_that_is_owed_occurs(reports: dict[str, list[str]]) -> None:
    """An entry that nothing needs any more must go."""
    everything = " ".join(text for texts in reports.values() for text in texts)
    assert not [owed for owed in OWED if not re.search(owed, everything)]
