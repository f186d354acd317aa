"""Reading from a Zarr array on this disk within the thread that asks.

The Zarr library hands every chunk to an event loop and from there to a pool of threads. Where all processors are busy with
blocks already, that only makes the block wait for its turn: here its own thread opens the file and unpacks it.
"""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from concurrent.futures import Future, ThreadPoolExecutor
from typing import Any, TypeVar

import numpy as np
import numpy.typing as npt
import zarr

T = TypeVar("T")


def read_in_thread(array: zarr.Array[Any], key: tuple[slice, ...]) -> npt.NDArray[Any]:
    """The part `key` of an array, as the array itself gives it."""
    if _loop_runs_here():
        return np.asarray(array[key])
    loop = asyncio.new_event_loop()
    try:
        loop.set_default_executor(_AtOnce())
        return np.asarray(loop.run_until_complete(array.async_array.getitem(key)))
    finally:
        loop.close()


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
