"""Fixed fields: areas that make a sea of 3.6e14 m2, partial cells down to the floor, volumes."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from synthetic_grids import grids, kinds, measures, plain_meshes, unstructured
from synthetic_grids.clothes import FILL
from synthetic_grids.geography import sea_floor_depth
from synthetic_grids.landmarks import EDGES


def fixed(name: str) -> xr.Dataset:
    made = measures.fixed_fields(kinds.scene_of(name))
    fields = [str(key) for key in made if made[key].attrs.get("_FillValue") == FILL]
    return made.assign({key: made[key].where(made[key] != FILL) for key in fields})


@pytest.mark.parametrize("name", ["measures_raster", "measures_tripolar", "measures_polygons"])
def test_sea_has_the_area_of_a_whole_planet(name: str) -> None:
    """Copies left out: within 1 % of 3.6e14 m2, which checks of global grids expect."""
    made, mesh = fixed(name), kinds.scene_of(name).mesh
    once = True if mesh.repeats is None else ~mesh.repeats
    assert float(made["areacello"].where(once).sum()) == pytest.approx(3.6e14, rel=0.01)
    assert bool((made["areacello"].notnull() == (made["sftof"] == 100.0)).all())
    assert bool((made["deptho"].notnull() == (made["basin"] > 0)).all())


def test_areas_agree_with_those_between_parallels() -> None:
    """Great circles instead of parallels change a cell of 7.5 degrees by less than 0.3 %."""
    by_parallels = grids.cell_area(grids.rectilinear(24, 48)).transpose("lat", "lon").values
    ratio = measures.cell_areas(plain_meshes.raster()).values / by_parallels
    assert 0.997 < ratio.min() < 0.998
    assert 1.001 < ratio.max() < 1.002


def test_lowest_cells_end_at_the_floor() -> None:
    """Every column adds up to the floor or to the lower edge of its lowest level with water; one column by hand."""
    scene, made = kinds.scene_of("measures_raster"), fixed("measures_raster")
    thick, floor = made["thkcello"], made["deptho"]
    count = thick.notnull().sum("lev")
    foot = np.minimum(np.array(EDGES)[count.values], floor)
    np.testing.assert_allclose(thick.sum("lev"), foot.where(count > 0, 0.0))
    row, column = (int(np.argmax(axis.values == value)) for axis, value in
                   ((scene.dataset["lat"], -56.25), (scene.dataset["lon"], 86.25)))
    depth = float(sea_floor_depth(86.25, -56.25))
    assert 4500.0 < depth < 5990.0
    assert thick[:, row, column].values.tolist() == [10.0, 30.0, 70.0, 80.0, 420.0, 380.0, 2020.0, depth - 3010.0]
    partial = thick < xr.DataArray(np.diff(EDGES), dims="lev")
    assert int(partial.sum()) > 200
    wet = scene.truth["salinity"].notnull().any("time")
    assert bool((thick.notnull() == wet).all())
    assert float(thick.min()) > 0.0
    np.testing.assert_allclose(made["volcello"], (thick * made["areacello"]).transpose(*made["volcello"].dims))


def test_levels_or_meshes_without_sides_are_refused() -> None:
    with pytest.raises(ValueError, match="no areas"):
        measures.cell_areas(unstructured.triangles())
    with pytest.raises(ValueError, match="no thickness"):
        measures.thickness(kinds.scene_of("vertical_ocean_sigma"))
    assert "thkcello" not in measures.fixed_fields(kinds.scene_of("vertical_ocean_sigma"))


def test_tracers_point_at_the_measures() -> None:
    scene = kinds.scene_of("measures_tripolar")
    assert scene.dataset["dissic"].attrs["cell_measures"] == "area: areacello volume: volcello"
    assert scene.dataset.attrs["external_variables"] == "areacello volcello"
    assert "cell_measures" not in kinds.scene_of("grid_tripolar_edge_fold").dataset["dissic"].attrs
