"""Hosts that are started over SSH: a scheduler on the first one, workers on all. They must see the same files."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

from distributed import SSHCluster

from gridcarb.errors import EngineError
from gridcarb.recipe.engine import EngineSettings
from gridcarb.run.engines.crew import Crew, Order
from gridcarb.run.engines.dask_crew import connected, own_scheduler


@contextmanager
def crew(settings: EngineSettings, workers: int, order: Order, say: Callable[[str], None]) -> Iterator[Crew]:
    """A crew of `workers` processes on each host."""
    hosts = settings.hosts or ()
    say(f"starting {workers} processes on each of {len(hosts)} hosts")
    with own_scheduler(), _started(settings, workers) as cluster, connected(cluster, order, say) as found:
        yield found


def words(settings: EngineSettings, workers: int) -> dict[str, Any]:
    """What dask is told of the hosts: how SSH reaches them is left to the user's own SSH settings."""
    hosts = list(settings.hosts or ())
    return {
        "hosts": [hosts[0], *hosts],
        "worker_options": {"n_workers": workers, "nthreads": 1},
        "scheduler_options": {"port": 0},
        "remote_python": settings.python,
    }


@contextmanager
def _started(settings: EngineSettings, workers: int) -> Iterator[Any]:
    try:
        cluster = SSHCluster(**words(settings, workers))
    except ImportError as error:
        raise EngineError("hosts are reached with asyncssh, which is not here", where="engine: hosts",
                          mend="install it: pip install 'gridcarb[hosts]'") from error
    except Exception as error:  # what SSH and the other side say comes in many classes
        raise EngineError(
            f"workers could not be started over SSH ({type(error).__name__}: {error})", where="engine: hosts",
            mend="check that `ssh HOST` works without a password, and that `python` under `engine` is a Python there "
            "that has gridcarb",
        ) from error
    with cluster:
        yield cluster
