"""What the command line asks of a run, and what it offers to one. Nothing here knows how a run is made."""

from __future__ import annotations

import importlib
from collections.abc import Sequence
from typing import TYPE_CHECKING, Protocol

from gridcarb.errors import Notice

if TYPE_CHECKING:
    from gridcarb.recipe import Recipe


class Section(Protocol):
    """A titled group of rows, each a label and a value, both ready to print."""

    @property
    def title(self) -> str:
        """What the rows are about."""

    @property
    def rows(self) -> Sequence[tuple[str, str]]:
        """Label and value."""


class Report(Protocol):
    """What a plan or a finished run has to say."""

    @property
    def sections(self) -> Sequence[Section]:
        """In the order to be read."""

    @property
    def notices(self) -> Sequence[Notice]:
        """What was decided for the user."""

    def as_dict(self) -> dict[str, object]:
        """The same for machines: only what JSON knows, without NaN or infinities."""


class Plan(Protocol):
    """A run that has been thought through and not begun."""

    def report(self) -> Report:
        """What will be read, how it is understood, what it will cost."""


class Outcome(Protocol):
    """A run that is over."""

    def summary(self) -> Report:
        """What was read, computed and written, and what to look at first."""


class Watcher(Protocol):
    """One who looks on while a run works; called from one thread."""

    def start(self, total_blocks: int, cells: int) -> None:
        """The run begins: so many blocks, so many cells in all."""

    def block_done(self, cells: int, note: str = "") -> None:
        """A block is finished; a note, if any, is worth a line."""

    def message(self, text: str) -> None:
        """Something worth telling at once."""

    def stop(self) -> None:
        """The run is over, well or not; may be called twice."""


def prepare(recipe: Recipe) -> Plan:
    """The plan of a recipe: headers are read, nothing is computed or written."""
    plan: Plan = importlib.import_module("gridcarb.run").prepare(recipe)
    return plan


def conduct(plan: Plan, watcher: Watcher) -> Outcome:
    """Carry a plan out."""
    outcome: Outcome = importlib.import_module("gridcarb.run").conduct(plan, watcher)
    return outcome
