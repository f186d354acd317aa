"""The main job on every kind of file the invented ocean comes in: the same cell gives the same answer to the last bit.

What a run writes is held against `gridcarb.speciate` on the truth of the scene, and against the run on the plain raster
at all points the two share. Wider than the last bit are only: `vertical_ocean_s`, whose terms are right to 1e-12; levels
under a sea surface that has risen or sunk, where the order of a sum shows; latitudes in radians.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import gsw
import numpy as np
import pytest
import xarray as xr

import gridcarb
from gridcarb.run.conduct import Outcome
from synthetic_grids.clothes import MODEL_NAMES
from synthetic_grids.kinds import KINDS, scene_of, stated
from synthetic_grids.masks import PACKING
from synthetic_grids.measures import cell_areas, fixed_fields
from synthetic_grids.ocean import TRACERS
from synthetic_grids.scene import Scene
from synthetic_grids.uprights import MIDDLES
from tests.integration.conftest import Run

FIELDS = ("ph_total_scale", "aragonite_saturation", "co2_fugacity")
INPUTS = ("temperature", "alkalinity", "sea_pressure")
CHEMISTRY = {"fields": [*FIELDS, *INPUTS]}

STATED: Mapping[str, Mapping[str, Any]] = {"time_months_since": {"inputs": {"months": "calendar"}}}
REFUSED = "mask_lacking_10_percent"
READ = [name for name in KINDS if name != REFUSED]
ALMOST = {"vertical_ocean_s": 1e-11, "grid_cells_in_radians": 1e-12}
NOVEMBER_TO_JANUARY = [30.0, 31.0, 31.0]
SHARES_NOTHING = ("vertical_surface", "vertical_pressure_levels")
RISEN = 1e-12
"""Of cells under a moved sea surface."""


def sections(kind: str) -> dict[str, Any]:
    return {**stated(kind), **STATED.get(kind, {}), "chemistry": CHEMISTRY}


def surface_height(scene: Scene) -> xr.DataArray:
    """Height of the sea surface above the datum in m, 0 where the scene has none."""
    if "surface" not in scene.dataset:
        return xr.DataArray(0.0)
    surface = scene.dataset["surface"]
    return surface.where(surface != surface.attrs["_FillValue"]).drop_attrs()


def under_a_still_surface(kind: str) -> np.ndarray:
    """Of every cell, whether the sea surface above it lies at the datum."""
    salinity = scene_of(kind).truth["salinity"]
    height: xr.DataArray = surface_height(scene_of(kind)).broadcast_like(salinity)
    return np.asarray(height.transpose(*salinity.dims) == 0.0)


def state_of(kind: str) -> dict[str, xr.DataArray]:
    """What `speciate` takes, for every cell of a kind, from its truth alone."""
    scene = scene_of(kind)
    truth = scene.truth
    below = truth["depth"] + surface_height(scene)
    pressure = xr.apply_ufunc(lambda depth, lat: gsw.p_from_z(-depth, lat), below, truth["latitude"])
    state = {**{key: truth[key] for key in TRACERS}, "pressure": pressure}
    if kind == "vertical_pressure_levels":
        state["pressure"] = xr.DataArray(MIDDLES, dims="pressure")
    if kind == "mask_packed":
        for key, (scale, offset) in PACKING.items():
            state[key] = (scene.dataset[MODEL_NAMES[key]] * scale + offset).where(truth[key].notnull())
    if kind.startswith("mask_lacking"):
        state["silicate"] = truth["silicate"].where(scene.dataset[MODEL_NAMES["silicate"]] != 1e20)
    dims = truth["salinity"].dims
    return {key: values.transpose(*dims) for key, values in zip(state, xr.broadcast(*state.values()), strict=True)}


def expected(kind: str) -> dict[str, np.ndarray]:
    """The fields of every cell, NaN without water, and the inputs as they are to be understood."""
    state = state_of(kind)
    arrays = {key: values.values for key, values in state.items()}
    solved = gridcarb.speciate(**arrays, fields=FIELDS)
    return {**solved, "temperature": arrays["temperature"], "alkalinity": arrays["alkalinity"],
            "sea_pressure": arrays["pressure"]}


def opened(outcome: Outcome, what: str) -> xr.Dataset:
    """The store or the NetCDF file of a result as it stands, loaded."""
    path = outcome.written[what]
    words: dict[str, Any] = {"engine": "zarr", "consolidated": False, "chunks": None} if path.suffix == ".zarr" else {}
    with xr.open_dataset(path, decode_cf=False, **words) as dataset:
        return dataset.load()


def assert_true(kind: str, wanted: Mapping[str, np.ndarray], found: xr.Dataset) -> None:
    """Every cell with water has the value of the truth, every other none."""
    wet, still = scene_of(kind).truth["salinity"].notnull(), under_a_still_surface(kind)
    assert wet.any()
    for key, want in wanted.items():
        values = found[key].transpose(*wet.dims).values
        assert values.dtype == np.float64
        if key not in INPUTS:
            assert np.isnan(values[~wet.values]).all(), key
        exact = wet.values & still & (kind not in ALMOST)
        np.testing.assert_array_equal(values[exact], want[exact], err_msg=key)
        rest = wet.values & ~exact
        np.testing.assert_allclose(values[rest], want[rest], rtol=ALMOST.get(kind, RISEN), err_msg=key)


def assert_grid_is_kept(kind: str, found: xr.Dataset) -> None:
    """Coordinates, bounds, topology, terms: every variable that is no tracer is there, to the bit, with what it says."""
    given = scene_of(kind).dataset
    if kind == "time_months_since":  # no reader knows such a time: it is written as days
        assert found["time"].attrs["units"] == "days since 2010-11-01"
        assert found["time"].values.tolist() == [15.0, 45.5, 76.5]
        given = given.drop_vars("time")
    for name, variable in given.variables.items():
        if name in MODEL_NAMES.values():
            continue
        kept = found.variables[name]
        assert kept.dims == variable.dims, name
        if not kind.startswith("form_netcdf3"):  # which has no 64-bit integers
            assert kept.dtype == variable.dtype, name
        values = variable.values
        if "_FillValue" in variable.attrs and variable.dtype.kind == "f":  # results have one mark for what is missing, NaN
            values = np.where(values == variable.attrs["_FillValue"], np.nan, values)
        np.testing.assert_array_equal(kept.values, values, err_msg=str(name))
        for key, said in variable.attrs.items():
            if key != "_FillValue":
                np.testing.assert_array_equal(kept.attrs[key], said, err_msg=f"{name}: {key}")


def counted_areas(kind: str) -> xr.DataArray:
    """Area of the sea cells in m2, 0 for copies: as the fixed fields have it, or of polygons of great circles."""
    scene = scene_of(kind)
    wet = scene.truth["salinity"].notnull()
    sea = wet.any([dim for dim in wet.dims if dim not in scene.mesh.dims])
    if scene.mesh.repeats is not None:
        sea = sea & ~scene.mesh.field(scene.mesh.repeats)
    area = fixed_fields(scene)["areacello"] if kind.startswith("measures") else cell_areas(scene.mesh)
    return area.where(sea, 0.0)


@pytest.fixture(scope="module")
def raster() -> dict[tuple[float, ...], tuple[float, ...]]:
    """Place, depth and time -> the answers at the points of the plain raster, worked out from the truth."""
    want, scene = expected("grid_raster"), scene_of("grid_raster")
    return {point: tuple(want[key][index] for key in FIELDS) for index, point in scene.points()}


def assert_same_as(raster: dict[tuple[float, ...], tuple[float, ...]], kind: str, found: xr.Dataset) -> None:
    """At every point the two share, unless the sea has risen there since: a depth is counted from the datum."""
    scene, still = scene_of(kind), under_a_still_surface(kind)
    values = [found[key].transpose(*scene.truth["salinity"].dims).values for key in FIELDS]
    shared = [(index, point) for index, point in scene.points() if point in raster and still[index]]
    assert shared or kind in SHARES_NOTHING
    for index, point in shared:
        assert tuple(part[index] for part in values) == raster[point], point


@pytest.mark.parametrize("kind", READ)
def test_the_same_cell_gives_the_same_answer(kind: str, tmp_path: Path, run: Run, raster: dict) -> None:
    outcome = run(KINDS[kind](tmp_path), **sections(kind))
    wanted = expected(kind)
    for what in ("Zarr store", "NetCDF file"):
        found = opened(outcome, what)
        assert_true(kind, wanted, found)
        assert_grid_is_kept(kind, found)
    if kind not in (*ALMOST, "mask_packed", "mask_lacking_1_percent"):
        assert_same_as(raster, kind, found)
    wet = int(np.isfinite(found["ph_total_scale"].values).sum())
    assert outcome.status_counts["solved"] + outcome.status_counts["outside_validity"] == wet
    assert_means(kind, outcome, wanted)


def assert_means(kind: str, outcome: Outcome, wanted: Mapping[str, np.ndarray]) -> None:
    """The sea has its area, and the mean pH at its top is that of its cells, each place counted once."""
    surface = outcome.products["means"]["surface"]
    if scene_of(kind).mesh.corners is None:
        assert surface is None or kind == "grid_raster_without_bounds"
        told = "no_cell_area" in {notice.code for notice in outcome.notices}
        assert told == kind.startswith("grid_triangles")  # stations and columns need no areas
        return
    area = counted_areas(kind)
    exact = kind.startswith("measures")
    assert surface["sea"] == pytest.approx(float(area.sum()), rel=1e-12 if exact else 3e-3)
    dims = scene_of(kind).truth["salinity"].dims
    vertical = [dim for dim in dims if dim not in (*scene_of(kind).mesh.dims, "time")]
    top = xr.DataArray(wanted["ph_total_scale"], dims=dims)
    top = top.isel(dict.fromkeys(vertical, -1 if kind.endswith("from_bottom") else 0))
    lengths = xr.DataArray(NOVEMBER_TO_JANUARY, dims="time") if top.sizes.get("time") == 3 else xr.DataArray(1.0)
    mean = float(top.weighted(area * lengths).mean())
    assert surface["fields"]["ph_total_scale"]["mean"] == pytest.approx(mean, abs=1e-12 if exact else 1e-3)
