"""Processes of this machine, each with one thread and its own memory, which a dask scheduler of the run's own looks after.

A process that dies is started anew; its block is done by another.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager

from distributed import LocalCluster

from gridcarb.recipe.engine import EngineSettings
from gridcarb.run.engines import deaf
from gridcarb.run.engines.crew import Crew, Order
from gridcarb.run.engines.dask_crew import LOOPBACK, connected, dashboard, own_scheduler


@contextmanager
def crew(_: EngineSettings, workers: int, order: Order, say: Callable[[str], None]) -> Iterator[Crew]:
    """A crew of `workers` processes."""
    say(f"starting {workers} processes")
    with own_scheduler(), LocalCluster(
        n_workers=workers, threads_per_worker=1, processes=True, host=LOOPBACK, preload=[deaf.__name__],
        **dashboard(LOOPBACK),
    ) as cluster, connected(cluster, order, say) as found:  # fmt: skip
        yield found
