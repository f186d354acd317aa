"""Carrying a plan out: blocks, then the NetCDF export, then figures, then the journal; a whole result or none."""

from __future__ import annotations

import shutil
import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager, suppress
from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from gridcarb.errors import GridcarbError, InputError, Notice
from gridcarb.products import PRODUCTS
from gridcarb.run.derived import draw_figures, make_files
from gridcarb.run.doing import do_blocks
from gridcarb.run.frame import date_of_writing
from gridcarb.run.journal import journal_head, journal_tail
from gridcarb.run.plan import STATUS, STORE, Plan
from gridcarb.run.report import Report, outcome_report
from gridcarb.run.resume import Manner, Start, begin, what_next
from gridcarb.run.stopping import Terminated, ends_tidily, why_it_ended
from gridcarb.run.task import Record, changed_inputs
from gridcarb.run.watching import Watcher
from gridcarb.write.journal import JOURNAL, write_journal
from gridcarb.write.ledger import Marker


@dataclass(frozen=True)
class Outcome:
    """A run that is complete.

    written : what -> where.
    products : product key -> its report.
    seconds : leg of the run -> wall seconds; legs inside tasks are summed over tasks.
    """

    plan: Plan
    written: Mapping[str, Path]
    products: Mapping[str, Any]
    seconds: Mapping[str, float]
    notices: tuple[Notice, ...]

    @property
    def status_counts(self) -> dict[str, int]:
        """Status word -> number of cells."""
        return dict(self.products["ranges"][STATUS])

    def summary(self) -> Report:
        """The outcome in words and numbers."""
        return outcome_report(self)


@dataclass
class _Sums:
    """What the records of the blocks add up to."""

    plan: Plan
    masked: dict[str, int] = field(default_factory=dict)
    seconds: dict[str, float] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self.tallies = {key: product.start(self.plan.fields) for key, product in PRODUCTS.items()}

    def add(self, record: Record | Marker) -> None:
        for key, tally in self.tallies.items():
            tally.merge(record.tallies[key])
        for rule, count in record.masked.items():
            self.masked[rule] = self.masked.get(rule, 0) + count
        for leg, spent in record.seconds.items():
            self.seconds[f"blocks: {leg}"] = self.seconds.get(f"blocks: {leg}", 0.0) + spent

    @contextmanager
    def timed(self, leg: str) -> Iterator[None]:
        begun = time.perf_counter()
        yield
        self.seconds[leg] = time.perf_counter() - begun


def conduct(plan: Plan, watcher: Watcher, manner: Manner = "new") -> Outcome:
    """Do everything the plan says. The result folder gets its name only when all of it is there.

    Parameters
    ----------
    manner : "resume" goes on from what an interrupted run has finished, "anew" throws that away, "new" refuses to.

    Raises
    ------
    GridcarbError : with the incomplete result kept beside the target, and its journal saying why.
    Terminated : at SIGTERM, in the main thread; the incomplete result is kept like after an error.
    """
    with ends_tidily():
        start = begin(plan, manner, date_of_writing())
        return _conduct(start, watcher)


def _conduct(start: Start, watcher: Watcher) -> Outcome:
    begun = datetime.now(UTC)
    plan = start.plan
    sums = _Sums(plan)
    notices = (*plan.notices, *start.notices)
    journal: dict[str, object] = {}
    partial = plan.folder.partial
    try:
        with sums.timed("taking up"):
            notices += start.take_up(sums.add) if start.resumed else ()
        journal |= journal_head(plan, begun, notices, len(start.done) if start.resumed else None)
        write_journal(partial / JOURNAL, journal)
        _fill_store(start, watcher, sums)
        written = _derive_files(plan, watcher, sums)
        start.note_derived(written.values())
        products = {key: tally.report() for key, tally in sums.tallies.items()}
        journal |= journal_tail("complete", products=products, masked_cells=sums.masked, seconds=sums.seconds,
                                written=sorted(written.values()))  # fmt: skip
        write_journal(partial / JOURNAL, journal)
        target = plan.folder.complete()
    except BaseException as error:
        _give_up(start, journal, error, watcher)
        raise
    places = {name: target / inside for name, inside in written.items()}
    return Outcome(plan, {**places, "journal": target / JOURNAL}, products, sums.seconds, notices)


def _fill_store(start: Start, watcher: Watcher, sums: _Sums) -> None:
    plan = start.plan
    if not start.resumed:
        with sums.timed("store"):
            start.lay_foundation()
    if start.resumed:
        watcher.message(f"going on with an interrupted run: {len(start.done):,} of {len(plan.layout):,} blocks are done")
    with sums.timed("blocks"):
        sums.seconds["getting ready"] = do_blocks(start, watcher, sums.add)
    _refuse_changed(plan)
    _refuse_nothing(sums)


def _refuse_changed(plan: Plan) -> None:
    changed = changed_inputs(plan.collection)
    if changed:
        raise InputError(
            "input was changed or moved while the run was reading it", where=", ".join(changed),
            mend="run again when nothing writes to the input",
        )


def _refuse_nothing(sums: _Sums) -> None:
    counts = sums.tallies["ranges"].report()[STATUS]
    if not counts["solved"] + counts["outside_validity"]:
        told = ", ".join(f"{count:,} {word}" for word, count in counts.items() if count)
        raise InputError(
            f"no cell could be computed: {told}", where="inputs",
            mend="check the variables, fill values, units and land masks; `gridcarb plan` shows how they were understood",
        )


def _derive_files(plan: Plan, watcher: Watcher, sums: _Sums) -> dict[str, str]:
    """The NetCDF file and the figures, from the finished store; what -> place inside the result folder."""
    partial, output = plan.folder.partial, plan.recipe.output
    written: dict[str, str] = {}
    if output.zarr:
        written["Zarr store"] = STORE
    if output.netcdf:
        with sums.timed("netcdf"):
            written |= make_files(plan.recipe, partial, watcher)
    if plan.recipe.figures:
        with sums.timed("figures"):
            written |= draw_figures(plan.recipe, partial, watcher)
    if not output.zarr:
        shutil.rmtree(partial / STORE)
    return written


def _give_up(start: Start, journal: Mapping[str, object], error: BaseException, watcher: Watcher) -> None:
    """Leave the incomplete result beside its target, with a journal that says why it ended."""
    state = "failed" if isinstance(error, Exception) else "interrupted"
    told = {"kind": type(error).__name__, "text": why_it_ended(error)}
    # The disk that failed the run may fail its journal too; the first error is the one to tell.
    with suppress(OSError, GridcarbError):
        write_journal(start.plan.folder.partial / JOURNAL, {**journal, **journal_tail(state, error=told)})
    left = start.plan.folder.abandon()
    if isinstance(error, Terminated):
        watcher.message(why_it_ended(error))
    if left.exists():
        watcher.message(f"the incomplete result was left in {left}; {what_next(start)}")
