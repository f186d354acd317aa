"""Maps of the invented ocean on every kind of grid: no smear, no hole, no copy on top, the same picture in any clothes."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import find_axes
from gridcarb.errors import InputError
from gridcarb.figures.cells import grid_of, outlines
from gridcarb.figures.choice import choose
from gridcarb.figures.columns import slice_at
from gridcarb.figures.drawing import theme
from gridcarb.figures.map import MapSettings, check
from synthetic_grids.clothes import MODEL_NAMES
from synthetic_grids.kinds import scene_of

from .conftest import Pixels, share

Picture = Callable[..., Pixels]
POINTERS = ("coordinates", "mesh", "location")
PLANES = ("grid_tripolar_edge_fold", "grid_tripolar_centre_fold", "grid_tripolar_without_halo", "grid_bipolar",
          "grid_rotated_pole")


def result_of(kind: str, *, bounds: bool = True) -> xr.Dataset:
    """Carbon and status on the grid of a scene, helpers beside them as a store gives them."""
    scene = scene_of(kind)
    axes = find_axes(scene.dataset)
    carbon = scene.truth["dic"].transpose(*axes.order).values
    kept = {key: text for key, text in scene.dataset["dissic"].attrs.items() if key in POINTERS}
    found = scene.dataset.copy(deep=True).drop_vars([name for name in MODEL_NAMES.values() if name in scene.dataset])
    if not bounds:
        for name in (axes.latitude, axes.longitude):
            found = found.drop_vars(found[name].attrs.pop("bounds"))
    return found.assign(
        dic=(axes.order, carbon, {"units": "umol kg-1", **kept}),
        solution_status=(axes.order, np.where(np.isnan(carbon), 2, 0).astype("i1"), kept),
    )


def flooded(ds: xr.Dataset) -> xr.Dataset:
    """One value everywhere."""
    return ds.assign(dic=ds["dic"].copy(data=np.full(ds["dic"].shape, 2050.0)),
                     solution_status=ds["solution_status"].copy(data=np.zeros(ds["dic"].shape, "i1")))


def painted(image: Pixels) -> float:
    """The share of pixels with the one colour of a flooded ocean: the most frequent one that is not paper."""
    colours, counts = np.unique(image.reshape(-1, 3), axis=0, return_counts=True)
    coloured = (colours < 250).any(axis=1)
    return float(counts[coloured].max() / counts.sum())


def unlike(one: Pixels, other: Pixels) -> float:
    return float((np.abs(one.astype(int) - other.astype(int)).max(axis=-1) > 40).mean())


@pytest.mark.parametrize("projection", ["global", "north", "south"])
@pytest.mark.parametrize("kind", PLANES)
def test_a_globe_of_water_has_no_hole(kind: str, projection: str, picture: Picture) -> None:
    """At the fold, at the seam and at the poles; from bounds and from corners halfway between centres."""
    words = {"projection": projection, "centre": 0, "limits": [2000, 2100]}
    whole = painted(picture(flooded(result_of("grid_raster")), **words))
    assert painted(picture(flooded(result_of(kind)), **words)) == pytest.approx(whole, rel=0.005)


@pytest.mark.parametrize("kind", ["grid_tripolar_edge_fold", "grid_tripolar_without_halo"])
def test_corners_between_centres_leave_no_hole_either(kind: str, picture: Picture) -> None:
    words = {"projection": "global", "centre": 40, "limits": [2000, 2100]}
    given, derived = (painted(picture(flooded(result_of(kind, bounds=bounds)), **words)) for bounds in (True, False))
    assert derived == pytest.approx(given, rel=0.03)  # the rim of so coarse a grid is a guess


@pytest.mark.parametrize("kind", ["grid_tripolar_edge_fold", "grid_tripolar_centre_fold", "grid_tripolar_without_halo"])
def test_nothing_is_smeared(kind: str, picture: Picture) -> None:
    """South of the fold a tripolar grid is the raster itself, so the pictures are alike, whatever is in the middle."""
    for centre in (0, 100):
        words = {"centre": centre, "projection": "global", "limits": [1900, 2200]}
        assert unlike(picture(result_of("grid_raster"), **words), picture(result_of(kind), **words)) < 0.03


def test_one_mesh_in_any_clothes_is_one_picture(picture: Picture) -> None:
    words = {"centre": 10, "projection": "global"}
    images = [picture(result_of(f"grid_{kind}"), **words)
              for kind in ("polygons_from_0", "polygons_from_1", "cells_in_degrees", "cells_in_radians")]
    assert np.array_equal(images[0], images[1])
    assert all(unlike(images[0], image) < 0.002 for image in images[2:])


def test_nodes_share_the_faces_among_them(picture: Picture) -> None:
    ds = result_of("grid_triangles_from_1")
    axes = find_axes(ds)
    found = outlines(grid_of(ds, axes), 0.0, uncut=False)
    assert set(found.owners) <= set(range(ds.sizes["node"]))
    assert len(set(found.owners) | set(found.ring_owners)) == len(np.unique(ds["face_nodes"]))
    words = {"centre": 10, "projection": "global", "limits": [2000, 2100]}
    triangles, polygons = (painted(picture(flooded(result_of(f"grid_{kind}")), **words))
                           for kind in ("triangles_from_1", "polygons_from_1"))
    assert 0.7 * polygons < triangles < polygons  # triangles end at the centres of the coastal cells


@pytest.mark.parametrize("kind", ["grid_tripolar_land_zero", "grid_tripolar_land_masked"])
@pytest.mark.parametrize("bounds", [True, False])
def test_land_without_position_is_left_out(kind: str, bounds: bool, picture: Picture) -> None:
    words = {"centre": 0, "projection": "global", "limits": [1900, 2200]}
    full, bare = picture(result_of("grid_tripolar_edge_fold"), **words), picture(result_of(kind, bounds=bounds), **words)
    sea = ~((full == 255).all(axis=-1) | (np.abs(full.astype(int) - [205, 200, 191]).max(axis=-1) < 4))
    assert (np.abs(full.astype(int) - bare.astype(int)).max(axis=-1) > 40)[sea].mean() < (0.02 if bounds else 0.12)


def test_an_empty_copy_does_not_hide_the_cell_below(picture: Picture) -> None:
    """Halo columns and the fold row are often masked."""
    ds = result_of("grid_tripolar_edge_fold")
    repeats = scene_of("grid_tripolar_edge_fold").mesh.repeats
    emptied = ds.assign(dic=ds["dic"].where(~xr.DataArray(repeats, dims=("j", "i"))))
    emptied["dic"].attrs = ds["dic"].attrs
    assert unlike(picture(ds, centre=0), picture(emptied, centre=0)) < 0.001


def test_a_region_across_the_date_line(picture: Picture) -> None:
    j, i = np.meshgrid(np.arange(12.0), np.arange(16.0), indexing="ij")
    lat, lon = 40 + 1.5 * j - 0.4 * i, (168 + 1.5 * i + 0.5 * j + 180) % 360 - 180
    ds = xr.Dataset(
        {"dic": (("y", "x"), np.full(lat.shape, 2050.0), {"units": "umol kg-1"})},
        {"lat": (("y", "x"), lat, {"standard_name": "latitude"}), "lon": (("y", "x"), lon, {"standard_name": "longitude"})},
        {"geography": "invented"},
    )
    west, east, south, north = grid_of(ds, find_axes(ds)).extent()
    assert (round(west), round(east)) == (167, 197)
    assert (round(south), round(north)) == (33, 57)
    near, world = painted(picture(ds)), painted(picture(ds, projection="global", centre=0, limits=[2000, 2100]))
    assert near > 0.3
    assert 0.001 < world < 0.02  # and no band around the globe


def test_stations_are_dots_and_columns_are_refused(picture: Picture) -> None:
    ds = result_of("grid_stations")
    dots = picture(ds, projection="global", centre=0)
    bare = picture(ds.assign(dic=ds["dic"] * np.nan), projection="global", centre=0)
    assert 0.001 < (dots != bare).any(axis=-1).mean() < 0.05
    alone = ds.isel(station=[0])
    assert grid_of(alone, find_axes(alone)).extent()[1] > grid_of(alone, find_axes(alone)).extent()[0]
    with pytest.raises(InputError, match="single column"):
        check(result_of("grid_single_column"), MapSettings.model_validate({"kind": "map", "field": "dic"}))


def test_casts_have_times_of_their_own() -> None:
    ds = result_of("grid_casts")
    assert choose(ds, "dic", 0, "first").moment.label.count(" to ") <= 1
    assert choose(ds, "dic", 0, "first").moment.slug == ""
    with pytest.raises(InputError, match="time of its own"):
        choose(ds, "dic", 0, "2010-11")


@pytest.mark.parametrize("kind", ["vertical_ocean_s_g2", "vertical_ocean_sigma", "grid_tripolar_sigma"])
def test_levels_that_follow_the_floor_are_told_by_pressure(kind: str, picture: Picture) -> None:
    ds = result_of(kind)
    settings = {"kind": "map", "field": "dic", "depth": 60}
    with pytest.raises(InputError, match="follow the sea floor") as caught:
        check(ds.drop_vars(["dic", "solution_status"]), MapSettings.model_validate(settings))
    assert "sea_pressure" in str(caught.value.mend)
    check(ds.drop_vars(["dic", "solution_status"]), MapSettings.model_validate(settings), ["dic", "sea_pressure"])
    top = choose(ds, "dic", 0, "first")
    depth = scene_of(kind).truth["depth"].broadcast_like(scene_of(kind).truth["dic"]).transpose(*find_axes(ds).order)
    upper = int(np.argmin(depth.isel(time=0).mean(depth.dims[2:]).values))
    assert (top.level.index, top.level.label, top.level.slug) == (upper, "top level", "top")
    assert share(picture(ds, depth=0), theme.LAND) > 0.05


@pytest.mark.parametrize("wanted", [10.0, 60.0, 200.0])
def test_the_nearest_level_of_each_column(wanted: float) -> None:
    """Against plain arithmetic in every column, depth of the cells told by pressure."""
    import gsw

    ds = result_of("vertical_ocean_s_g2")
    axes = find_axes(ds)
    truth = scene_of("vertical_ocean_s_g2").truth
    depth = truth["depth"].broadcast_like(truth["dic"]).transpose(*axes.order)
    north = truth["latitude"].broadcast_like(depth).transpose(*axes.order)
    ds["sea_pressure"] = (axes.order, gsw.p_from_z(-depth.values, north.values), {"units": "dbar"})
    found, ends = slice_at(ds, choose(ds, "dic", wanted, "first"))
    for place in np.ndindex(*found.shape):
        column, deep = ds["dic"].values[(0, slice(None), *place)], depth.values[(0, slice(None), *place)]
        wet = np.sort(deep[np.isfinite(column)])
        if wet.size and wet[-1] + (wet[-1] - wet[-2]) / 2 >= wanted:
            assert found.values[place] == column[np.nanargmin(np.where(np.isfinite(column), np.abs(deep - wanted), np.nan))]
            assert not ends[place]
        else:
            assert np.isnan(found.values[place])
            assert ends[place] == (wet.size > 0)


def test_depths_of_every_cell_need_no_pressure(picture: Picture) -> None:
    ds = result_of("vertical_pressure_field")
    choice = choose(ds, "dic", 100, "first")
    assert choice.level.within == choice.axes.vertical_coordinate
    assert share(picture(ds, depth=100), theme.LAND) > 0.05
