"""Parts of Zarr arrays read within the thread that asks: the same as the library gives."""

from __future__ import annotations

import asyncio
import threading
from pathlib import Path
from typing import Any

import numcodecs
import numpy as np
import numpy.typing as npt
import pytest
import zarr
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.sources.in_thread import read_in_thread

SHAPE, CHUNKS = (5, 7, 4), (2, 3, 4)
FORMS: dict[str, dict[str, Any]] = {
    "plain": {"zarr_format": 3, "compressors": None},
    "zstd": {"zarr_format": 3},
    "blosc": {"zarr_format": 3, "compressors": zarr.codecs.BloscCodec(cname="lz4")},
    "big endian": {"zarr_format": 3, "dtype": ">f4", "serializer": zarr.codecs.BytesCodec(endian="big")},
    "transposed": {"zarr_format": 3, "filters": [zarr.codecs.TransposeCodec(order=(2, 0, 1))]},
    "sharded": {"zarr_format": 3, "shards": (4, 6, 4)},
    "dots": {"zarr_format": 3, "chunk_key_encoding": {"name": "default", "separator": "."}},
    "second": {"zarr_format": 2},
    "second, columns first": {"zarr_format": 2, "order": "F"},
    "second, delta": {"zarr_format": 2, "dtype": "i4", "filters": [numcodecs.Delta(dtype="i4")]},
}


def made(path: Path, form: str) -> zarr.Array[Any]:
    words = {"dtype": "f4", "fill_value": -7, **FORMS[form]}
    array = zarr.create_array(path, shape=SHAPE, chunks=CHUNKS, **words)
    numbers = np.arange(np.prod(SHAPE)).reshape(SHAPE)
    array[:4] = numbers[:4]  # the last chunks along the first dimension are never written
    return zarr.open_array(path, mode="r")


@pytest.fixture(scope="module")
def arrays(tmp_path_factory: pytest.TempPathFactory) -> dict[str, zarr.Array[Any]]:
    folder = tmp_path_factory.mktemp("arrays")
    return {form: made(folder / form.replace(" ", "_"), form) for form in FORMS}


def compare(array: zarr.Array[Any], key: tuple[slice, ...]) -> None:
    found: npt.NDArray[Any] = read_in_thread(array, key)
    wanted = np.asarray(array[key])
    assert found.dtype == wanted.dtype
    np.testing.assert_array_equal(found, wanted)


@pytest.mark.parametrize("form", FORMS)
def test_every_whole_chunk(arrays, form) -> None:
    for corner in np.ndindex(3, 3, 1):
        compare(arrays[form], tuple(slice(at * chunk, min((at + 1) * chunk, size))
                                    for at, chunk, size in zip(corner, CHUNKS, SHAPE, strict=True)))  # fmt: skip


@settings(deadline=None, max_examples=60)
@given(st.sampled_from(list(FORMS)), st.data())
def test_any_part(arrays, form, data) -> None:
    compare(arrays[form], tuple(data.draw(st.slices(size).filter(lambda part: (part.step or 1) > 0)) for size in SHAPE))


def test_no_thread_is_begun_for_a_chunk_and_none_waits(arrays) -> None:
    before = threading.active_count()
    threads: list[int] = []
    worker = threading.Thread(target=lambda: threads.extend(
        [read_in_thread(arrays["zstd"], (slice(2), slice(3), slice(4))).size, threading.active_count()]))  # fmt: skip
    worker.start()
    worker.join()
    assert threads == [24, before + 1]


def test_where_a_loop_runs_already_the_library_reads(arrays) -> None:
    async def ask() -> npt.NDArray[Any]:
        return read_in_thread(arrays["plain"], (slice(2), slice(3), slice(4)))

    np.testing.assert_array_equal(asyncio.run(ask()), arrays["plain"][:2, :3])


def test_a_damaged_chunk_is_an_error(tmp_path: Path) -> None:
    array = made(tmp_path / "one", "zstd")
    (tmp_path / "one" / "c" / "0" / "0" / "0").write_bytes(b"not zstandard")
    with pytest.raises(RuntimeError, match=r"[Zz]std"):
        read_in_thread(array, (slice(2), slice(3), slice(4)))
