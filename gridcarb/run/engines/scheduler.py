"""A dask scheduler that runs already, with whatever workers it has and gets."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager

from gridcarb.recipe.engine import EngineSettings
from gridcarb.run.engines.crew import Crew, Order
from gridcarb.run.engines.dask_crew import connected


@contextmanager
def crew(settings: EngineSettings, _: int, order: Order, say: Callable[[str], None]) -> Iterator[Crew]:
    """The workers of the scheduler at the address of the settings."""
    with connected(str(settings.address), order, say) as found:
        yield found
