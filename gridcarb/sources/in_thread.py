"""Reading from a Zarr array on this disk within the thread that asks.

The Zarr library hands every chunk to an event loop and from there to a pool of threads. Where all processors are busy with
blocks already, that only makes the block wait for its turn: here its own thread opens the file and unpacks it. And a whole
chunk is given as it was unpacked, without another copy.
"""

from __future__ import annotations

import asyncio
import itertools
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
    """Chunk by chunk, so that never more than one is in memory beside what is asked for."""
    asked = [part.indices(size) for part, size in zip(key, array.shape, strict=True)]
    plain = array.shards is None and array.order == "C" and all(step == 1 and stop > start for start, stop, step in asked)
    if not plain:  # chunks that lie together in larger files, columns first, every other number, nothing
        return await array.async_array.getitem(key)
    found = np.empty([stop - start for start, stop, _ in asked], array.dtype)
    cut = list(zip(asked, array.chunks, strict=True))
    for place in itertools.product(*(range(start // chunk, -(-stop // chunk)) for (start, stop, _), chunk in cut)):
        here = tuple(slice(max(start, at * chunk), min(stop, at * chunk + chunk))
                     for at, ((start, stop, _), chunk) in zip(place, cut, strict=True))  # fmt: skip
        part = await _part(array, place, here)
        if part.shape == found.shape == array.chunks:
            return part.astype(array.dtype, copy=False)
        inside = (slice(each.start - start, each.stop - start) for each, (start, *_) in zip(here, asked, strict=True))
        found[tuple(inside)] = part
    return found


async def _part(array: zarr.Array[Any], place: tuple[int, ...], here: Key) -> Any:
    """What one chunk holds of an array there; what was never written is filled by the library."""
    whole = await _unpacked(array, place)
    if whole is None:
        return await array.async_array.getitem(here)
    corner = [at * chunk for at, chunk in zip(place, array.chunks, strict=True)]
    return whole[tuple(slice(each.start - at, each.stop - at) for each, at in zip(here, corner, strict=True))]


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
