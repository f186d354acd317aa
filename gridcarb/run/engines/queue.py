"""Jobs of a batch queue, which dask-jobqueue submits. The scheduler is in this process; jobs may come at any time."""

from __future__ import annotations

import importlib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

from gridcarb.errors import EngineError
from gridcarb.recipe.engine import EngineSettings, QueueSettings
from gridcarb.run.budget import DEFAULT_TASK_BYTES, PROGRAM_BYTES
from gridcarb.run.engines.crew import Crew, Order
from gridcarb.run.engines.dask_crew import connected, dashboard, own_scheduler

_SYSTEMS = {
    "slurm": ("SLURMCluster", "account"), "pbs": ("PBSCluster", "account"), "sge": ("SGECluster", "project"),
    "lsf": ("LSFCluster", "project"), "oar": ("OARCluster", "project"),
}  # fmt: skip
"""System -> class of dask-jobqueue, and its word for who is charged."""


@contextmanager
def crew(settings: EngineSettings, workers: int, order: Order, say: Callable[[str], None]) -> Iterator[Crew]:
    """A crew of jobs with `workers` processes each; the first that comes begins."""
    with own_scheduler(), cluster(settings, workers) as jobs:
        wanted = settings.queue.jobs if settings.queue else 1
        jobs.scale(jobs=wanted)
        say(f"{wanted} jobs were submitted; the run begins with the first of them")
        with connected(jobs, order, say) as found:
            yield found


def cluster(settings: EngineSettings, workers: int) -> Any:
    """The cluster of dask-jobqueue; no job is submitted yet. `job_script()` of it gives the script.

    Raises
    ------
    EngineError : dask-jobqueue is not installed.
    """
    asked = settings.queue or QueueSettings(system="slurm")
    try:
        jobqueue = importlib.import_module("dask_jobqueue")
    except ImportError as error:
        raise EngineError("a batch queue is reached with dask-jobqueue, which is not here", where="engine: queue",
                          mend="install it: pip install 'gridcarb[queue]'") from error
    return getattr(jobqueue, _SYSTEMS[asked.system][0])(**words(settings, asked, workers))


def words(settings: EngineSettings, asked: QueueSettings, workers: int) -> dict[str, Any]:
    """What dask-jobqueue is told of one job; what the recipe leaves out is left to the user's own dask configuration."""
    said = {
        "cores": workers, "processes": workers, "python": settings.python,
        "memory": f"{_job_bytes(settings, workers)} B", "queue": asked.name, _SYSTEMS[asked.system][1]: asked.account,
        "walltime": asked.walltime, "interface": asked.interface, "job_extra_directives": list(asked.directives) or None,
        "job_script_prologue": list(asked.before) or None, "scheduler_options": dashboard(""),
    }  # fmt: skip
    return {key: value for key, value in said.items() if value is not None}


def _job_bytes(settings: EngineSettings, workers: int) -> int:
    """The blocks at work, and the program once for each process."""
    return (settings.memory_bytes or DEFAULT_TASK_BYTES * workers) + PROGRAM_BYTES * workers
