"""Reading slices: right whatever the cut, and no more than was asked for, from any thread or process."""

from __future__ import annotations

import multiprocessing
import pickle
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.netcdf_lock import NETCDF_LOCK
from gridcarb.sources import Collection, InputsSettings, gather, handles, lazy, open_collection
from gridcarb.sources.netcdf_file import NetcdfFile

TIMES = np.arange(10) * 30.0
FORMS = ["nc4", "nc3", "zarr2", "zarr3"]


@pytest.fixture(scope="module", params=FORMS)
def pair(
    request: pytest.FixtureRequest, ocean, save, tmp_path_factory: pytest.TempPathFactory
) -> tuple[xr.Dataset, Collection]:
    """The whole ocean in memory, and a collection of it in three files with scrambled dimensions."""
    folder = tmp_path_factory.mktemp("pair")
    whole = ocean(times=TIMES, calendar="360_day")
    for name, part in (("a", slice(0, 4)), ("b", slice(4, 5)), ("c", slice(5, 10))):
        piece = whole.isel(time=part).transpose("lev", "lon", "time", "lat")
        if request.param == "nc3":
            piece = piece.transpose("time", "lev", "lon", "lat")
        save(piece, folder / name, request.param)
    return whole, gather(InputsSettings(files=("*",)), folder)


def _selector(length: int) -> st.SearchStrategy[int | slice | list[int]]:
    place = st.integers(0, length - 1)
    edge = st.none() | st.integers(-length, length)
    # xarray itself fails on empty slices that run backwards, so those that do are never empty here.
    backwards = st.sampled_from([slice(None, None, -1), slice(None, None, -2)])
    slices = backwards | st.builds(slice, edge, edge, st.none() | st.sampled_from([1, 2, 3]))
    return place | slices | st.lists(place, min_size=1, max_size=4)


@given(st.tuples(*(_selector(length) for length in (10, 3, 4, 5))))
@settings(max_examples=25, deadline=None)
def test_any_cut_is_that_of_the_whole(pair: tuple[xr.Dataset, Collection], cut: tuple) -> None:
    whole, collection = pair
    chosen = dict(zip(("time", "lev", "lat", "lon"), cut, strict=True))
    ours = open_collection(collection).alkalinity.isel(chosen).load()
    theirs = whole.talk.isel(chosen)
    assert ours.dims == theirs.dims
    assert ours.dtype == theirs.dtype
    np.testing.assert_array_equal(ours, theirs)


def test_the_dataset_is_raw_and_in_canonical_order(pair: tuple[xr.Dataset, Collection]) -> None:
    whole, collection = pair
    ds = open_collection(collection)
    assert list(ds.data_vars) == ["temperature", "salinity", "dic", "alkalinity", "phosphate"]
    assert ds.dic.dims == ("time", "lev", "lat", "lon")
    for name in ds.coords:
        np.testing.assert_array_equal(ds[name], whole[name])
    assert ds.time.attrs["units"] == "days since 2000-01-01"
    assert ds.dic.attrs["units"] == "mol m-3"
    assert ds.attrs == whole.attrs


def test_packed_numbers_stay_packed(ocean, save, gathered, tmp_path: Path) -> None:
    packing = {"dtype": "i2", "scale_factor": 0.5, "add_offset": 10.0, "_FillValue": -32767}
    ds = ocean(times=(0.0,))
    ds["thetao"] = ds.thetao.where(ds.thetao > 3) * 0.5
    for form in FORMS:
        save(ds, tmp_path / form, form, thetao=packing)
        found = open_collection(gathered(tmp_path, files=form)).temperature
        assert found.dtype == np.int16
        assert {key: float(found.attrs[key]) for key in ("scale_factor", "add_offset", "_FillValue")} == {
            "scale_factor": 0.5, "add_offset": 10.0, "_FillValue": -32767.0,
        }
        assert found.values[0, 0, 0, 0] == -32767
        assert found.values[0, 0, 0, 4] == (ds.thetao.values[0, 0, 0, 4] - 10) / 0.5


