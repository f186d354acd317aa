"""How cells are weighed: on every kind of grid the invented ocean comes on, and on grids bent on purpose."""

from __future__ import annotations

import pickle

import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import InputError, UnitsError
from gridcarb.fields import ROLES
from gridcarb.harmonise import clothe, understand, weigh, weights
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.harmonise.sphere import RADIUS
from synthetic_grids.areas import polygon_area
from synthetic_grids.clothes import MODEL_NAMES
from synthetic_grids.kinds import scene_of
from synthetic_grids.sphere import RADIUS_KM

PLAIN = ReadingSettings(coverage="part")


def raw_of(name):
    """A kind as the sources would hand it over: roles, the rest as coordinates."""
    dataset = scene_of(name).dataset
    names = {MODEL_NAMES[role]: role for role in ROLES if MODEL_NAMES[role] in dataset}
    return dataset.rename(names).set_coords([each for each in dataset.data_vars if each not in names]).copy()


def weighed(raw, reading=PLAIN):
    return weigh(raw, understand(raw, reading), reading)


def areas(raw, reading=PLAIN, region=None):
    understanding = weighed(raw, reading)
    part = raw.isel(region or {})
    return weights(part, clothe(part, understanding), understanding, region or {})


def codes(understanding):
    return {notice.code for notice in understanding.notices}


def sea_area(found):
    top = found["top_level"]
    return float(found["cell_area"].where(top.isel({dim: 0 for dim in top.dims if dim == "time"}) >= 0).sum())


POLYGONS = [f"grid_{name}" for name in (
    "tripolar_edge_fold", "tripolar_centre_fold", "tripolar_without_halo", "tripolar_land_masked", "tripolar_land_zero",
    "bipolar", "rotated_pole", "cells_in_degrees", "cells_in_radians", "polygons_from_0", "polygons_from_1",
)]


@pytest.mark.parametrize("name", ["grid_raster", "grid_raster_westward", "grid_raster_without_bounds", *POLYGONS])
def test_the_sea_area_of_every_kind_is_that_of_its_cells_without_copies(name):
    mesh = scene_of(name).mesh
    truth = polygon_area(*mesh.corners) * (RADIUS / (1e3 * RADIUS_KM)) ** 2
    wet = scene_of(name).truth["salinity"].notnull()
    wet = wet.any([dim for dim in wet.dims if dim not in mesh.dims]).values
    counted = wet if mesh.repeats is None else wet & ~mesh.repeats
    found = sea_area(areas(raw_of(name)))
    # Sides along parallels are no great circles: boxes of 7.5 degrees differ a little from polygons.
    assert found == pytest.approx(truth[counted].sum(), rel=2e-4 if "raster" in name or "tripolar" in name else 1e-12)
    if mesh.repeats is not None and (mesh.repeats & wet).any():
        assert truth[wet].sum() > 1.01 * truth[counted].sum(), "copies would show"


@pytest.mark.parametrize("name", ["grid_tripolar_edge_fold", "grid_polygons_from_1", "grid_raster"])
def test_any_slice_of_a_grid_has_the_weights_of_the_whole(name):
    raw = raw_of(name)
    understanding = pickle.loads(pickle.dumps(weighed(raw)))
    whole = weights(raw, clothe(raw, understanding), understanding, {})
    last = scene_of(name).mesh.dims[-1]
    for region in ({last: slice(3, 9)}, {"time": slice(1, 2), last: slice(40, None)}):
        part = raw.isel(region)
        found = weights(part, clothe(part, understanding), understanding, region)
        assert found.keys() == whole.keys()
        for key, values in found.items():
            where = {dim: each for dim, each in region.items() if dim in whole[key].dims}
            assert np.array_equal(values.values, whole[key].isel(where).values, equal_nan=values.dtype.kind == "f")


def test_a_one_dimensional_grid_covers_the_sphere():
    raw = raw_of("grid_raster_without_bounds")
    assert float(areas(raw)["cell_area"].sum()) == pytest.approx(4 * np.pi * RADIUS**2, rel=1e-12)


