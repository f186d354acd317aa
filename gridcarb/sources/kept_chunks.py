"""Chunks of the inputs that are kept for the blocks that share them, so that none is read and unpacked twice.

A part of a chunk costs as much as the whole of it. Where blocks are smaller than the chunks of the source, the first block
that needs a chunk unpacks it, the others take their part from memory. How much is kept is decided by the planner.
"""

from __future__ import annotations

import itertools
import math
import os
import threading
from collections import OrderedDict
from collections.abc import Iterator
from concurrent.futures import Future
from contextlib import contextmanager
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.sources import handles
from gridcarb.sources.handles import Layout
from gridcarb.sources.stored import Key

Array = npt.NDArray[Any]
Corner = tuple[str, str, tuple[int, int], tuple[int, ...]]


class KeptChunks:
    """Unpacked chunks by file, variable and corner, the least recently used dropped first; one process has one of these.

    limit : most bytes that are kept; 0 keeps nothing and reads what is asked for.
    """

    def __init__(self) -> None:
        self.limit = 0
        self.clear()

    def clear(self) -> None:
        """Let go of everything; after a fork also of what the parent's threads were about to read."""
        self._lock = threading.Lock()
        self._kept: OrderedDict[Corner, Future[Array]] = OrderedDict()
        self._bytes = 0

    def read(self, path: str, variable: str, key: Key) -> Array:
        """The part `key` of one variable, as `handles.read` gives it."""
        if not self.limit or not all(isinstance(part, slice) for part in key):
            return handles.read(path, variable, key)
        layout = handles.layout_of(path, variable)
        if layout.chunks is None or self._not_worth_it(layout, layout.chunks, key):
            return handles.read(path, variable, key)
        places = [part.indices(size) for part, size in zip(key, layout.shape, strict=True)]
        found = np.empty([stop - start for start, stop, _ in places], dtype=layout.dtype)
        for chunk in _touched(places, layout.chunks, layout.shape):
            inside = tuple(slice(max(part.start, start), min(part.stop, stop))
                           for part, (start, stop, _) in zip(chunk, places, strict=True))  # fmt: skip
            target = tuple(slice(part.start - start, part.stop - start)
                           for part, (start, *_) in zip(inside, places, strict=True))  # fmt: skip
            if inside == chunk:
                found[target] = handles.read(path, variable, chunk)
            else:
                whole = self._chunk(path, variable, layout, chunk)
                found[target] = whole[tuple(slice(part.start - corner.start, part.stop - corner.start)
                                            for part, corner in zip(inside, chunk, strict=True))]  # fmt: skip
        return found

    def _not_worth_it(self, layout: Layout, chunks: tuple[int, ...], key: Key) -> bool:
        """Whole chunks need no keeping; strides and chunks larger than what may be kept are read as they are asked for."""
        whole = True
        for part, size, chunk in zip(key, layout.shape, chunks, strict=True):
            start, stop, step = part.indices(size)
            if step != 1 or stop <= start:
                return True
            whole = whole and start % chunk == 0 and (stop % chunk == 0 or stop == size)
        return whole or math.prod(chunks) * layout.dtype.itemsize > self.limit

    def _chunk(self, path: str, variable: str, layout: Layout, chunk: tuple[slice, ...]) -> Array:
        """One whole chunk; of several threads that want it at once, one reads and the others wait."""
        corner = (path, variable, layout.stamp, tuple(part.start for part in chunk))
        while True:
            with self._lock:
                kept = self._kept.get(corner)
                if kept is None:
                    mine: Future[Array] = Future()
                    self._kept[corner] = mine
                    break
                self._kept.move_to_end(corner)
            if kept.exception() is None:  # else whoever read it is told, and this one tries for itself
                return kept.result()
        try:
            whole = handles.read(path, variable, chunk)
        except BaseException as error:
            with self._lock:
                self._kept.pop(corner, None)
            mine.set_exception(error)
            raise
        mine.set_result(whole)
        with self._lock:
            self._bytes += whole.nbytes
            self._drop()
        return whole

    def _drop(self) -> None:
        for corner, kept in list(self._kept.items()):
            if self._bytes <= self.limit:
                break
            if kept.done():
                self._bytes -= kept.result().nbytes
                del self._kept[corner]


def _touched(
    places: list[tuple[int, int, int]], chunks: tuple[int, ...], shape: tuple[int, ...]
) -> Iterator[tuple[slice, ...]]:
    """The chunks, as slices of the variable, that a part of it touches."""
    starts = (range(start - start % chunk, stop, chunk) for (start, stop, _), chunk in zip(places, chunks, strict=True))
    for corner in itertools.product(*starts):
        yield tuple(slice(at, min(at + chunk, size)) for at, chunk, size in zip(corner, chunks, shape, strict=True))


_KEPT = KeptChunks()
read = _KEPT.read
if hasattr(os, "register_at_fork"):
    os.register_at_fork(after_in_child=_KEPT.clear)


def keep_chunks(limit: int) -> None:
    """How many bytes of unpacked chunks this process may keep from now on."""
    if limit != _KEPT.limit:
        _KEPT.limit = limit
        _KEPT.clear()


@contextmanager
def chunks_kept(limit: int) -> Iterator[None]:
    """Meanwhile at most so many bytes of unpacked chunks are kept; afterwards none."""
    keep_chunks(limit)
    try:
        yield
    finally:
        keep_chunks(0)


def close_all() -> None:
    """Close every file this process still holds open for reading, and let go of its chunks."""
    keep_chunks(0)
    handles.close_all()
