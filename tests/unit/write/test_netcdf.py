from __future__ import annotations

import shutil
import subprocess
import threading
import tracemalloc

import netCDF4
import numpy as np
import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st

from gridcarb.errors import OutputError
from gridcarb.netcdf_lock import NETCDF_LOCK
from gridcarb.write import netcdf, store
from gridcarb.write.disk import free_bytes


@pytest.fixture
def target(tmp_path):
    return tmp_path / "result.nc"


@pytest.mark.parametrize("zarr_format", [2, 3])
@pytest.mark.parametrize("precision", ["float32", "float64"])
def test_file_and_store_hold_the_same(tmp_path, target, fill_store, zarr_format, precision):
    path = tmp_path / "result.zarr"
    fill_store(path, zarr_format=zarr_format, precision=precision)
    netcdf.export(path, target, attributes={"title": "another", "count": 3})
    with xr.open_zarr(path, chunks=None) as expected, xr.open_dataset(target) as found:
        xr.testing.assert_identical(found.drop_attrs(deep=False), expected.drop_attrs(deep=False))
        assert found.attrs == {"title": "another", "number": 2.5, "count": 3}
        assert found["ph_total_scale"].dtype == precision
        assert found["solution_status"].dtype == "int8"
    assert {file.name for file in tmp_path.iterdir()} == {"result.zarr", "result.nc"}


def test_encoding_is_on_purpose(tmp_path, target, fill_store):
    fill_store(tmp_path / "result.zarr")
    netcdf.export(tmp_path / "result.zarr", target)
    with netCDF4.Dataset(target) as file:
        assert file.data_model == "NETCDF4"
        names = list(file.variables)
        assert names[-3:] == ["horizon", "ph_total_scale", "solution_status"]
        assert names[:-3] == sorted(names[:-3])
        assert [name for name, dim in file.dimensions.items() if dim.isunlimited()] == ["time"]
        for name, variable in file.variables.items():
            is_float_field = name in ("ph_total_scale", "horizon")
            assert ("_FillValue" in variable.ncattrs()) == is_float_field, name
            assert "missing_value" not in variable.ncattrs()
        ph = file["ph_total_scale"]
        assert np.isnan(ph._FillValue)
        assert ph.filters()["zlib"]
        assert ph.filters()["shuffle"]
        assert ph.filters()["complevel"] == 4
        assert ph.chunking() == [2, 3, 2, 5]
        assert file["solution_status"].flag_values.dtype == "int8"
        assert file["lon"].valid_range.dtype == file["lon"].dtype
        assert file["run"].dtype == "int32"


def test_progress_ends_at_the_whole_and_one_lock_guards_every_write(tmp_path, target, fill_store, monkeypatch):
    fill_store(tmp_path / "result.zarr")
    seen = []

    def free_for_others(done, total):
        taken = []
        thread = threading.Thread(target=lambda: taken.append(NETCDF_LOCK.acquire(timeout=2)) or NETCDF_LOCK.release())
        thread.start()
        thread.join()
        assert taken == [True]  # reading the store and reporting happen outside the lock
        seen.append((done, total))

    netcdf.export(tmp_path / "result.zarr", target, progress=free_for_others)
    assert [done for done, _ in seen] == sorted(done for done, _ in seen)
    assert seen[-1][0] == seen[-1][1] == seen[0][1]


def test_a_failure_leaves_the_old_file_and_no_temporary_one(tmp_path, target, fill_store):
    fill_store(tmp_path / "result.zarr")
    target.write_text("old")

    def fail(done, total):
        raise RuntimeError("invented failure")

    with pytest.raises(RuntimeError, match="invented failure"):
        netcdf.export(tmp_path / "result.zarr", target, progress=fail)
    assert target.read_text() == "old"
    assert {file.name for file in tmp_path.iterdir()} == {"result.zarr", "result.nc"}


def test_no_more_than_a_piece_is_held(tmp_path, target, grid):
    from gridcarb.axes import Axes

    steps, cells = 64, 20_000
    axes = Axes("time", None, ("cell",), "time", None, None, None)
    template = xr.Dataset(coords={
        "time": ("time", np.arange(steps), {"units": "days since 2001-01-01"}),
        "cell": ("cell", np.arange(cells), {"long_name": "number of the cell"}),
    })
    path = tmp_path / "long.zarr"
    store.create(path, template=template, fields=[grid.ph], axes=axes, chunks={"time": 1}, attributes={},
                 precision="float64")
    values = np.random.default_rng(1).normal(8, 1, cells)
    for step in range(steps):
        block = xr.Dataset({"ph_total_scale": (("time", "cell"), values[None])})
        store.write_block(path, {"time": slice(step, step + 1)}, block)
    tracemalloc.start()
    netcdf.export(path, target)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 10 * values.nbytes < steps * values.nbytes / 6


@given(
    shape=st.lists(st.integers(1, 3000), min_size=1, max_size=4), whole=st.lists(st.booleans(), min_size=4, max_size=4),
    part=st.lists(st.integers(1, 400), min_size=4, max_size=4),
)
def test_chunks_are_small_and_lie_within_the_chunks_of_the_store(shape, whole, part):
    block = [size if entire else min(size, some) for size, entire, some in zip(shape, whole, part, strict=False)]
    chunk = netcdf.chunk_shape(shape, block, 4)
    assert np.prod(chunk) * 4 <= 2 * 2**20
    for size, length, of_store in zip(chunk, shape, block, strict=True):
        assert 1 <= size <= of_store
        assert of_store % size == 0 or of_store == length


def test_time_is_split_before_the_map():
    assert netcdf.chunk_shape((120, 75, 300, 400), (12, 75, 100, 100), 4) == (1, 38, 100, 100)
    assert netcdf.chunk_shape((12, 180, 360), (12, 180, 360), 4) == (6, 180, 360)


def test_a_disk_that_fills_up_is_said(tmp_path, fill_store, grid):
    """On a real small disk of memory, where one can be mounted."""
    small = tmp_path / "small"
    small.mkdir()
    mount = shutil.which("mount")
    if mount is None or subprocess.run([mount, "-t", "tmpfs", "-o", "size=200k", "none", small], check=False,
                                       capture_output=True).returncode:
        pytest.skip("mounting a small disk needs the rights of the administrator")
    try:
        noise = np.random.default_rng(1).normal(8, 1, (6, 3, 4, 5000))
        template = grid.template.isel(lon=np.zeros(5000, int)).drop_vars("basin")
        block = xr.Dataset({"ph_total_scale": (("time", "lev", "lat", "lon"), noise)})
        for place in (tmp_path, small):
            store.create(place / "r.zarr", template=template, fields=[grid.ph], axes=grid.axes, chunks={}, attributes={})
        with pytest.raises(OutputError, match=r"disk is full: about 1\.44 MB were to be written here, .* are free"):
            store.write_block(small / "r.zarr", {}, block)
        shutil.rmtree(small / "r.zarr")
        store.write_block(tmp_path / "r.zarr", {}, block)
        free = free_bytes(small)
        with pytest.raises(OutputError, match="disk is full") as caught:
            netcdf.export(tmp_path / "r.zarr", small / "r.nc")
        assert caught.value.where == str(small / "r.nc")
        assert list(small.iterdir()) == []
        assert free_bytes(small) == free
    finally:
        # Lazily: the HDF5 library cannot close a file on a full disk, and keeps it open until the process ends.
        subprocess.run(["umount", "-l", small], check=True)
