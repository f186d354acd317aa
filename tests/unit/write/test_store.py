from __future__ import annotations

import errno
import json
import shutil
from concurrent.futures import ThreadPoolExecutor

import google_crc32c
import numpy as np
import pytest
import xarray as xr
import zarr

from gridcarb.errors import BlockError, OutputError
from gridcarb.write import chunks, store

EVERY = [(fmt, precision) for fmt in (2, 3) for precision in ("float32", "float64")]


@pytest.mark.parametrize(("zarr_format", "precision"), EVERY)
def test_a_store_comes_back_as_it_was_written(tmp_path, grid, fill_store, zarr_format, precision):
    path = tmp_path / "result.zarr"
    fill_store(path, zarr_format=zarr_format, precision=precision)
    with xr.open_zarr(path, chunks=None) as found:
        for key in ("ph_total_scale", "horizon"):
            assert found[key].dtype == precision
            np.testing.assert_array_equal(found[key].values, grid.result[key].values.astype(precision))
            assert found[key].dims == grid.result[key].dims
        assert found["solution_status"].dtype == "int8"
        np.testing.assert_array_equal(found["solution_status"], grid.result["solution_status"])
        assert found.attrs == {"title": "t", "number": 2.5}
        assert str(found["time"].values[1]) == "2001-02-16 00:00:00"
        assert found["time"].dt.calendar == "360_day"
        assert {"lat", "lon", "lev", "time", "basin", "run", "letters"} <= set(found.coords)
        assert list(found["letters"].values) == ["abc", "de ", "f  ", "ghi"]
        assert int(found["run"]) == 7


@pytest.mark.parametrize("zarr_format", [2, 3])
def test_metadata_say_format_dimensions_codec_and_nan_fill(tmp_path, fill_store, zarr_format):
    path = tmp_path / "result.zarr"
    fill_store(path, zarr_format=zarr_format)
    group = zarr.open_group(path, mode="r", use_consolidated=False)
    assert group.metadata.zarr_format == zarr_format
    ph = group["ph_total_scale"]
    assert np.isnan(ph.fill_value)
    assert ph.chunks == (2, 3, 2, 5)
    text = (path / "ph_total_scale" / ("zarr.json" if zarr_format == 3 else ".zarray")).read_text()
    assert "blosc" in text
    assert "zstd" in text
    assert group["solution_status"].fill_value == (-128 if zarr_format == 3 else None)
    if zarr_format == 3:
        assert json.loads(text)["dimension_names"] == ["time", "lev", "lat", "lon"]
    else:
        assert group["horizon"].attrs["_ARRAY_DIMENSIONS"] == ["time", "lat", "lon"]


@pytest.mark.parametrize("zarr_format", [2, 3])
def test_coordinates_carry_no_fill_and_no_encoding_of_the_source(tmp_path, fill_store, zarr_format):
    path = tmp_path / "result.zarr"
    fill_store(path, zarr_format=zarr_format)
    raw = xr.open_zarr(path, decode_cf=False, consolidated=False, chunks=None)
    for name in ("time", "time_bnds", "lev", "lat", "lon", "basin", "letters", "run"):
        assert not {"_FillValue", "missing_value"} & raw[name].attrs.keys(), name
    assert raw["time"].attrs["units"] == "days since 2001-01-01"
    assert raw["time"].dtype == "int64"
    assert raw["lat"].dtype == "float32"
    assert raw["lat"].attrs == {"units": "degrees_north", "standard_name": "latitude", "axis": "Y"}
    assert np.isnan(raw["basin"].values[2:]).all()
    assert (raw["basin"].values[:2] == 4).all()
    raw.close()


def test_fields_say_how_they_hang_together(tmp_path, fill_store):
    path = tmp_path / "result.zarr"
    fill_store(path)
    raw = xr.open_zarr(path, decode_cf=False, consolidated=False, chunks=None)
    ph = raw["ph_total_scale"].attrs
    assert ph["ancillary_variables"] == "solution_status"
    assert ph["coordinates"].split() == ["basin", "letters", "run"]
    assert ph["cell_methods"] == "time: mean"
    assert ph["comment"].startswith("As said. Computed from inputs averaged")
    assert ph["cell_measures"] == "area: areacello"  # an external variable
    status = raw["solution_status"].attrs
    assert status["flag_values"] == [0, 1, 2]
    assert status["flag_meanings"] == "solved outside_validity missing_input"
    assert "ancillary_variables" not in status
    raw.close()


def test_what_nobody_wrote_is_missing_and_never_solved(tmp_path, grid):
    path = tmp_path / "result.zarr"
    store.create(path, template=grid.template, fields=grid.fields, axes=grid.axes, chunks=grid.chunks, attributes={})
    store.write_block(path, grid.regions[0], grid.result.isel(grid.regions[0]))
    with xr.open_zarr(path, chunks=None) as found:
        rest = found.isel(time=slice(2, None))
        assert np.isnan(rest["ph_total_scale"]).all()
        assert (rest["solution_status"] == -128).all()


