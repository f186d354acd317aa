"""Every kind of file: written, read back by plain libraries, and compared with the truth to the last bit."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from synthetic_grids import forms, kinds, masks
from synthetic_grids.clothes import FILL, MODEL_NAMES
from synthetic_grids.landmarks import DEPTHS, MERIDIANS, eastward, landmarks
from synthetic_grids.ocean import TRACERS, state
from synthetic_grids.scene import Scene, same_values


def opened(path: Path) -> xr.Dataset:
    group = "ocean/model" if path.parent.name.endswith("group") else None
    engine = "zarr" if path.suffix == ".zarr" else "netcdf4"
    extra = {"consolidated": False} if engine == "zarr" else {}
    with xr.open_dataset(path, decode_cf=False, group=group, engine=engine, **extra) as dataset:  # type: ignore[arg-type]
        return dataset.load()


def together(files: list[Path]) -> dict[str, np.ndarray | xr.DataArray]:
    """Each tracer of all files, years joined in order."""
    parts: dict[str, list[xr.DataArray]] = {}
    for path in files:
        dataset = opened(path)
        for name in MODEL_NAMES.values():
            if name in dataset:
                parts.setdefault(name, []).append(dataset[name])
    return {name: xr.concat(found, "time") if len(found) > 1 else found[0] for name, found in parts.items()}


@pytest.fixture(scope="module")
def raster() -> Scene:
    return kinds.scene_of("grid_raster")


@pytest.mark.parametrize("name", kinds.KINDS)
def test_files_hold_the_truth(name: str, tmp_path: Path) -> None:
    folder = tmp_path / name
    folder.mkdir()
    scene = kinds.scene_of(name)
    files = kinds.KINDS[name](folder)
    found = together([path for path in files if path.name != "fixed.nc"])
    for key in TRACERS:
        truth = scene.truth[key]
        values = found[MODEL_NAMES[key]].transpose(*truth.dims).values
        wet = truth.notnull().values
        assert wet.any()
        if name == "mask_packed":
            scale, offset = masks.PACKING[key]
            assert np.abs(values[wet] * scale + offset - truth.values[wet]).max() <= 0.5000001 * scale
        elif name.startswith("mask_lacking") and key == "silicate":
            share = np.mean(values[wet] != truth.values[wet])
            assert share == pytest.approx(int(name.split("_")[2]) / 100.0, abs=1e-4)
        else:
            assert values.dtype == np.float64
            np.testing.assert_array_equal(values[wet], truth.values[wet])
            assert not np.any(values[~wet] == state(0.0, 0.0, 0.0, 2010.0)[key])
            assert len(np.unique(values[~wet])) <= (2 if name == "mask_two_values" else 1)


@pytest.mark.parametrize("name", kinds.GRIDS)
def test_coordinates_lead_to_the_place_of_the_truth(name: str) -> None:
    scene = kinds.scene_of(f"grid_{name}")
    file, mesh = scene.dataset, scene.mesh
    land = scene.truth["salinity"].isnull().isel(time=0, lev=0).values
    for word, truth in (("latitude", mesh.latitude), ("longitude", mesh.longitude)):
        named = [key for key in file.variables if file[key].attrs.get("standard_name") == word
                 and set(file[key].dims) <= set(mesh.dims)]
        assert len(named) == 1
        written = file[named[0]]
        values = np.degrees(written.values) if written.attrs["units"] == "radian" else written.values
        if mesh.dims:
            values = xr.DataArray(values, dims=written.dims).broadcast_like(mesh.field(truth)).transpose(*mesh.dims).values
        sea = ~land if "land" in name else np.ones_like(land)
        canonical = eastward(values) if word == "longitude" else values
        np.testing.assert_allclose(canonical[sea], truth[sea], rtol=0.0, atol=1e-9)


@pytest.mark.parametrize("name", [
    "grid_tripolar_edge_fold", "grid_bipolar", "grid_rotated_pole", "grid_triangles_from_0", "grid_cells_in_radians",
    "grid_stations", "grid_single_column", "grid_casts", "vertical_ocean_sigma", "vertical_ocean_s", "vertical_height",
    "time_climatology", "time_scalar",
])
def test_kinds_share_points_with_the_same_values(name: str, raster: Scene) -> None:
    """The same place, depth and time: the same bits; and so many such points that a comparison means something."""
    shared = same_values(raster, kinds.scene_of(name))
    months = {"time_climatology": 2, "time_scalar": 1}.get(name, 3)
    fewest = {"grid_single_column": 1, "grid_bipolar": 15, "grid_rotated_pole": 15, "grid_casts": 16}.get(name, 50)
    first_month_alone = name.startswith("vertical_ocean")
    assert shared >= fewest * len(DEPTHS) * (1 if first_month_alone else months)


def test_differing_values_are_found(raster: Scene) -> None:
    """The comparison itself can fail."""
    other = kinds.scene_of("grid_single_column")
    wrong = other.truth.copy(deep=True)
    wrong["dic"].values[0, 0] += 1e-9
    changed = Scene(other.dataset, wrong, other.mesh, other.upright, other.times)
    with pytest.raises(AssertionError, match="dic differs at"):
        same_values(raster, changed)


def test_points_name_their_cells(raster: Scene) -> None:
    """Index, place, depth and time belong together: the ocean asked again at a point gives the cell."""
    tripolar = kinds.scene_of("grid_tripolar_edge_fold")
    cells = tripolar.cells()
    lon, lat = landmarks()[0]
    assert lon in MERIDIANS
    index = cells[lon, lat, 400.0, 2010 + 11.5 / 12.0]
    assert (index[0], index[1]) == (1, 4)
    for key in TRACERS:
        assert tripolar.truth[key].values[index] == state(lon, lat, 400.0, 2010 + 11.5 / 12.0)[key]
    assert tripolar.mesh.repeats is not None
    wet = tripolar.truth["salinity"].notnull().values
    assert len(list(tripolar.points())) == int((wet & ~tripolar.mesh.repeats).sum())
    assert max(Counter(point for _, point in raster.points()).values()) == 1


def test_files_are_split_as_named(tmp_path: Path) -> None:
    names = [path.name for path in kinds.KINDS["form_file_a_year_and_variable"](tmp_path)]
    assert len(names) == len(set(names)) == 12
    assert {"thetao_2010.nc", "talk_2011.nc"} <= set(names)
    assert [path.name for path in kinds.KINDS["form_file_a_year"](tmp_path)] == ["ocean_2010.nc", "ocean_2011.nc"]
    assert opened(tmp_path / "ocean_2010.nc").sizes["time"] == 2


@pytest.mark.parametrize(("form", "start"), [
    ("netcdf3_classic", b"CDF\x01"), ("netcdf3_64bit", b"CDF\x02"), ("netcdf4_classic", b"\x89HDF"),
    ("netcdf4", b"\x89HDF"),
])
def test_forms_are_what_they_are_called(form: str, start: bytes, tmp_path: Path) -> None:
    (path,) = forms.write_scene(kinds.scene_of("grid_single_cell"), tmp_path, form)
    assert path.read_bytes()[:4] == start


@pytest.mark.parametrize(("form", "marker"), [("zarr2", ".zgroup"), ("zarr3", "zarr.json")])
def test_stores_are_of_their_format(form: str, marker: str, tmp_path: Path) -> None:
    (path,) = forms.write_scene(kinds.scene_of("grid_single_cell"), tmp_path, form)
    assert (path / marker).exists()


def test_fill_values_say_what_they_should(raster: Scene) -> None:
    """The two awkward ones: a float32 fill that is not the double of the attribute, and two fills side by side."""
    other = masks.dressed_again(raster, masks.of_other_precision).dataset["talk"]
    dry = raster.truth["alkalinity"].isnull().values
    assert set(np.unique(other.values[dry])) == {float(np.float32(1e20))}
    assert other.attrs["_FillValue"] == FILL != float(np.float32(1e20))
    both = masks.dressed_again(raster, masks.two_values).dataset["talk"]
    assert {both.attrs["_FillValue"], both.attrs["missing_value"]} == set(np.unique(both.values[dry])) == {1e20, -999.0}
    silent = masks.dressed_again(raster, masks.zero).dataset["talk"]
    assert not {"_FillValue", "missing_value", "valid_range"} & set(silent.attrs)


def test_every_kind_is_small_and_says_that_it_is_invented() -> None:
    for name in kinds.GRIDS:
        assert kinds.scene_of(f"grid_{name}").dataset.nbytes < 3e6
        assert kinds.scene_of(f"grid_{name}").dataset.attrs["geography"] == "invented"
    assert kinds.stated("vertical_surface") == {"reading": {"depth": "surface"}}
    assert not kinds.stated("grid_raster")
