"""Chunks that are kept: the numbers are those of the file, no chunk is read twice, and the limit holds."""

from __future__ import annotations

import threading
from collections import Counter
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from gridcarb.errors import InputError
from gridcarb.sources import handles, keep_chunks, kept_chunks
from gridcarb.sources.kept_chunks import KeptChunks

SHAPE, CHUNKS = (4, 6, 10), (2, 3, 4)
NUMBERS = np.arange(np.prod(SHAPE), dtype=np.float32).reshape(SHAPE)


@pytest.fixture(scope="module", params=["netcdf", "zarr"])
def path(request, tmp_path_factory) -> Path:
    place = tmp_path_factory.mktemp("kept") / request.param
    ds = xr.Dataset({"salt": (("t", "y", "x"), NUMBERS), "flat": (("t", "y", "x"), NUMBERS)})
    if request.param == "zarr":
        ds[["salt"]].to_zarr(place, encoding={"salt": {"chunks": CHUNKS}}, consolidated=False)
    else:
        ds.to_netcdf(place, encoding={"salt": {"chunksizes": CHUNKS}, "flat": {"contiguous": True}})
    return place


@pytest.fixture
def reads(monkeypatch) -> Counter[str]:
    """How often each part was asked of a file."""
    found: Counter[str] = Counter()
    read, lock = handles.read, threading.Lock()

    def counting(path, variable, key):
        with lock:
            found[str(key)] += 1
        return read(path, variable, key)

    monkeypatch.setattr(handles, "read", counting)
    return found


def keeping(limit: int) -> KeptChunks:
    kept = KeptChunks()
    kept.limit = limit
    return kept


part = st.tuples(*(st.builds(lambda a, b: slice(min(a, b), max(a, b)), st.integers(0, size), st.integers(0, size))
                   for size in SHAPE))  # fmt: skip


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(part, max_size=6), st.sampled_from([0, 50, 96, 200, 10_000]))
def test_numbers_are_those_of_the_file(path, keys, limit) -> None:
    kept = keeping(limit)
    for key in keys:
        found = kept.read(str(path), "salt", key)
        np.testing.assert_array_equal(found, NUMBERS[key])
        assert found.dtype == NUMBERS.dtype
        assert kept._bytes <= limit


@pytest.mark.parametrize("key", [(0, slice(1, 5), slice(0, 3)), (slice(0, 4, 2), slice(0, 1), slice(None)),
                                 (np.array([0, 3]), slice(0, 2), slice(None))])
def test_single_places_strides_and_lists_are_read_as_they_are(path, key) -> None:
    np.testing.assert_array_equal(keeping(10_000).read(str(path), "salt", key), NUMBERS[key])


def test_no_chunk_is_read_twice(path, reads) -> None:
    kept = keeping(NUMBERS.nbytes)
    for row in range(6):
        kept.read(str(path), "salt", (slice(0, 4), slice(row, row + 1), slice(0, 10)))
    assert len(reads) == 2 * 2 * 3
    assert set(reads.values()) == {1}


def test_whole_chunks_are_read_at_once_and_not_kept(path, reads) -> None:
    kept = keeping(NUMBERS.nbytes)
    kept.read(str(path), "salt", (slice(0, 2), slice(0, 6), slice(4, 10)))
    assert list(reads) == [str((slice(0, 2), slice(0, 6), slice(4, 10)))]
    assert kept._bytes == 0


def test_of_many_threads_one_reads(path, reads, monkeypatch) -> None:
    kept, together = keeping(NUMBERS.nbytes), threading.Barrier(8)

    def ask(row: int):
        together.wait(timeout=30)
        return kept.read(str(path), "salt", (slice(0, 2), slice(row % 3, row % 3 + 1), slice(0, 4)))

    with ThreadPoolExecutor(8) as pool:
        rows = list(pool.map(ask, range(8)))
    assert reads == {str((slice(0, 2), slice(0, 3), slice(0, 4))): 1}
    assert all((found == NUMBERS[0:2, row % 3:row % 3 + 1, 0:4]).all() for row, found in enumerate(rows))


def test_a_failed_read_is_tried_again_by_the_next(path, monkeypatch) -> None:
    kept, read, fails = keeping(NUMBERS.nbytes), handles.read, [True]

    def once(*words):
        if fails:
            fails.pop()
            raise InputError("cut short", where="x")
        return read(*words)

    monkeypatch.setattr(handles, "read", once)
    key = (slice(0, 1), slice(0, 1), slice(0, 1))
    with pytest.raises(InputError, match="cut short"):
        kept.read(str(path), "salt", key)
    np.testing.assert_array_equal(kept.read(str(path), "salt", key), NUMBERS[key])


def test_a_contiguous_variable_is_read_as_it_is(path, reads) -> None:
    if path.name == "zarr":
        pytest.skip("a store has chunks")
    key = (slice(0, 1), slice(0, 1), slice(0, 1))
    keeping(NUMBERS.nbytes).read(str(path), "flat", key)
    assert list(reads) == [str(key)]


def test_a_file_written_anew_gives_its_own_numbers(tmp_path, monkeypatch) -> None:
    monkeypatch.setattr(handles, "LOOK_AGAIN", 0.0)
    kept, key = keeping(NUMBERS.nbytes), (slice(0, 1), slice(0, 1), slice(0, 1))
    for number in (1.0, 2.0):
        ds = xr.Dataset({"salt": (("t", "y", "x"), NUMBERS * 0 + number)})
        ds.to_netcdf(tmp_path / f"{number}", encoding={"salt": {"chunksizes": CHUNKS}})
        (tmp_path / f"{number}").replace(tmp_path / "a.nc")
        assert float(kept.read(str(tmp_path / "a.nc"), "salt", key)[0, 0, 0]) == number


def test_a_run_that_is_over_keeps_nothing(path) -> None:
    keep_chunks(NUMBERS.nbytes)
    kept_chunks.read(str(path), "salt", (slice(0, 1), slice(0, 1), slice(0, 1)))
    assert kept_chunks._KEPT._bytes == 96
    keep_chunks(0)
    assert kept_chunks._KEPT._bytes == 0