def test_nothing_is_read_that_nobody_asked_for(
    ocean, save, gathered, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    for place in range(3):
        save(ocean(times=(30.0 * place,)), tmp_path / f"{place}.nc")
    reads: list[tuple[str, str, int]] = []

    def counted(path: str, variable: str, key: handles.Key) -> np.ndarray:
        values = handles.read(path, variable, key)
        reads.append((Path(path).name, variable, values.size))
        return values

    monkeypatch.setattr(lazy, "read", counted)
    collection = gathered(tmp_path, files="*.nc")
    ds = open_collection(collection)
    part = ds.isel(time=1, lat=slice(0, 2))
    copy = pickle.loads(pickle.dumps(part))
    assert reads == []
    part.dic.load()
    assert reads == [("1.nc", "dissic", 3 * 2 * 5)]
    copy.dic.load()
    ds.dic.isel(time=[0, 2], lev=0).load()
    assert reads[2:] == [("0.nc", "dissic", 20), ("2.nc", "dissic", 20)]
    assert ds.dic.isel(time=slice(0, 0)).load().size == 0


def test_gathering_reads_no_field(ocean, save, gathered, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    save(ocean(), tmp_path / "a.nc")
    asked: list[str] = []
    original = NetcdfFile.read

    def noted(self: NetcdfFile, name: str, key: handles.Key) -> object:
        asked.append(name)
        return original(self, name, key)

    monkeypatch.setattr(NetcdfFile, "read", noted)
    gathered(tmp_path, files="a.nc")
    assert set(asked) == {"time", "lev", "lat", "lon"}


@pytest.mark.parametrize("form", FORMS)
def test_many_threads_many_files_few_handles(
    ocean, save, gathered, *, tmp_path: Path, form: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    whole = ocean(times=TIMES, calendar="360_day")
    for place in range(10):
        save(whole.isel(time=[place]), tmp_path / f"{place}.{form}", form)
    shelf = handles.ZARR_HANDLES if form.startswith("zarr") else handles.NETCDF_HANDLES
    monkeypatch.setattr(shelf, "limit", 3)
    most: list[int] = []
    ds = open_collection(gathered(tmp_path, files=f"*.{form}"))

    def block(place: int) -> bool:
        part = ds.isel(time=slice(place % 9, place % 9 + 2), lat=slice(place % 3, None))[["dic", "phosphate"]].load()
        most.append(len(shelf))
        theirs = whole.isel(time=slice(place % 9, place % 9 + 2), lat=slice(place % 3, None))
        return all(np.array_equal(part[role], theirs[name]) for role, name in (("dic", "dissic"), ("phosphate", "po4")))

    with ThreadPoolExecutor(8) as pool:
        assert all(pool.map(block, range(16)))
    assert max(most) == 3
    handles.close_all()
    assert len(shelf) == 0


def test_netcdf_is_read_under_the_lock_of_the_process(ocean, save, gathered, tmp_path: Path) -> None:
    ds = open_collection(gathered(tmp_path, files=str(save(ocean(), tmp_path / "a.nc"))))
    stores = open_collection(gathered(tmp_path, files=str(save(ocean(), tmp_path / "a.zarr", "zarr3"))))
    with ThreadPoolExecutor(2) as pool:
        with NETCDF_LOCK:
            waiting = pool.submit(ds.dic.load)
            assert pool.submit(stores.dic.load).result(timeout=20).shape == (3, 3, 4, 5)
            assert not waiting.done()
        assert waiting.result(timeout=20).shape == (3, 3, 4, 5)


def test_a_file_written_anew_is_opened_anew(ocean, save, gathered, tmp_path: Path, monkeypatch) -> None:
    monkeypatch.setattr(handles, "LOOK_AGAIN", 0.0)
    path = save(ocean(), tmp_path / "a.nc")
    ds = open_collection(gathered(tmp_path, files="a.nc"))
    before = ds.dic.isel(time=0).values
    changed = ocean()
    changed["dissic"] = changed.dissic + 1
    fresh = save(changed, tmp_path / "b.nc")
    fresh.replace(path)
    np.testing.assert_array_equal(ds.dic.isel(time=0).values, before + 1)


def test_another_process_reads_the_same(ocean, save, gathered, tmp_path: Path) -> None:
    save(ocean(), tmp_path / "a.nc")
    ds = open_collection(gathered(tmp_path, files="a.nc"))
    total = float(ds.dic.sum())
    (tmp_path / "ds.pickle").write_bytes(pickle.dumps(ds))
    script = f"import pickle; print(repr(float(pickle.load(open({str(tmp_path / 'ds.pickle')!r}, 'rb')).dic.sum())))"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert float(done.stdout) == total


@pytest.mark.skipif("fork" not in multiprocessing.get_all_start_methods(), reason="this system cannot fork")
@pytest.mark.filterwarnings("ignore:.*fork.*:DeprecationWarning")
def test_a_forked_process_takes_no_handles_along(ocean, save, gathered, tmp_path: Path) -> None:
    save(ocean(), tmp_path / "a.nc")
    open_collection(gathered(tmp_path, files="a.nc")).dic.load()
    assert len(handles.NETCDF_HANDLES) == 1
    with multiprocessing.get_context("fork").Pool(1) as pool:
        assert pool.apply(_open_handles) == 0
    assert len(handles.NETCDF_HANDLES) == 1


def _open_handles() -> int:
    return len(handles.NETCDF_HANDLES)


def test_chunks_of_the_source_are_told_and_dask_can_cut_as_it_likes(ocean, save, gathered, tmp_path: Path) -> None:
    save(ocean(), tmp_path / "a", "zarr3", dissic={"chunks": (1, 3, 2, 5)})
    collection = gathered(tmp_path, files="a")
    assert collection.roles["dic"].array.chunks == (1, 3, 2, 5)
    ds = open_collection(collection).chunk(time=1, lat=2)
    assert ds.dic.chunks == ((1, 1, 1), (3,), (2, 2), (5,))
    np.testing.assert_array_equal(ds.dic.compute(), ocean().dissic)


def test_a_netcdf_of_another_writer(tmp_path: Path, gathered) -> None:
    """Written by the plain library: no coordinate for one dimension, a big-endian field, an unsigned byte."""
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        file.createDimension("depth", 2)
        file.createDimension("cell", 3)
        depth = file.createVariable("depth", "f4", ("depth",))
        depth.positive, depth.units = "down", "m"
        depth[:] = [0, 10]
        kinds = {"temp": (">f8", "big"), "salt": ("u1", "native"), "dic": ("<f4", "little"), "alk": (">i8", "big")}
        for name, (dtype, order) in kinds.items():
            file.createVariable(name, dtype, ("cell", "depth"), endian=order)[:] = np.arange(6).reshape(3, 2)
    ds = open_collection(gathered(tmp_path, files="a.nc"))
    for role in ("temperature", "salinity", "dic", "alkalinity"):
        np.testing.assert_array_equal(ds[role], np.arange(6).reshape(3, 2).T)
    assert ds.dic.dims == ("depth", "cell")
