"""Reading from a Zarr array on this disk within the thread that asks.

The Zarr library hands every chunk to an event loop and from there to a pool of threads. Where all processors are busy with
blocks already, that only makes the block wait for its turn: here its own thread opens the file and unpacks it. And a whole
chunk is given as it was unpacked, without another copy.
"""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from concurrent.futures import Future, ThreadPoolExecutor
from typing import Any, TypeVar

import numpy as np
import numpy.typing as npt
import zarr
from zarr.core.buffer import default_buffer_prototype

T = TypeVar("T")
Key = tuple[slice, ...]


def read_in_thread(array: zarr.Array[Any], key: Key) -> npt.NDArray[Any]:
    """The part `key` of an array, as the array itself gives it."""
    if _loop_runs_here():
        return np.asarray(array[key])
    loop = asyncio.new_event_loop()
    try:
        loop.set_default_executor(_AtOnce())
        return np.asarray(loop.run_until_complete(_read(array, key)))
    finally:
        loop.close()


async def _read(array: zarr.Array[Any], key: Key) -> Any:
    place = _only_chunk(array, key)
    whole = None if place is None else await _unpacked(array, place)
    if place is None or whole is None:
        return await array.async_array.getitem(key)
    there = tuple(slice(size - at * chunk) for at, size, chunk in zip(place, array.shape, array.chunks, strict=True))
    return whole[there].astype(array.dtype, copy=False)


def _only_chunk(array: zarr.Array[Any], key: Key) -> tuple[int, ...] | None:
    """The chunk that is all of what is asked for; None if it is another part, or if chunks lie together in larger files, or
    columns first."""
    if array.shards is not None or array.order != "C":
        return None
    places = []
    for part, size, chunk in zip(key, array.shape, array.chunks, strict=True):
        start, stop, step = part.indices(size)
        if step != 1 or start % chunk or stop != min(start + chunk, size):
            return None
        places.append(start // chunk)
    return tuple(places)


async def _unpacked(array: zarr.Array[Any], place: tuple[int, ...]) -> npt.NDArray[Any] | None:
    """A chunk, with what reaches beyond the array; None where none was written."""
    held, prototype = array.async_array, default_buffer_prototype()
    content = await (held.store_path / held.metadata.encode_chunk_key(place)).get(prototype)
    if content is None:
        return None
    form = held.metadata.get_chunk_spec(place, held.config, prototype)
    (found,) = await held.codec_pipeline.decode([(content, form)])
    return None if found is None else np.asarray(found.as_numpy_array())


def _loop_runs_here() -> bool:
    """As in a notebook, where a second loop is not allowed."""
    try:
        asyncio.get_running_loop()
    except RuntimeError:
        return False
    return True


class _AtOnce(ThreadPoolExecutor):
    """Does what it is given where it stands, and never begins a thread; event loops take executors of this kind only."""

    def submit(self, fn: Callable[..., T], /, *args: Any, **kwargs: Any) -> Future[T]:
        future: Future[T] = Future()
        try:
            future.set_result(fn(*args, **kwargs))
        except BaseException as error:
            future.set_exception(error)
        return future
