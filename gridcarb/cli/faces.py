"""What the command line asks of a run, and what it offers to one. Nothing here knows how a run is made."""

from __future__ import annotations

import importlib
from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal, Protocol

from gridcarb.errors import Notice

if TYPE_CHECKING:
    from pathlib import Path

    from gridcarb.recipe import Recipe
    from gridcarb.run.watching import Watcher


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


class Standing(Protocol):
    """How a run stands."""

    def report(self) -> Report:
        """Its state, what is done and what is left."""


class Damage(Protocol):
    """One thing that is not as it was written; in words with `str`."""

    @property
    def place(self) -> str:
        """File inside the result."""

    @property
    def block(self) -> int:
        """Its block, 1-based; 0 if it concerns none."""


class Verdict(Protocol):
    """What a verification found."""

    @property
    def damages(self) -> Sequence[Damage]:
        """What is damaged still."""

    @property
    def not_again(self) -> Sequence[str]:
        """Why nothing could be made again; empty if it could."""

    def report(self) -> Report:
        """What was looked at, what is damaged, what was mended."""


class Plan(Protocol):
    """A run that has been thought through and not begun."""

    def report(self) -> Report:
        """What will be read, how it is understood, what it will cost."""


class Rehearsal(Protocol):
    """A plan of which some blocks have been tried."""

    def report(self) -> Report:
        """What the plan says, and what the run will cost as those blocks told."""


class Outcome(Protocol):
    """A run that is over."""

    def summary(self) -> Report:
        """What was read, computed and written, and what to look at first."""


class Audit(Protocol):
    """Inputs that have been looked at."""

    @property
    def worst(self) -> str:
        """The worst level of its findings: fine, assumed or stop."""

    def report(self) -> Report:
        """What was found."""

    def starter(self, path: Path) -> str:
        """A recipe for it, to be kept at `path`."""


def audit_files(files: Sequence[str]) -> Audit:
    """The audit of files, globs or stores."""
    audit: Audit = importlib.import_module("gridcarb.run").audit_files(files)
    return audit


def audit_recipe(recipe: Recipe) -> Audit:
    """The audit of a recipe with its inputs."""
    audit: Audit = importlib.import_module("gridcarb.run").audit_recipe(recipe)
    return audit


def status(result: Path) -> Standing:
    """How the run of a result stands."""
    standing: Standing = importlib.import_module("gridcarb.run.status").status(result)
    return standing


def verify(result: Path, watcher: Watcher, *, sample: int, repair: bool) -> Verdict:
    """Whether a result is as it was written."""
    run = importlib.import_module("gridcarb.run.mending")
    verdict: Verdict = run.verify(result, watcher, sample=sample, repair=repair)
    return verdict


def prepare(recipe: Recipe) -> Plan:
    """The plan of a recipe: headers are read, nothing is computed or written."""
    plan: Plan = importlib.import_module("gridcarb.run").prepare(recipe)
    return plan


def rehearse(plan: Plan, watcher: Watcher, blocks: int) -> Rehearsal:
    """Do some blocks of a plan aside, to tell what all of them will take."""
    rehearsal: Rehearsal = importlib.import_module("gridcarb.run.rehearsal").rehearse(plan, watcher, blocks)
    return rehearsal


def conduct(plan: Plan, watcher: Watcher, manner: Literal["new", "resume", "anew"]) -> Outcome:
    """Carry a plan out, from the start or from where an interrupted run ended."""
    outcome: Outcome = importlib.import_module("gridcarb.run").conduct(plan, watcher, manner)
    return outcome