def test_a_repeated_meridian_counts_once():
    raw = raw_of("grid_raster_without_bounds")
    around = xr.concat([raw, raw.isel(lon=[0]).assign_coords(lon=("lon", raw["lon"].values[:1] + 360, raw["lon"].attrs))],
                       "lon", data_vars="minimal", coords="minimal", compat="override", join="outer")
    understanding = weighed(around)
    assert "repeated_cells" in codes(understanding)
    assert sea_area(areas(around)) == pytest.approx(sea_area(areas(raw)), rel=1e-12)


def test_two_dimensional_coordinates_alone_give_no_area():
    raw = raw_of("grid_rotated_pole")
    for name in ("lat", "lon"):
        del raw[name].attrs["bounds"]
    understanding = weighed(raw)
    assert "no_cell_area" in codes(understanding)
    assert weights(raw, clothe(raw, understanding), understanding, {}) == {}
    with pytest.raises(InputError, match="cannot be checked"):
        weighed(raw, ReadingSettings(coverage="global"))


@pytest.mark.parametrize("name", ["grid_stations", "grid_single_column"])
def test_places_without_a_map_have_no_area_and_no_fuss(name):
    assert codes(weighed(raw_of(name))) == set()


@pytest.mark.parametrize(("units", "size"), [("m2", 1.0), ("km2", 1e-6), ("m^2", 1.0), ("cm2", 1e4)])
def test_areas_of_the_files_come_first_in_their_units(units, size):
    raw = raw_of("grid_tripolar_edge_fold")
    given = np.full(scene_of("grid_tripolar_edge_fold").mesh.longitude.shape, 5e10 * size)
    raw = raw.assign_coords(areacello=(("j", "i"), given, {"standard_name": "cell_area", "units": units}))
    found = areas(raw)["cell_area"]
    repeats = scene_of("grid_tripolar_edge_fold").mesh.repeats
    assert float(found.max()) == pytest.approx(5e10)
    assert int((found > 0).sum()) == int((~repeats).sum())


def test_measures_may_be_told_by_name():
    raw = raw_of("grid_raster")
    raw = raw.assign_coords(mine=(("lat", "lon"), np.full((raw.sizes["lat"], raw.sizes["lon"]), 3e10), {"units": "m2"}))
    understanding = understand(raw, PLAIN)
    assert weigh(raw, understanding, PLAIN).measures.kind == "boxes"
    told = weigh(raw, understanding, PLAIN, {"area": "mine", "basin": "nowhere"})
    assert float(weights(raw, clothe(raw, told), told, {})["cell_area"].max()) == 3e10
    assert "standard_name" not in raw["mine"].attrs


def test_areas_that_are_missing_zero_or_negative_do_not_count():
    raw = raw_of("grid_raster")
    lat, lon = raw.sizes["lat"], raw.sizes["lon"]
    given = np.full((lat, lon), 1e10)
    given[0], given[1], given[2] = 1e20, 0.0, -1.0
    wet = raw["salinity"].isel(time=0, lev=0).notnull() & (raw["salinity"].isel(time=0, lev=0) < 100)
    rows = [int(row) for row in np.flatnonzero(wet.any("lon"))[:2]]
    given[rows[0]], given[rows[1]] = 1e20, 0.0
    raw = raw.assign_coords(ours=(("lat", "lon"), given, {"units": "m2", "_FillValue": 1e20}))
    raw["temperature"].attrs["cell_measures"] = "area: ours"
    understanding = weighed(raw)
    assert "collapsed_cells" in codes(understanding)
    found = weights(raw, clothe(raw, understanding), understanding, {})["cell_area"]
    assert set(np.unique(found)) == {0.0, 1e10}
    assert not found.values[[0, 1, 2, *rows]].any()


