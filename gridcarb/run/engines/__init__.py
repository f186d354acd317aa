"""Who does the blocks: one kind of engine a file, all with one face, the `Crew`.

Libraries of a kind are imported when it is asked for: a run on threads knows nothing of a cluster.
"""

from __future__ import annotations

import importlib
import os
from collections.abc import Callable
from contextlib import AbstractContextManager

from gridcarb.recipe.engine import EngineSettings
from gridcarb.run.engines.crew import Crew, Order

Say = Callable[[str], None]


def cores() -> int:
    """The processors this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def open_crew(settings: EngineSettings, workers: int, order: Order, say: Say) -> AbstractContextManager[Crew]:
    """The crew that the settings ask for, ready to work; when it is left, nobody is at work any more.

    workers : blocks done at the same time, on each machine.
    order : what will be done; each worker looks into it before it is given a block.
    say : told what a person may want to know, such as the address of a dashboard.

    Raises
    ------
    EngineError : no worker can be reached, or none of them can do the order.
    """
    kind = importlib.import_module(f"{__name__}.{settings.chosen}")
    crew: AbstractContextManager[Crew] = kind.crew(settings, workers, order, say)
    return crew


__all__ = ["Crew", "Order", "cores", "open_crew"]
