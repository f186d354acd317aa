"""Thickness of cells: as given, between edges cut by the sea floor, halfway; in every vertical clothing."""

from __future__ import annotations

import pickle
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import gsw
import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import UnitsError
from gridcarb.harmonise import clothe, understand
from gridcarb.harmonise.decisions import Understanding
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.harmonise.thickness import read_thickness, thickness

Ocean = Callable[..., xr.Dataset]
EDGES = np.array([0.0, 10.0, 200.0, 2000.0, 5000.0])
FULL = np.diff(EDGES)


def known(raw: xr.Dataset) -> Understanding:
    understanding = understand(raw, ReadingSettings(density="1026 kg m-3", temperature="in situ"))
    found = read_thickness(raw, understanding.axes, understanding.place.vertical)
    return replace(understanding, thickness=found.reading, decisions=found.decisions, notices=found.notices)


def thick(raw: xr.Dataset) -> xr.DataArray:
    found = thickness(raw, known(raw))
    assert found is not None
    return found


def codes(raw: xr.Dataset) -> list[str]:
    return [notice.code for notice in known(raw).notices]


def bounded(raw: xr.Dataset, factor: float = 1.0, **attrs: Any) -> xr.Dataset:
    sides = np.stack([EDGES[:-1], EDGES[1:]], axis=-1) * factor
    said = {**raw.depth.attrs, **attrs, "bounds": "depth_bnds"}
    return raw.assign_coords(depth=("depth", raw.depth.values * factor, said), depth_bnds=(("depth", "side"), sides))


def floor(raw: xr.Dataset, values: Any, **attrs: Any) -> xr.Dataset:
    place = np.broadcast_to(np.asarray(values, dtype=float), (raw.sizes["lat"], raw.sizes["lon"]))
    said = {"units": "m", "standard_name": "sea_floor_depth_below_geoid", **attrs}
    return raw.assign_coords(bottom=(("lat", "lon"), place, said))


def test_a_given_thickness_is_taken_as_it_is(ocean: Ocean) -> None:
    raw = bounded(ocean())
    given = np.arange(raw.dic.size, dtype=float).reshape(raw.dic.shape)
    given[:, :, 0, 0] = 1e20
    said = {"standard_name": "cell_thickness", "units": "cm", "_FillValue": 1e20}
    raw = raw.assign_coords(thick=(("time", "lat", "depth", "lon"), given.transpose(0, 2, 1, 3), said))
    found = thick(raw)
    assert found.dims == ("time", "depth", "lat", "lon")
    assert found.isel(lat=0, lon=0).isnull().all()
    assert float(found[1, 2, 3, 4]) == pytest.approx(given[1, 2, 3, 4] / 100)
    assert codes(raw) == []


def test_a_name_of_the_trade_will_do_where_nothing_else_is_said(ocean: Ocean) -> None:
    raw = ocean().assign_coords(thkcello=("depth", FULL, {"units": "m"}))
    assert thick(raw).values.tolist() == FULL.tolist()
    other = ocean().assign_coords(thkcello=("depth", FULL, {"units": "m", "standard_name": "ocean_layer_something"}))
    assert codes(other) == ["thickness_from_levels"]


def test_thickness_without_units_is_refused(ocean: Ocean) -> None:
    raw = ocean().assign_coords(thkcello=("depth", FULL, {}))
    with pytest.raises(UnitsError, match="missing"):
        known(raw)


@pytest.mark.parametrize(("factor", "attrs"), [
    (1.0, {"units": "m"}), (100.0, {"units": "cm"}), (0.001, {"units": "km"}),
    (-1.0, {"units": "m", "positive": "up", "standard_name": "height"}),
])
def test_between_the_edges_of_the_levels(ocean: Ocean, factor: float, attrs: dict[str, Any]) -> None:
    raw = bounded(ocean(), factor, **attrs)
    assert thick(raw).dims == ("depth",)
    np.testing.assert_allclose(thick(raw), FULL, rtol=1e-12)
    assert codes(raw) == ["thickness_from_edges"]
    np.testing.assert_allclose(thick(raw.isel(depth=slice(None, None, -1))), FULL[::-1], rtol=1e-12)


def test_the_sea_floor_cuts_the_cell_it_lies_in(ocean: Ocean) -> None:
    raw = floor(bounded(ocean()), 1500.0)
    np.testing.assert_array_equal(thick(raw)[:, 1, 1], [10.0, 190.0, 1300.0, 0.0])
    pressure = clothe(raw, known(raw)).sea_pressure
    np.testing.assert_array_equal(pressure, clothe(bounded(ocean()), known(bounded(ocean()))).sea_pressure)
    notice = known(raw).notices[0]
    assert (notice.code, "'bottom'" in notice.text) == ("thickness_from_edges", True)
    unknown = floor(bounded(ocean()), np.nan)
    np.testing.assert_array_equal(thick(unknown)[:, 1, 1], FULL)


def test_halfway_between_levels(ocean: Ocean) -> None:
    raw = ocean(depths=(5.0, 15.0, 35.0, 75.0))
    assert thick(raw).values.tolist() == [10.0, 15.0, 30.0, 40.0]
    assert codes(raw) == ["thickness_from_levels"]
    assert thick(raw.isel(depth=slice(None, None, -1))).values.tolist() == [40.0, 30.0, 15.0, 10.0]
    cut = thick(floor(raw, 30.0))[:, 2, 2]
    assert cut.values.tolist() == [10.0, 15.0, 5.0, 0.0]