def test_collapsed_cells_are_told_and_do_not_count():
    raw = raw_of("grid_cells_in_degrees")
    wet = np.flatnonzero((raw["salinity"].isel(time=0, lev=0) < 100).values)[:3]
    for name in ("lat", "lon"):
        bounds = raw[name].attrs["bounds"]
        values = raw[bounds].values.copy()
        values[wet] = values[wet][:, :1]
        raw[bounds] = raw[bounds].copy(data=values)
    understanding = weighed(raw)
    told = next(notice.text for notice in understanding.notices if notice.code == "collapsed_cells")
    assert told.startswith("3 sea cells have no area")
    assert not weights(raw, clothe(raw, understanding), understanding, {})["cell_area"].values[wet].any()


@pytest.mark.parametrize(("units", "whole"), [("%", 100.0), ("1", 1.0), ("", 1.0), ("percent", 100.0)])
def test_the_share_of_sea_takes_its_part(units, whole):
    raw = raw_of("grid_raster")
    plain = areas(raw)["cell_area"]
    share = raw.assign_coords(sftof=(("lat", "lon"), np.full(plain.shape, 0.25 * whole),
                                     {"standard_name": "sea_area_fraction", "units": units}))
    assert np.allclose(areas(share)["cell_area"], plain / 4, rtol=1e-15)
    share["sftof"].attrs["units"] = "m"
    with pytest.raises(UnitsError, match="not those of a fraction"):
        weighed(share)


def test_the_sea_of_a_global_grid_is_held_against_that_of_the_ocean():
    raw = raw_of("grid_raster")
    said = [str(decision) for decision in weighed(raw, ReadingSettings(coverage="global")).decisions]
    assert any("sea area" in each and "within 2 %" in each for each in said)
    water = raw.isel(time=[0], lev=[0], lat=[11], lon=[2])
    flooded = raw.assign({role: xr.full_like(raw[role], 1.0) * water[role].values for role in ROLES})
    assert "sea_area" in codes(weighed(flooded, ReadingSettings()))
    assert "sea_area" not in codes(weighed(flooded))
    with pytest.raises(InputError, match=r"5.10e14 m2, 41.\d% more"):
        weighed(flooded, ReadingSettings(coverage="global"))
    part = flooded.isel(lon=slice(0, 30))
    assert "sea_area" not in codes(weighed(part, ReadingSettings()))


def test_bounds_that_do_not_hold_their_centres_are_passed_over():
    raw = raw_of("grid_raster")
    plain = areas(raw)["cell_area"]
    raw["lon_bnds"] = raw["lon_bnds"] * 0.0
    assert np.allclose(areas(raw)["cell_area"], plain, rtol=1e-12)


def test_the_uppermost_sea_is_found_whichever_way_the_levels_run():
    down, up = raw_of("grid_raster"), raw_of("vertical_depth_from_bottom")
    one, other = areas(down)["top_level"], areas(up)["top_level"]
    assert set(np.unique(one)) == {-1, 0}
    assert set(np.unique(other)) == {-1, up["salinity"].shape[1] - 1}
    assert np.array_equal(one >= 0, other >= 0)


def test_steps_count_by_their_bounds():
    raw = raw_of("grid_raster")
    shares = areas(raw)["time_share"]
    lengths = np.diff(raw["time_bnds"].values, axis=1)[:, 0]
    assert len(set(lengths)) > 1
    assert np.allclose(shares, lengths / lengths.sum(), rtol=1e-15)
    assert np.allclose(areas(raw_of("time_without_bounds"))["time_share"], 1 / 3, rtol=1e-15)
    assert np.ptp(areas(raw_of("time_climatology"))["time_share"].values) == 0


def test_the_radius_of_the_grid_mapping_is_used():
    raw = raw_of("grid_raster").assign_coords(crs=((), 0, {"earth_radius": 6371229.0}))
    plain = areas(raw)["cell_area"]
    raw["temperature"].attrs["grid_mapping"] = "crs"
    assert np.allclose(areas(raw)["cell_area"] / plain, (6371229.0 / RADIUS) ** 2, rtol=1e-14)
