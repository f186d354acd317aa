"""How a run begins: from nothing, or where an interrupted one ended."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field, replace
from datetime import datetime
from pathlib import Path
from typing import Literal

from gridcarb.errors import Notice, OutputError
from gridcarb.run.charter import Charter
from gridcarb.run.frame import make_store
from gridcarb.run.plan import STORE, Plan
from gridcarb.run.task import Job
from gridcarb.write.encoding import file_checksum
from gridcarb.write.ledger import LEDGER, DamagedMarkerError, Ledger, Marker
from gridcarb.write.proof import Proof, sweep_store

Manner = Literal["new", "resume", "anew"]
"""`new` refuses to touch what an interrupted run has finished, `resume` goes on from it, `anew` throws it away."""

_UNSETTLED = 120.0
"""Seconds before its last mark in which a machine that died may have marked blocks whose chunks never reached the disk."""


@dataclass
class Start:
    """A run about to begin: it holds the lock and its working folder.

    plan : with the layout of the interrupted run, if one goes on.
    done : numbers of the blocks that need not be done again; filled by `take_up`.
    """

    plan: Plan
    charter: Charter
    ledger: Ledger
    resumed: bool
    notices: tuple[Notice, ...]
    done: set[int] = field(default_factory=set)
    _cells_done: int = 0

    @property
    def store(self) -> Path:
        """The Zarr store."""
        return self.plan.folder.partial / STORE

    @property
    def blocks_left(self) -> int:
        """How many blocks are still to be done."""
        return len(self.plan.layout) - len(self.done)

    @property
    def cells_left(self) -> int:
        """Cells of the blocks still to be done."""
        return self.plan.layout.cells - self._cells_done

    def to_do(self) -> Iterator[int]:
        """The blocks still to be done, in order."""
        return (block for block in self.plan.numbers() if block not in self.done)

    def job(self) -> Job:
        """What the blocks have in common."""
        charter = self.charter
        return replace(self.plan.job(self.plan.folder.partial), recipe=charter.recipe_digest, inputs=charter.inputs_digest)

    def lay_foundation(self) -> None:
        """Make the store, its fields still empty, and open the ledger: from here on the run can be resumed."""
        make_store(self.plan, self.store, self.charter.began)
        self.charter = replace(self.charter, fixed=Proof(self.store).frame())
        self.ledger.open(self.charter.as_dict())

    def note_derived(self, names: Iterable[str]) -> None:
        """Note the checksums of what was made of the finished store."""
        partial = self.plan.folder.partial
        places = [partial / name for name in names if name != STORE]
        files = [file for place in places for file in (place.iterdir() if place.is_dir() else (place,))]
        found = {file.relative_to(partial).as_posix(): file_checksum(file) for file in sorted(files)}
        self.charter = replace(self.charter, derived=found)
        self.ledger.open(self.charter.as_dict())

    def take_up(self, add: Callable[[Marker], None]) -> tuple[Notice, ...]:
        """Go through the marks that are there: `add` the sound ones, drop the others; what was dropped is told."""
        settled = (self.ledger.last() or 0.0) - _UNSETTLED
        store = Proof(self.store)
        dropped: dict[str, list[int]] = {}
        for block, written in list(self.ledger.blocks()):
            try:
                marker = self._sound(block)
            except DamagedMarkerError as error:
                dropped.setdefault(f"its marker is damaged: {error}", []).append(block)
                continue
            if written >= settled and store.damaged_chunks(marker):
                dropped.setdefault("it was finished last, and its chunks are not as its marker says", []).append(block)
                continue
            self.done.add(block)
            self._cells_done += marker.cells
            add(marker)
        for blocks in dropped.values():
            for block in blocks:
                self.ledger.drop(block)
        return tuple(_dropped(why, blocks) for why, blocks in dropped.items())

    def _sound(self, block: int) -> Marker:
        marker = self.ledger.get(block)
        if marker is None or block >= len(self.plan.layout):
            raise DamagedMarkerError("there is no such block")
        if (marker.recipe, marker.inputs) != (self.charter.recipe_digest, self.charter.inputs_digest):
            raise DamagedMarkerError("it is of another run")
        return marker


def begin(plan: Plan, manner: Manner, now: datetime) -> Start:
    """Take the lock, and decide what becomes of what an interrupted run has left.

    Raises
    ------
    OutputError : another run is at work; finished blocks would be lost; or the run to be resumed was of another recipe,
        of other inputs or of another program, with every difference.
    """
    notices = plan.folder.begin(keep_partial=True)
    try:
        return _begin(plan, manner, now, notices)
    except BaseException:
        plan.folder.abandon()
        raise


def _begin(plan: Plan, manner: Manner, now: datetime, notices: tuple[Notice, ...]) -> Start:
    ledger = Ledger(plan.folder.partial / LEDGER)
    old = _charter(ledger)
    finished = ledger.count() if old and (plan.folder.partial / STORE).is_dir() else 0
    if finished and manner == "new":
        raise _unfinished(plan, finished)
    if old and finished and manner == "resume":
        return _go_on(plan, ledger, old, now, notices)
    if manner == "resume":
        notices += (Notice("nothing_to_resume", "no block of an interrupted run was found; this is a run from the start"),)
    notices += plan.folder.clear()
    return Start(plan, Charter.of(plan, now), ledger, False, notices)


def _charter(ledger: Ledger) -> Charter | None:
    try:
        return Charter.read(ledger.charter() or {})
    except TypeError:
        return None


def _go_on(plan: Plan, ledger: Ledger, old: Charter, now: datetime, notices: tuple[Notice, ...]) -> Start:
    layout = old.grid_layout()
    plan = replace(plan, layout=layout) if dict(layout.sizes) == dict(plan.layout.sizes) else plan
    charter = Charter.of(plan, now)
    differences = old.differences(charter)
    if differences:
        raise OutputError(
            "this is not the run that was interrupted:\n" + "\n".join(f"  {text}" for text in differences),
            where=str(plan.folder.partial),
            mend=f"take the change back and use --resume, or begin again with --anew (the {ledger.count():,} blocks that "
            "are finished are lost then)",
        )
    plan.check_budget()
    _refuse_damaged_frame(plan.folder.partial / STORE, old)
    ledger.sweep()
    sweep_store(plan.folder.partial / STORE)
    for rest in plan.folder.partial.glob(".*"):  # half a journal, half a NetCDF file
        rest.unlink()
    # What may change between the two runs is taken from the new one.
    kept = replace(charter, begun=old.begun, fixed=old.fixed)
    ledger.open(kept.as_dict())
    return Start(plan, kept, ledger, True, notices)


def _refuse_damaged_frame(store: Path, old: Charter) -> None:
    damaged = Proof(store).damaged_frame(old.fixed)
    if damaged:
        raise OutputError(
            f"metadata or coordinates of the store are no longer as they were written: {', '.join(damaged[:5])}",
            where=str(store), mend="begin again with --anew",
        )


def what_next(start: Start) -> str:
    """What becomes of what an interrupted run has left, in words."""
    finished, blocks = start.ledger.count(), len(start.plan.layout)
    if not finished:
        return "the next run of this result removes it"
    return f"{finished:,} of {blocks:,} blocks are done: `{_resuming(start.plan)}` goes on from there"


def _resuming(plan: Plan) -> str:
    return f"gridcarb run {plan.recipe.path or 'RECIPE'} --resume"


def _unfinished(plan: Plan, finished: int) -> OutputError:
    return OutputError(
        f"an interrupted run of this result has finished {finished:,} blocks, which would be lost",
        where=str(plan.folder.partial),
        mend=f"go on from there: `{_resuming(plan)}`; or begin again from the first block: --anew instead of --resume",
    )


def _dropped(why: str, blocks: list[int]) -> Notice:
    named = ", ".join(str(block + 1) for block in blocks[:10]) + (" ..." if len(blocks) > 10 else "")
    several = len(blocks) > 1
    return Notice("done_again", f"block{'s' * several} {named} {'are' if several else 'is'} done again: {why}")
