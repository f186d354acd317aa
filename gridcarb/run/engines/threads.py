"""Threads of this process: no start-up, one copy of everything. The chemistry holds no interpreter lock."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Future, ThreadPoolExecutor, wait
from contextlib import contextmanager

from gridcarb.recipe.engine import EngineSettings
from gridcarb.run.engines.crew import Answer, Crew, Order, Strength, attempt, resident_bytes


@contextmanager
def crew(_: EngineSettings, workers: int, order: Order, say: Callable[[str], None]) -> Iterator[Crew]:
    """A crew of `workers` threads."""
    say("preparing the chemistry (some fifteen seconds the first time on this machine)")
    order.ready()
    with ThreadPoolExecutor(workers, thread_name_prefix="block") as pool:
        yield Threads(pool, workers)


class Threads:
    """A pool of threads as a crew."""

    def __init__(self, pool: ThreadPoolExecutor, workers: int) -> None:
        self._pool, self._workers = pool, workers

    def submit(self, order: Order, number: int, parts: int) -> Future[Answer]:
        return self._pool.submit(attempt, order, number, parts)

    def collect(self, futures: Sequence[Future[Answer]]) -> list[Answer]:
        return [future.result() for future in futures]

    def strength(self) -> Strength:
        return Strength(self._workers, resident_bytes())

    def drop(self, futures: Sequence[Future[Answer]]) -> None:
        wait([future for future in futures if not future.cancel()])
