"""Every kind of file the invented ocean comes in, by name: for tests that put each through the whole program.

`KINDS[name](folder)` writes the files of a kind and gives their paths; `scene_of(name)` gives the dataset as it is
written and the truth of every cell, `stated(name)` what the reader must be told because the files do not say it. Kinds
share points: `scene.cells()` of two kinds have equal keys where place, depth and time are the same.

A name is what is special, after what it is about: grid, vertical, time, mask, measures, form. All else is as in
`grid_raster`. All kinds but `mask_packed` hold the truth to the last bit.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import cache, lru_cache, partial
from pathlib import Path
from types import MappingProxyType

from synthetic_grids import masks, measures, plain_meshes, planes, times, unstructured, uprights
from synthetic_grids.forms import WRITERS, Splitting, write_netcdf, write_scene
from synthetic_grids.geography import sea_floor_depth
from synthetic_grids.parametric import PARAMETRIC
from synthetic_grids.scene import Mesh, Scene, Times, Upright, stage

Make = Callable[[], Scene]


@dataclass(frozen=True)
class Kind:
    """How a kind is made and written.

    stated : lines a recipe needs because the files leave something open, by section.
    measured : whether the fixed fields are written beside it.
    """

    make: Make
    form: str = "netcdf4"
    by: Splitting = "whole"
    stated: Mapping[str, object] = field(default_factory=lambda: MappingProxyType({}))
    measured: bool = False


def _scene(
    mesh: Callable[[], Mesh] = plain_meshes.raster, upright: Callable[[Mesh, Times], Upright] | None = None,
    when: Callable[[], Times] = times.monthly,
) -> Make:
    """A scene to be made later, of a raster, plain levels and months where nothing else is said."""
    def make() -> Scene:
        place, time = mesh(), when()
        return stage(place, upright(place, time) if upright else uprights.levels(), time)
    return make


@cache
def _plain() -> Scene:
    """The raster, plain levels and months: what the kinds that are about something else are made from."""
    return _scene()()


def _on_levels(**how: object) -> Callable[[Mesh, Times], Upright]:
    return lambda mesh, time: uprights.levels(**how)  # type: ignore[arg-type]


def _without_land(how: str) -> Mesh:
    mesh = planes.tripolar()
    land = sea_floor_depth(mesh.longitude, mesh.latitude) <= 0.0
    return planes.without_land_coordinates(mesh, land, how)  # type: ignore[arg-type]


def _casts() -> Scene:
    """A cast at each landmark, each at its own time, along one dim."""
    mesh = plain_meshes.scattered("profile", "profile_id")
    made = stage(mesh, uprights.levels(), times.of_each("profile", mesh.longitude.size))
    return made.with_dataset(made.dataset.assign_attrs(featureType="profile"))


def _dims_turned() -> Scene:
    """The dims of the tracers in the opposite order: lon, lat, lev, time."""
    made = _plain()
    return made.with_dataset(made.dataset.transpose("lon", "lat", "lev", "time", "bnds"))


GRIDS: dict[str, Callable[[], Mesh]] = {
    "raster": plain_meshes.raster,
    "raster_from_180_west": partial(plain_meshes.raster, -180.0),
    "raster_from_75_east": partial(plain_meshes.raster, 75.0),
    "raster_southward": partial(plain_meshes.raster, southward=True),
    "raster_westward": partial(plain_meshes.raster, -180.0, southward=True, westward=True),
    "raster_without_bounds": partial(plain_meshes.raster, bounds=False),
    "tripolar_edge_fold": planes.tripolar,
    "tripolar_centre_fold": partial(planes.tripolar, fold="centre", west=72.5, dims=("y", "x"), names=("lat", "lon")),
    "tripolar_edge_fold_at_sea": partial(planes.tripolar, south=True),
    "tripolar_centre_fold_at_sea": partial(planes.tripolar, south=True, fold="centre", dims=("y", "x"), west=-180.0),
    "tripolar_without_halo": partial(planes.tripolar, halo=False, west=-180.0, dims=("nlat", "nlon")),
    "tripolar_land_masked": partial(_without_land, "masked"),
    "tripolar_land_zero": partial(_without_land, "zero"),
    "bipolar": planes.bipolar,
    "rotated_pole": planes.rotated,
    "triangles_from_0": unstructured.triangles,
    "triangles_from_1": partial(unstructured.triangles, 1),
    "polygons_from_0": partial(unstructured.polygons, 0),
    "polygons_from_1": partial(unstructured.polygons, 1),
    "cells_in_degrees": unstructured.bounded_cells,
    "cells_in_radians": partial(unstructured.bounded_cells, "radians"),
    "single_column": plain_meshes.single_column,
    "single_cell_column": plain_meshes.single_cell,
    "stations": partial(plain_meshes.scattered, "station", "timeseries_id"),
}

VERTICALS: dict[str, Callable[[Mesh, Times], Upright]] = {
    "depth_from_bottom": _on_levels(from_bottom=True),
    "height": _on_levels(height=True, name="z"),
    "height_from_bottom": _on_levels(height=True, from_bottom=True, name="z"),
    "negative_depth_unsaid": _on_levels(height=True, says_positive=False, named=False, name="depth"),
    "centimetres": _on_levels(unit="cm", name="depth"),
    "kilometres": _on_levels(unit="km", name="depth"),
    "without_bounds": _on_levels(bounds=False, name="depth"),
    "pressure_levels": lambda mesh, time: uprights.pressure_levels(mesh),
    "pressure_field": lambda mesh, time: uprights.pressure_of_depths(mesh),
    "surface": lambda mesh, time: uprights.surface(),
    "scalar_depth": lambda mesh, time: uprights.scalar_depth(),
    "one_level": lambda mesh, time: uprights.one_level(),
    **PARAMETRIC,
}

TIMES: dict[str, Callable[[], Times]] = {
    **{f"calendar_{calendar}": partial(times.monthly, calendar) for calendar in times.CALENDARS},
    "stamps_at_start": partial(times.monthly, stamp="start"),
    "stamps_at_end": partial(times.monthly, stamp="end"),
    "without_bounds": partial(times.monthly, bounds=False),
    "climatology": times.climatology,
    "months_since": times.months_since,
    "scalar": times.scalar_time,
    "none": times.timeless,
}

SURFACE = MappingProxyType({"reading": {"depth": "surface"}})

REGISTER: dict[str, Kind] = {
    **{f"grid_{name}": Kind(_scene(mesh)) for name, mesh in GRIDS.items()},
    "grid_single_cell": Kind(_scene(plain_meshes.single_cell, lambda mesh, time: uprights.one_level(), times.scalar_time)),
    "grid_casts": Kind(_casts),
    "grid_dims_turned": Kind(_dims_turned),
    "grid_tripolar_sigma": Kind(_scene(planes.tripolar, PARAMETRIC["ocean_sigma"])),
    **{f"vertical_{name}": Kind(_scene(upright=upright), stated=SURFACE if name == "surface" else MappingProxyType({}))
       for name, upright in VERTICALS.items()},
    "vertical_pressure_column": Kind(
        _scene(plain_meshes.single_column, lambda mesh, time: uprights.pressure_of_depths(mesh))),
    **{f"time_{name}": Kind(_scene(when=when)) for name, when in TIMES.items()},
    **{f"mask_{name}": Kind(lambda clothing=clothing: masks.dressed_again(_plain(), clothing))  # type: ignore[misc]
       for name, clothing in masks.CLOTHINGS.items()},
    "mask_packed": Kind(lambda: masks.packed(_plain())),
    "mask_lacking_1_percent": Kind(lambda: masks.lacking(_plain(), "silicate", 0.01)),
    "mask_lacking_10_percent": Kind(lambda: masks.lacking(_plain(), "silicate", 0.10)),
    "measures_raster": Kind(lambda: measures.with_measures(_plain()), measured=True),
    "measures_tripolar": Kind(lambda: measures.with_measures(_scene(planes.tripolar)()), measured=True),
    "measures_polygons": Kind(lambda: measures.with_measures(_scene(unstructured.polygons)()), measured=True),
    **{f"form_{form}": Kind(_plain, form) for form in WRITERS},
    "form_file_a_year": Kind(_plain, by="year"),
    "form_file_a_variable": Kind(_plain, by="variable"),
    "form_file_a_year_and_variable": Kind(_plain, by="both"),
}
"""Every kind by name."""


@lru_cache(maxsize=8)
def scene_of(name: str) -> Scene:
    """The dataset of a kind exactly as it is written, and the truth; not to be changed in place."""
    return REGISTER[name].make()


def stated(name: str) -> Mapping[str, object]:
    """Sections of a recipe that the files of a kind need, such as {"reading": {"depth": "surface"}}."""
    return REGISTER[name].stated


def write_kind(name: str, folder: Path) -> list[Path]:
    """Write the files of a kind; the fixed fields, where there are any, come last and are called fixed.nc."""
    kind, scene = REGISTER[name], scene_of(name)
    files = write_scene(scene, folder, kind.form, kind.by)
    if kind.measured:
        files.append(write_netcdf(measures.fixed_fields(scene), folder / "fixed.nc"))
    return files


KINDS: dict[str, Callable[[Path], list[Path]]] = {name: partial(write_kind, name) for name in REGISTER}
"""Name -> function of a folder that writes the files of the kind there and gives their paths."""
