"""Results on every kind of grid: whatever describes the grid comes back as it was, and the checker has nothing to say.

What the checker says wrongly is listed with the reason; everything else fails.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

import gridcarb.chemistry  # noqa: F401  puts the derived fields into the catalogue
from gridcarb.axes import find_axes
from gridcarb.fields import FIELDS
from gridcarb.write import netcdf, store
from gridcarb.write.attributes import global_attributes
from gridcarb.write.validate import check_grid
from synthetic_grids.clothes import MODEL_NAMES
from synthetic_grids.kinds import scene_of

pytestmark = pytest.mark.kinds

KINDS = (
    "grid_raster_southward", "grid_tripolar_edge_fold", "grid_tripolar_centre_fold", "grid_tripolar_land_masked",
    "grid_tripolar_land_zero", "grid_rotated_pole", "grid_triangles_from_1", "grid_polygons_from_0", "grid_polygons_from_1",
    "grid_cells_in_radians", "grid_single_column", "grid_single_cell", "grid_stations", "grid_casts", "grid_tripolar_sigma",
    "vertical_ocean_s_g2", "vertical_ocean_sigma_z", "vertical_pressure_field", "vertical_scalar_depth",
    "vertical_height_from_bottom", "time_climatology", "time_calendar_standard", "time_scalar", "measures_tripolar",
    "measures_polygons",
)

EXCUSED = {
    "§2.4 Dimensions: .* recommended order": (
        "it knows a dimension without coordinate variable for no part of space and wants it before the vertical"
    ),
    "§7.1 Cell Boundaries: .* lie outside the bounding box": "the corners of a cell that holds the pole lie south of it",
    "§7.1 Cell Boundaries: Boundary variable time_bnds .* at least two dimensions": (
        "bounds of a scalar coordinate have one dimension, CF 1.11, section 7.1"
    ),
    "§7.1 Cell Boundaries: .* has attr 'formula_terms'": "the terms of bounds name bounds, CF 1.11, section 7.1",
    "§9.5 Coordinates and metadata: .* cf_role": "UGRID names the parts of a mesh by cf_role, and CF 1.11 takes it over",
    "§4.3 Vertical Coordinate: §4.3.3 .* computed_standard_name": "optional, CF 1.11, section 4.3.3",
    "§4.3 Vertical Coordinate: layer's formula_terms are invalid for ocean_sigma_z": "it reads CF 1.6",
    "§5.6 .* (floor|surface) has no coordinate": "terms of the vertical coordinate: their place is that of its fields",
    "§7.2 Cell Measures: .* formatted incorrectly": "it knows one measure, CF 1.11, section 7.2, any number",
    "§4.[12] (Lat|Long)itude Coordinate: .* valid units": "radians stay radians: numbers are not touched",
}


def template_of(kind: str) -> xr.Dataset:
    """The grid of a scene as the sources hand it on: tracers under their roles, all the rest coordinates."""
    ds = scene_of(kind).dataset
    roles = {name: role for role, name in MODEL_NAMES.items() if name in ds}
    return ds.rename(roles).set_coords([name for name in ds.variables if name not in roles])


def attributes_of(template: xr.Dataset) -> dict[str, object]:
    axes, fields = find_axes(template), [FIELDS["ph_total_scale"]]
    now = datetime(2020, 1, 2, tzinfo=UTC)
    return global_attributes(title="Test", template=template, axes=axes, fields=fields, now=now)


def write(kind: str, folder: Path, zarr_format: int = 3) -> xr.Dataset:
    template = template_of(kind)
    axes, fields = find_axes(template), [FIELDS["ph_total_scale"], FIELDS["solution_status"]]
    check_grid(template, axes)
    store.create(folder / "r.zarr", template=template, fields=fields, axes=axes, chunks={},
                 attributes=attributes_of(template), zarr_format=zarr_format)
    ph = np.full([template.sizes[dim] for dim in axes.order], 8.0)
    ph[..., -1:] = np.nan
    store.write_block(folder / "r.zarr", {}, xr.Dataset({
        "ph_total_scale": (axes.order, ph), "solution_status": (axes.order, np.zeros(ph.shape, "int8")),
    }))
    netcdf.export(folder / "r.zarr", folder / "r.nc")
    return template


@pytest.mark.parametrize("kind", KINDS)
def test_the_checker_finds_nothing_wrong(kind: str, tmp_path: Path, complaints: Callable[[Path], list[str]]) -> None:
    write(kind, tmp_path)
    found = [message for message in complaints(tmp_path / "r.nc") if not any(re.match(said, message) for said in EXCUSED)]
    assert found == []


def opened(folder: Path) -> Iterator[xr.Dataset]:
    """Both results without any decoding."""
    with xr.open_zarr(folder / "r.zarr", decode_cf=False, consolidated=False, chunks=None) as found:
        yield found
    with xr.open_dataset(folder / "r.nc", decode_cf=False) as found:
        yield found


@pytest.mark.parametrize("zarr_format", [2, 3])
@pytest.mark.parametrize("kind", KINDS)
def test_the_grid_comes_back_as_it_was(kind: str, zarr_format: int, tmp_path: Path) -> None:
    template = write(kind, tmp_path, zarr_format)
    for found in opened(tmp_path):
        for name, coord in template.coords.items():
            kept = found[name]
            assert kept.dims == coord.dims
            assert kept.dtype == coord.dtype or coord.dtype.kind in "US"
            same = kept.values == coord.values
            if coord.dtype.kind == "f":
                fills = [coord.attrs[key] for key in ("_FillValue", "missing_value") if key in coord.attrs]
                filled = np.isin(coord.values, np.asarray(fills, dtype=coord.dtype))
                same = np.where(np.isnan(kept.values), filled | np.isnan(coord.values), same)
            assert np.all(same), name
            for key, value in coord.attrs.items():
                if key not in ("_FillValue", "missing_value", "coordinates"):
                    assert np.all(kept.attrs[key] == value), (name, key)


@pytest.mark.parametrize("kind", ["grid_polygons_from_0", "grid_polygons_from_1", "grid_triangles_from_1"])
def test_fields_lie_on_their_mesh(kind: str, tmp_path: Path) -> None:
    template = write(kind, tmp_path)
    for found in opened(tmp_path):
        ph, mesh = found["ph_total_scale"].attrs, str(template["temperature"].attrs["mesh"])
        assert (ph["mesh"], ph["location"]) == (mesh, template["temperature"].attrs["location"])
        assert set(ph["coordinates"].split()) == set(template["temperature"].attrs["coordinates"].split())
        assert found.attrs["Conventions"].endswith("UGRID-1.0")
        connectivity = found[found[mesh].attrs["face_node_connectivity"]]
        assert connectivity.dtype.kind == "i"
        assert connectivity.attrs["start_index"] == int(kind[-1])


def test_measures_and_terms_are_no_auxiliary_coordinates(tmp_path: Path) -> None:
    template = write("measures_tripolar", tmp_path)
    for found in opened(tmp_path):
        assert template.coords.keys() <= set(found.variables)
        assert "areacello" in found["ph_total_scale"].attrs["cell_measures"]
        assert set(found["ph_total_scale"].attrs["coordinates"].split()) <= {"latitude", "longitude", "basin"}


def test_measures_of_another_file_are_external(tmp_path: Path) -> None:
    template = template_of("measures_tripolar")
    names = re.findall(r":\s*(\S+)", template["temperature"].attrs["cell_measures"])
    bare = template.drop_vars([name for name in names if name in template])
    assert attributes_of(bare)["external_variables"] == " ".join(names)
