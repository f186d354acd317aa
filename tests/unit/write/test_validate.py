from __future__ import annotations

import tracemalloc

import numpy as np
import pytest
import xarray as xr
from xarray.backends import BackendArray
from xarray.core.indexing import IndexingSupport, LazilyIndexedArray, explicit_indexing_adapter

from gridcarb.axes import Axes
from gridcarb.errors import OutputError
from gridcarb.write import netcdf, store
from gridcarb.write.coordinates import clean_coordinates, numbers
from gridcarb.write.coverage import geospatial
from gridcarb.write.validate import check_grid

AXES = Axes(None, None, ("y", "x"), None, None, "lat", "lon")


def plane(**changes: object) -> xr.Dataset:
    lat, lon = np.meshgrid(np.array([60.0, 70.0]), np.array([0.0, 10.0, 20.0]), indexing="ij")
    found = {
        "lat": (("y", "x"), lat, {"units": "degrees_north", "bounds": "lat_b"}),
        "lon": (("y", "x"), lon, {"units": "degrees_east"}),
        "lat_b": (("y", "x", "corner"), lat[..., None] + np.array([-5.0, -5.0, 5.0, 5.0])),
    }
    return xr.Dataset(coords=found | changes)


def mesh(nodes: object = None, **attrs: object) -> xr.Dataset:
    faces = np.array([[1, 2, 3, -9], [1, 3, 4, 2]], "i2") if nodes is None else nodes
    return xr.Dataset(coords={
        "mesh": ((), np.int32(0), {"cf_role": "mesh_topology", "topology_dimension": 2, "node_coordinates": "nx ny",
                                   "face_node_connectivity": "faces"}),
        "nx": ("node", np.arange(4.0)), "ny": ("node", np.arange(4.0)),
        "faces": (("face", "corner"), faces, {"start_index": 1, "_FillValue": np.int16(-9)} | attrs),
    })


CELLS = Axes(None, None, ("face",), None, None, None, None)


def test_a_sound_grid_has_nothing_to_tell() -> None:
    assert check_grid(plane(), AXES) == ()
    assert check_grid(mesh(), CELLS) == ()


@pytest.mark.parametrize(("ds", "axes", "told"), [
    (plane(lat=(("y", "x"), np.full((2, 3), 95.0))), AXES, "95 degrees lies beyond the pole"),
    (plane(lat=(("y", "x"), np.full((2, 3), 1.6), {"units": "radian"})), AXES, "beyond the pole"),
    (plane(lat_b=(("y", "x"), np.zeros((2, 3)))), AXES, "do not fit"),
    (plane(lat_b=(("y", "x", "corner"), np.zeros((2, 3, 2)))), AXES, "do not fit"),
    (plane(lat_b=(("corner", "edge"), np.zeros((2, 3)))), AXES, "do not fit"),
    (plane(y=("y", np.array([1.0, np.nan]))), AXES, "1 of its 2 numbers are missing"),
    (plane(y=("y", np.array([1, -9], "i4"), {"_FillValue": np.int32(-9)})), AXES, "1 of its 2 numbers are missing"),
    (mesh(start_index=0), CELLS, "run from 1 to 4, but there are 4"),
    (mesh(np.array([[0, 1, 2]])), CELLS, "run from 0 to 2"),
    (mesh(_FillValue=np.int16(-1)), CELLS, "run from -9"),
])
def test_what_cannot_be_written_is_refused_with_its_place(ds: xr.Dataset, axes: Axes, told: str) -> None:
    with pytest.raises(OutputError, match=told) as caught:
        check_grid(ds, axes)
    assert caught.value.where
    assert caught.value.mend


def test_what_is_left_behind_or_odd_is_told() -> None:
    ds = plane(lon=(("y", "x"), np.zeros((2, 3)), {"bounds": "lon_b"}))
    ds["lat_b"] = ds["lat_b"] + 20
    ds["temperature"] = (("y", "x"), np.zeros((2, 3)), {"grid_mapping": "crs: lat lon"})
    assert [notice.code for notice in check_grid(ds, AXES)] == [
        "grid.attribute_dropped", "grid.attribute_dropped", "grid.bounds_beyond_pole",
    ]


def test_masked_latitudes_on_land_pass_and_become_nan() -> None:
    lat = np.array([[1e20, 60.0], [70.0, 1e20]], "f4")
    ds = xr.Dataset(coords={"lat": (("y", "x"), lat, {"_FillValue": 1e20})})
    assert check_grid(ds, AXES) == ()
    kept = clean_coordinates(ds, AXES)["lat"]
    assert kept.attrs == {"standard_name": "latitude"}
    np.testing.assert_array_equal(numbers(kept), np.array([[np.nan, 60.0], [70.0, np.nan]], "f4"))


def test_packed_coordinates_stay_packed() -> None:
    attrs = {"scale_factor": 0.01, "add_offset": 10.0, "_FillValue": np.int16(-32768), "units": "degrees_north"}
    ds = xr.Dataset(coords={"lat": (("y", "x"), np.array([[-32768, 5000]], "i2"), attrs)})
    assert check_grid(ds, AXES) == ()
    kept = clean_coordinates(ds, AXES)["lat"]
    assert numbers(kept).dtype == "int16"
    assert kept.attrs["_FillValue"] == -32768
    assert geospatial(ds, AXES)["geospatial_lat_max"] == 60.0


def test_corners_come_last() -> None:
    ds = xr.Dataset(coords={"lat": ("cell", np.zeros(5), {"bounds": "b"}), "b": (("corner", "cell"), np.zeros((3, 5)))})
    assert clean_coordinates(ds, CELLS)["b"].dims == ("cell", "corner")


class Endless(BackendArray):
    """A large array that is made as it is read, and remembers the largest piece."""

    def __init__(self, shape: tuple[int, ...]) -> None:
        self.shape, self.dtype, self.largest = shape, np.dtype("f4"), 0

    def __getitem__(self, key: object) -> object:
        return explicit_indexing_adapter(key, self.shape, IndexingSupport.OUTER, self._read)

    def _read(self, key: tuple[object, ...]) -> object:
        found = np.broadcast_to(np.arange(self.shape[0], dtype="f4")[:, None, None] % 80, self.shape)[key]
        self.largest = max(self.largest, found.size)
        return found.astype("f4")


def test_large_coordinates_are_copied_in_pieces(tmp_path, grid) -> None:
    source = Endless((80, 1000, 1000))  # 320 MB
    ds = xr.Dataset(coords={"depth3d": xr.Variable(("t", "y", "x"), LazilyIndexedArray(source), {"_FillValue": 79.0})})
    tracemalloc.start()
    store.create(tmp_path / "r.zarr", template=ds, fields=(), axes=AXES, chunks={}, attributes={})
    netcdf.export(tmp_path / "r.zarr", tmp_path / "r.nc")
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert source.largest * 4 <= 16 * 2**20
    assert peak < 120e6
    with xr.open_dataset(tmp_path / "r.nc") as found:
        assert found["depth3d"].values[5, 3, 2] == 5.0
        assert np.isnan(found["depth3d"].values[79]).all()
