"""Workers of a dask scheduler as a crew: what processes, hosts, queues and schedulers that run already have in common."""

from __future__ import annotations

import importlib.util
import itertools
import logging
import time
import uuid
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import CancelledError
from contextlib import AbstractContextManager, contextmanager, suppress
from typing import Any

import dask
from distributed import Client, Future, KilledWorker
from distributed.comm import CommClosedError

from gridcarb.errors import BlockError, EngineError, GridcarbError
from gridcarb.run.engines.crew import Answer, Crew, Order, Strength, attempt, is_at_work, resident_bytes

LOOPBACK = "127.0.0.1"
_PATIENCE = "5s"
"""How long a scheduler may take to answer, at the beginning or after a break."""

_LOST = (OSError, TimeoutError, RuntimeError, CommClosedError)
"""What a client says when its scheduler is gone."""


def own_scheduler() -> AbstractContextManager[Any]:
    """Settings of a scheduler that works for one run alone, and of the workers it starts.

    A block that has cost two workers their lives is not given to a third: it is done in halves. Blocks wait with the
    scheduler, not with the worker, so that only the one that was at work is suspected. One thread in each process: linear
    algebra and the like must not start their own. One heap in each: see `held_memory`. They look at themselves less often
    than is usual, which took a tenth of two cores.
    """
    alone = ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS")
    settings: AbstractContextManager[Any] = dask.config.set({
        "distributed.scheduler.allowed-failures": 1, "distributed.scheduler.worker-saturation": 1.0,
        "distributed.worker.profile.enabled": False, "distributed.worker.memory.monitor-interval": "500ms",
        "distributed.admin.tick.interval": "1s", "distributed.admin.system-monitor.interval": "2s",
        **{f"distributed.nanny.pre-spawn-environ.{name}": 1 for name in (*alone, "MALLOC_ARENA_MAX")},
    })  # fmt: skip
    return settings


def dashboard(host: str) -> dict[str, Any]:
    """The word that gives a scheduler of our own a dashboard, at any port that is free."""
    return {"dashboard_address": f"{host}:0"}


@contextmanager
def connected(target: Any, order: Order, say: Callable[[str], None]) -> Iterator[Crew]:
    """The workers of a scheduler (an address or a cluster), each of which has looked into the order.

    Raises
    ------
    EngineError : no scheduler there, or a worker that cannot do the order.
    """
    logging.getLogger("distributed.client").setLevel(logging.CRITICAL)  # its errors are told in our words
    try:
        client = Client(target, timeout=_PATIENCE, set_as_default=False)
    except (OSError, TimeoutError, ValueError) as error:
        raise EngineError(
            f"no dask scheduler answers ({error})", where=f"engine: {target}",
            mend="start one with `dask scheduler`, and give the address it tells as `address: ...` under `engine`",
        ) from error
    with client:
        crew = DaskCrew(client)
        if client.dashboard_link and importlib.util.find_spec("bokeh"):  # without it there is a page that says so
            say(f"dashboard: {client.dashboard_link}")
        crew.get_ready(order, say)
        yield crew


class DaskCrew:
    """The workers a client knows."""

    def __init__(self, client: Client) -> None:
        self._client = client
        self._name, self._numbers = f"gridcarb-block-{uuid.uuid4().hex[:8]}", itertools.count()
        self._order: Order | None = None

    def get_ready(self, order: Order, say: Callable[[str], None]) -> None:
        """Wait for the first worker, then let every worker there look into the order."""
        self._order = order
        if not self._workers():
            say(f"no worker has come to {self._client.scheduler.address} yet; waiting for the first")
        while not self._workers():
            time.sleep(0.2)
        say("preparing the chemistry on every worker (some fifteen seconds the first time on a machine)")
        first = {address.rpartition(":")[0]: address for address in self._workers()}
        self._look_into(order, first.values())  # what one compiles, the others of its host find on its disk
        self._look_into(order, self._workers().keys() - first.values())

    def _look_into(self, order: Order, addresses: Iterable[str]) -> None:
        asked = {
            address: self._client.submit(_look_into, order, key=(f"{self._name}-ready", address), workers=[address])
            for address in addresses
        }
        # A worker that leaves meanwhile takes its answer along.
        while any(not future.done() for address, future in asked.items() if address in self._workers()):
            time.sleep(0.05)
        for address, future in asked.items():
            if future.done():
                _raise_unable(address, future.exception() or future.result())

    def submit(self, order: Order, number: int, parts: int) -> Future[Answer]:
        key = (self._name, number, next(self._numbers))
        return self._client.submit(attempt, order, number, parts, key=key)

    def collect(self, futures: Sequence[Future[Answer]]) -> list[Answer]:
        try:
            ready = [future for future in futures if future.status == "finished"]
            try:
                found = dict(zip(ready, self._client.gather(ready), strict=True))
            except KilledWorker:  # an answer was lost with its worker, and asking again cost another one
                found = {}
            return [found[future] if future in found else _single_answer(future) for future in futures]
        except (*_LOST, CancelledError) as error:
            raise self._lost(error) from error

    def strength(self) -> Strength:
        try:
            workers = self._workers().values()
        except _LOST as error:
            raise self._lost(error) from error
        resident = sum(int(worker.get("metrics", {}).get("memory", 0)) for worker in workers)
        return Strength(sum(worker["nthreads"] for worker in workers), resident + resident_bytes(children=False))

    def drop(self, futures: Sequence[Future[Answer]]) -> None:
        with suppress(*_LOST):
            self._client.cancel(list(futures))
            while any(flag is True for flag in self._client.run(is_at_work, self._order, on_error="return").values()):
                time.sleep(0.05)

    def _workers(self) -> dict[str, Any]:
        found: dict[str, Any] = self._client.scheduler_info(n_workers=-1)["workers"]
        return found

    def _lost(self, error: BaseException) -> EngineError:
        return EngineError(
            f"the dask scheduler was lost ({type(error).__name__}: {error})", where="engine",
            mend="start it again, and go on with `gridcarb run --resume`",
        )


def _look_into(order: Order) -> GridcarbError | None:
    try:
        order.ready()
    except GridcarbError as error:
        return error
    return None


def _raise_unable(address: str, found: BaseException | None) -> None:
    if found is None:
        return
    if isinstance(found, GridcarbError):
        found.where = f"worker {address}: {found.where}"
        raise found
    raise EngineError(
        f"this worker cannot do the work ({type(found).__name__}: {found})", where=f"worker {address}",
        mend="install the same version of gridcarb for the scheduler and all workers",
    ) from found


def _single_answer(future: Future[Answer]) -> Answer:
    """The answer to one attempt, waited for where it was lost with its worker and is made again."""
    error = future.exception()
    if error is None:
        answer: Answer = future.result()
        return answer
    if not isinstance(error, KilledWorker):
        raise EngineError(
            f"a worker could not give its answer ({type(error).__name__}: {error})", where="engine",
            mend="look at the log of the scheduler and its workers, and go on with `gridcarb run --resume`",
        ) from error
    fault = BlockError(
        "the workers that were given it died, most likely for want of memory", where=str(error.last_worker.address),
        mend="write fewer `workers` or a smaller `memory` under `engine` in the recipe",
    )
    return Answer(None, fault, 0.0, str(error.last_worker.address), died=True)