def test_pressures_become_metres(ocean: Ocean) -> None:
    raw = bounded(ocean(), units="dbar", standard_name="sea_water_pressure_due_to_sea_water")
    found = thick(raw)
    assert found.dims == ("depth", "lat")
    wanted = -np.diff(gsw.z_from_p(EDGES[:, None], raw.lat.values[None, :]), axis=0)
    np.testing.assert_allclose(found, wanted, rtol=1e-12)


def test_depths_that_differ_from_cell_to_cell(ocean: Ocean) -> None:
    raw = ocean(depths=(5.0, 15.0, 35.0, 75.0))
    deep = raw.depth * xr.DataArray(np.linspace(1.0, 2.0, 6), dims="lon")
    raw = raw.drop_vars("depth").assign_coords(
        deep=(("depth", "lon"), deep.values, {"units": "m", "standard_name": "depth", "positive": "down"}))
    found = thick(raw)
    assert found.dims == ("depth", "lon")
    np.testing.assert_allclose(found[:, 5], [20.0, 30.0, 60.0, 80.0], rtol=1e-12)


def layered(ocean: Ocean, edges: bool) -> xr.Dataset:
    raw = ocean(depths=(1.0, 2.0, 3.0, 4.0)).drop_vars("depth").rename(depth="layer")
    sides = np.array([0.0, -0.25, -0.5, -0.75, -1.0])
    said = {"units": "1", "standard_name": "ocean_sigma_coordinate", "formula_terms": "sigma: layer eta: eta depth: bottom"}
    raw = floor(raw, 1000.0).assign_coords(
        layer=("layer", (sides[1:] + sides[:-1]) / 2, said), eta=("time", [0.0, 4.0], {"units": "m"}))
    if edges:
        raw.layer.attrs["bounds"] = "sides"
        raw = raw.assign_coords(sides=(("layer", "side"), np.stack([sides[:-1], sides[1:]], axis=-1),
                                       {"formula_terms": "sigma: sides eta: eta depth: bottom"}))
    return raw


@pytest.mark.parametrize("edges", [True, False])
@pytest.mark.parametrize("turned", [True, False])
def test_layers_that_follow_the_floor_swell_with_the_surface(ocean: Ocean, edges: bool, turned: bool) -> None:
    raw = layered(ocean, edges)
    found = thick(raw.isel(layer=slice(None, None, -1)) if turned else raw)
    assert found.dims == ("time", "layer", "lat", "lon")
    np.testing.assert_allclose(found.isel(time=0), 250.0, rtol=1e-12)
    np.testing.assert_allclose(found.isel(time=1), 251.0, rtol=1e-12)
    np.testing.assert_allclose(found.sum("layer").isel(time=1), 1004.0, rtol=1e-12)
    assert codes(raw) == ([] if edges else ["thickness_from_levels"])


def test_a_curve_without_edges_makes_halfway_of_it(ocean: Ocean) -> None:
    raw = layered(ocean, True)
    said = {**raw.layer.attrs, "standard_name": "ocean_s_coordinate_g2",
            "formula_terms": "s: layer C: curve eta: eta depth: bottom"}
    raw = raw.assign_coords(layer=("layer", raw.layer.values, said), curve=("layer", raw.layer.values, {"units": "1"}))
    raw.sides.attrs["formula_terms"] = "s: sides eta: eta depth: bottom"
    assert "thickness_from_levels" in codes(raw)
    np.testing.assert_allclose(thick(raw).isel(time=1), 251.0, rtol=1e-12)


def test_a_block_has_the_thickness_of_the_whole(ocean: Ocean) -> None:
    raw = layered(ocean, False)
    understanding = known(raw)
    part = {"time": slice(1, 2), "lat": slice(2, 5), "lon": slice(1, 3)}
    piece, whole = thickness(raw.isel(part), understanding), thickness(raw, understanding)
    assert piece is not None
    assert whole is not None
    assert np.ascontiguousarray(piece.values).tobytes() == np.ascontiguousarray(whole.isel(part).values).tobytes()
    assert thickness(raw.isel(layer=[1]), understanding) is None
    assert pickle.loads(pickle.dumps(understanding)) == understanding


def test_no_thickness_without_extent_or_question(ocean: Ocean) -> None:
    surface = ocean().isel(depth=0, drop=True)
    assert known(surface).thickness is None
    scalar = ocean().isel(depth=0)
    assert known(scalar).thickness is None
    within = scalar.assign_coords(
        depth=((), 5.0, {**scalar.depth.attrs, "bounds": "sides"}), sides=("side", np.array([0.0, 10.0])))
    assert float(thick(within)) == 10.0
    unasked = understand(ocean(), ReadingSettings())
    assert thickness(ocean(), unasked) is None
    assert "cell_thickness" not in clothe(ocean(), unasked)


def test_clothing_carries_it(ocean: Ocean) -> None:
    raw = floor(bounded(ocean()), 1500.0)
    found = clothe(raw, known(raw)).cell_thickness
    assert found.attrs["units"] == "m"
    np.testing.assert_array_equal(found, thick(raw))


def test_the_file_may_use_the_name_of_the_result(ocean: Ocean) -> None:
    raw = ocean().assign_coords(cell_thickness=("depth", FULL * 100, {"units": "cm", "standard_name": "cell_thickness"}))
    np.testing.assert_allclose(clothe(raw, known(raw)).cell_thickness, FULL, rtol=1e-12)