@pytest.mark.parametrize("region", [
    {"time": slice(1, 3)}, {"time": slice(0, 3)}, {"lat": slice(1, 4)}, {"time": slice(0, 4, 2)}, {"time": slice(2, 2)},
    {"lon": slice(0, 4)},
])
def test_a_region_not_of_whole_chunks_is_refused_before_a_byte_is_written(tmp_path, grid, region):
    path = tmp_path / "result.zarr"
    store.create(path, template=grid.template, fields=grid.fields, axes=grid.axes, chunks=grid.chunks, attributes={})
    before = sorted(file for file in path.rglob("*") if file.is_file())
    with pytest.raises(BlockError, match="whole chunks"):
        store.write_block(path, region, grid.result.isel(region))
    assert sorted(file for file in path.rglob("*") if file.is_file()) == before


def test_the_last_region_may_end_short_of_a_chunk(tmp_path, grid):
    path = tmp_path / "result.zarr"
    chunks = {"time": 4, "lat": 3}
    store.create(path, template=grid.template, fields=grid.fields, axes=grid.axes, chunks=chunks, attributes={})
    region = {"time": slice(4, 6), "lat": slice(3, 4)}
    store.write_block(path, region, grid.result.isel(region))
    with xr.open_zarr(path, chunks=None) as found:
        expected = grid.result["ph_total_scale"].isel(region).values.astype("f4")
        np.testing.assert_array_equal(found["ph_total_scale"].isel(region), expected)
        assert int(found["ph_total_scale"].count()) == np.isfinite(expected).sum()


def test_a_block_that_does_not_fit_is_refused(tmp_path, grid):
    path = tmp_path / "result.zarr"
    store.create(path, template=grid.template, fields=grid.fields, axes=grid.axes, chunks=grid.chunks, attributes={})
    region = grid.regions[0]
    with pytest.raises(BlockError, match="does not fit"):
        store.write_block(path, region, grid.result.isel(region).isel(time=slice(0, 1)))
    with pytest.raises(BlockError, match="no field 'unknown'"):
        store.write_block(path, region, grid.result.isel(region).rename(horizon="unknown"))
    with pytest.raises(BlockError, match="has dimensions"):
        store.write_block(path, region, grid.result[["ph_total_scale"]].isel(region).isel(lev=0))


def test_dimensions_in_another_order_find_their_place(tmp_path, grid):
    path = tmp_path / "result.zarr"
    store.create(path, template=grid.template, fields=grid.fields, axes=grid.axes, chunks=grid.chunks, attributes={})
    store.write_block(path, {}, grid.result.transpose("lon", "lat", "lev", "time"))
    with xr.open_zarr(path, chunks=None) as found:
        np.testing.assert_array_equal(found["ph_total_scale"], grid.result["ph_total_scale"].values.astype("f4"))


def test_checksums_are_of_the_bytes_as_stored_and_writing_twice_changes_nothing(tmp_path, grid, fill_store):
    path = tmp_path / "result.zarr"
    sums = fill_store(path)
    before = {file: file.read_bytes() for file in path.rglob("*") if file.is_file()}
    assert store.write_block(path, grid.regions[0], grid.result.isel(grid.regions[0])) == sums[0]
    assert {file: file.read_bytes() for file in path.rglob("*") if file.is_file()} == before
    stored = zarr.open_group(path, mode="r")["ph_total_scale"][0:2, :, 0:2, :]
    assert sums[0]["ph_total_scale"].values == f"crc32c:{google_crc32c.value(stored.tobytes()):08x}"
    of_ph = [content for file, content in before.items() if "ph_total_scale" in file.parts]
    files = {f"crc32c:{google_crc32c.value(content):08x}" for content in of_ph}
    assert {*sums[0]["ph_total_scale"].chunks, *sums[1]["ph_total_scale"].chunks} <= files
    assert set(sums[0]) == {"ph_total_scale", "horizon", "solution_status"}
    assert sums[0]["ph_total_scale"] != sums[1]["ph_total_scale"]


