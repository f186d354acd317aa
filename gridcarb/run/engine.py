"""The engine: blocks become dask tasks, one each, on the threads of this machine."""

from __future__ import annotations

import itertools
import os
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import ThreadPoolExecutor
from typing import Any, TypeVar

import dask
from dask.callbacks import Callback

Answer = TypeVar("Answer")

_SLAB_PER_WORKER = 200
"""Blocks handed over at a time, for each worker: the graph stays small however long the run."""


def cores() -> int:
    """The processors this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def run_tasks(
    function: Callable[[Any, int], Answer], job: object, numbers: Iterable[int], *, workers: int,
    done: Callable[[Answer], None],
) -> None:
    """Call ``function(job, number)`` for every number, `workers` at a time, and `done` with each answer as it comes.

    The first error ends the rest and is raised. `done` is called in the calling thread. However this ends, by an error or
    by Ctrl-C, it ends when the last call has come back: nothing is at work on the store afterwards.
    """
    task = dask.delayed(function, pure=False)
    shared = dask.delayed(job, pure=False, traverse=False)
    with ThreadPoolExecutor(workers) as threads:
        for slab in _slabs(numbers, _SLAB_PER_WORKER * workers):
            tasks = [task(shared, number) for number in slab]
            keys = {each.key for each in tasks}

            def tell(key: str, value: Answer, *_: object, keys: set[str] = keys) -> None:
                if key in keys:
                    done(value)

            with Callback(posttask=tell):
                dask.compute(*tasks, scheduler="threads", pool=threads, optimize_graph=False)


def _slabs(numbers: Iterable[int], length: int) -> Iterator[list[int]]:
    rest = iter(numbers)
    while slab := list(itertools.islice(rest, length)):
        yield slab
