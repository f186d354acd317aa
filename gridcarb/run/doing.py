"""From a run that has begun to a store with every block in it: the crew, the loop, and the book that is kept of it."""

from __future__ import annotations

import os
import socket
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress

from gridcarb.errors import BlockError, GridcarbError, OutputError
from gridcarb.held_memory import give_back_memory
from gridcarb.run.engines import open_crew
from gridcarb.run.engines.crew import Answer, Strength
from gridcarb.run.events import EVENTS, EventLog
from gridcarb.run.loop import HOPELESS, failure, work_through
from gridcarb.run.order import placed_order
from gridcarb.run.resume import Start
from gridcarb.run.task import Record
from gridcarb.run.watching import Watcher
from gridcarb.sources import keep_chunks

_TOLD = 10
"""Failed blocks that are told one by one; the event log and the ledger hold all."""


def do_blocks(start: Start, watcher: Watcher, add: Callable[[Record], None]) -> float:
    """Have every block done that is still to do; `add` is called with each record. Gives the seconds before the first.

    Raises
    ------
    BlockError : some could not be done; all others are.
    OutputError, EngineError : what ended the run at once.
    """
    plan, engine = start.plan, start.plan.recipe.engine
    with placed_order(start.job(), plan.folder.partial) as order, _book(start, watcher, add) as book, _tidied():
        begun = time.perf_counter()
        with open_crew(engine, plan.workers, order, watcher.message) as crew:
            spent = time.perf_counter() - begun
            watcher.start(start.blocks_left, start.cells_left)
            work_through(crew, order, start.to_do(), retries=engine.retries, onlooker=book)
        watcher.stop()
        book.tell()
    return spent


@contextmanager
def _tidied() -> Iterator[None]:
    """Afterwards this process keeps nothing of the blocks it has done."""
    try:
        yield
    finally:
        keep_chunks(0)
        give_back_memory()


@contextmanager
def _book(start: Start, watcher: Watcher, add: Callable[[Record], None]) -> Iterator[_Book]:
    engine, begun = start.plan.recipe.engine, time.perf_counter()
    log = EventLog(start.plan.folder.partial / EVENTS)
    book = _Book(start, watcher, log, add)
    state = "interrupted"
    try:
        log.put("begin", blocks=len(start.plan.layout), to_do=start.blocks_left, cells=start.cells_left,
                engine=engine.chosen, workers=start.plan.workers, host=socket.gethostname(), pid=os.getpid())  # fmt: skip
        yield book
        state = "complete"
    except GridcarbError:
        state = "failed"
        raise
    finally:
        with suppress(OSError, OutputError):  # the disk that failed the run may fail its log too
            log.put("end", state=state, done=book.done_blocks, failed=book.failed_blocks,
                    seconds=round(time.perf_counter() - begun, 3))  # fmt: skip
        log.close()


class _Book:
    """What became of each block: counted, logged, told."""

    def __init__(self, start: Start, watcher: Watcher, log: EventLog, add: Callable[[Record], None]) -> None:
        self._start, self._watcher, self._log, self._add = start, watcher, log, add
        self.done_blocks = self.failed_blocks = 0
        self._errors: list[GridcarbError] = []

    def done(self, number: int, answer: Answer) -> None:
        """A block is done."""
        record: Record = answer.record
        self.done_blocks += 1
        self._log.put("done", block=number + 1, cells=record.cells, **_who(answer))
        self._add(record)
        self._watcher.block_done(record.cells)

    def again(self, number: int, answer: Answer, *, halved: bool) -> None:
        """A block failed and is tried again."""
        assert answer.error is not None
        self._log.put("halved" if halved else "retried", block=number + 1, **_who(answer), **failure(answer.error))
        if halved:
            self._watcher.message(f"{self._named(number)} failed again and is done in halves: {answer.error.what}")

    def failed(self, number: int, answer: Answer) -> None:
        """A block failed for good."""
        assert answer.error is not None
        self.failed_blocks += 1
        self._log.put("failed", block=number + 1, **_who(answer), **failure(answer.error))
        self._start.ledger.put_failure(number, failure(answer.error))
        self._watcher.block_failed(f"{self._named(number)} failed: {answer.error.what}")
        if len(self._errors) < _TOLD:
            self._errors.append(answer.error)

    def strength(self, now: Strength) -> None:
        """Pass it on."""
        self._watcher.strength(now.workers, now.resident)

    def tell(self) -> None:
        """Raise what could not be done, if anything."""
        if not self.failed_blocks:
            return
        blocks = len(self._start.plan.layout)
        rest = "" if self.done_blocks or self.failed_blocks < HOPELESS else "; as none could, the rest was not begun"
        told = BlockError(
            f"{self.failed_blocks:,} of {blocks:,} blocks could not be done{rest}",
            where=str(self._start.plan.folder.partial),
            mend=f"mend what is told below (all of them are in {EVENTS}), then go on with --resume",
        )
        told.others = tuple(self._errors)
        for error in self._errors:
            for note in getattr(error, "__notes__", ()):
                told.add_note(note)
        raise told

    def _named(self, number: int) -> str:
        return f"block {number + 1:,} of {len(self._start.plan.layout):,}"


def _who(answer: Answer) -> dict[str, object]:
    return {"seconds": round(answer.seconds, 3), "worker": answer.worker}