@pytest.mark.parametrize("zarr_format", [2, 3])
@pytest.mark.parametrize("precision", ["float32", "float64"])
def test_files_are_those_the_zarr_library_would_write(tmp_path, grid, zarr_format, precision):
    """Chunks that reach over the edge, chunks of nothing but fill, bytes and floats."""
    ours, theirs = tmp_path / "ours.zarr", tmp_path / "theirs.zarr"
    for path in (ours, theirs):
        store.create(path, template=grid.template, fields=grid.fields, axes=grid.axes, attributes={}, precision=precision,
                     chunks={"time": 4, "lev": 2, "lat": 3}, zarr_format=zarr_format)
    result = grid.result.copy(deep=True)
    result["ph_total_scale"][:4, :2] = np.nan
    result["solution_status"][:, :, 3:] = 2  # the library leaves zeros out in format 2, where nothing says what a gap holds
    result["solution_status"][:, :, :3] = -128
    region = {"time": slice(0, 6)}
    for _ in range(2):
        store.write_block(ours, region, result)
    group = zarr.open_group(theirs, mode="r+")
    for key, values in result.data_vars.items():
        with np.errstate(all="ignore"):
            group[key][...] = values.values.astype(group[key].dtype)
    files = {path.relative_to(theirs) for path in theirs.rglob("*") if path.is_file()}
    assert files == {path.relative_to(ours) for path in ours.rglob("*") if path.is_file()}
    assert all((theirs / file).read_bytes() == (ours / file).read_bytes() for file in files)


def test_a_chunk_that_becomes_fill_loses_its_file(tmp_path, grid, fill_store):
    path = tmp_path / "result.zarr"
    fill_store(path)
    region = grid.regions[0]
    gone = xr.full_like(grid.result[["ph_total_scale"]].isel(region), np.nan)
    assert store.write_block(path, region, gone)["ph_total_scale"].chunks == ("",)
    with xr.open_zarr(path, chunks=None) as found:
        assert np.isnan(found["ph_total_scale"].isel(region)).all()
        assert found["ph_total_scale"].notnull().any()


@pytest.mark.parametrize("zarr_format", [2, 3])
def test_threads_write_blocks_at_once_with_the_same_bytes(tmp_path, grid, fill_store, zarr_format):
    one, many = tmp_path / "one.zarr", tmp_path / "many.zarr"
    fill_store(one, zarr_format=zarr_format)
    store.create(many, template=grid.template, fields=grid.fields, axes=grid.axes, chunks=grid.chunks,
                 attributes={"title": "t", "number": 2.5}, zarr_format=zarr_format)
    with ThreadPoolExecutor(6) as pool:
        jobs = [pool.submit(store.write_block, many, region, grid.result.isel(region)) for region in grid.regions * 3]
        assert len({json.dumps(job.result()) for job in jobs}) == len(grid.regions)
    files = sorted(file.relative_to(one) for file in one.rglob("*") if file.is_file())
    assert sorted(file.relative_to(many) for file in many.rglob("*") if file.is_file()) == files
    assert all((one / file).read_bytes() == (many / file).read_bytes() for file in files)


def test_a_grid_without_time_vertical_or_any_dimension(tmp_path, grid):
    axes = type(grid.axes)(None, None, (), None, None, "lat", "lon")
    template = grid.template.isel(time=0, lev=0, lat=0, lon=0).drop_vars(["time", "time_bnds", "letters"])
    path = tmp_path / "cell.zarr"
    store.create(path, template=template, fields=grid.fields, axes=axes, chunks={}, attributes={})
    block = grid.result.isel(time=0, lev=0, lat=0, lon=0)
    store.write_block(path, {}, block)
    with xr.open_zarr(path, chunks=None) as found:
        assert float(found["ph_total_scale"]) == np.float32(block["ph_total_scale"])
        assert found["ph_total_scale"].dims == ()
        assert {"lat", "lon", "lev"} <= set(found["ph_total_scale"].coords)


def test_a_coordinate_with_the_name_of_a_field_is_refused(tmp_path, grid):
    template = grid.template.assign_coords(ph_total_scale=("lat", np.zeros(4)))
    with pytest.raises(OutputError, match="ph_total_scale"):
        store.create(tmp_path / "x.zarr", template=template, fields=grid.fields, axes=grid.axes, chunks={}, attributes={})


def test_an_existing_store_is_not_written_over(tmp_path, fill_store, grid):
    path = tmp_path / "result.zarr"
    fill_store(path)
    with pytest.raises(FileExistsError):
        fill_store(path)
    with xr.open_zarr(path, chunks=None) as found:
        assert int(found["ph_total_scale"].count()) == int(grid.result["ph_total_scale"].count())


def test_a_full_disk_is_said_with_place_and_sizes(tmp_path, grid, fill_store, monkeypatch):
    path = tmp_path / "result.zarr"
    fill_store(path)

    def full(path, content):
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(chunks, "_put", full)
    with pytest.raises(OutputError, match=r"disk is full: about .* B were to be written here, .* are free") as caught:
        store.write_block(path, grid.regions[0], grid.result.isel(grid.regions[0]))
    assert caught.value.where == str(path)
    assert "output" in caught.value.mend
    shutil.rmtree(path)
