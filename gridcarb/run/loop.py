"""The loop over the blocks: a sliding window of attempts, and what happens to a block that fails.

However many blocks there are, the crew knows of a few for each worker at a time, so that a run of a million blocks begins
at once and its scheduler stays small. A block that fails is tried again, then done in halves, then recorded as failed; the
others go on.
"""

from __future__ import annotations

import queue
import time
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, replace
from itertools import count
from typing import Any, Protocol

from gridcarb.errors import EngineError, GridcarbError, InputError, OutputError
from gridcarb.run.engines.crew import Answer, Crew, Future, Order, Strength

WINDOW = 2
"""Attempts the crew knows of for each worker: one at work, one at hand."""

HOPELESS = 20
"""When so many blocks have failed and none was done, all would: the rest is not begun."""

_LOOK = 2.0
"""Seconds between two looks at the strength of the crew."""


class Onlooker(Protocol):
    """Told what becomes of the blocks, in the thread that called `work_through`."""

    def done(self, number: int, answer: Answer) -> None:
        """A block is done; the answer holds its record."""

    def again(self, number: int, answer: Answer, *, halved: bool) -> None:
        """A block failed and is tried again, whole or in halves."""

    def failed(self, number: int, answer: Answer) -> None:
        """A block failed for good."""

    def strength(self, now: Strength) -> None:
        """How the crew stands, every few seconds."""


@dataclass(frozen=True)
class Attempt:
    """One attempt at a block: the how many-th, and in how many parts."""

    number: int
    nth: int = 1
    parts: int = 1

    def after(self, answer: Answer, retries: int) -> Attempt | None:
        """The next attempt when this one failed; None if there is none.

        Halves mend what lack of memory broke, not what cannot be read.
        """
        if self.nth <= retries and self.parts == 1 and not answer.died:
            return replace(self, nth=self.nth + 1)
        if self.parts == 1 and not isinstance(answer.error, InputError):
            return replace(self, nth=self.nth + 1, parts=2)
        return None


def work_through(crew: Crew, order: Order, numbers: Iterable[int], *, retries: int, onlooker: Onlooker) -> None:
    """Have every block of `numbers` done.

    However this ends, by an error, Ctrl-C or SIGTERM, it ends when nothing is at work on the store any more.

    Raises
    ------
    OutputError, EngineError : what no other block would escape either, such as a full disk.
    """
    shift = _Shift(crew, order, retries, onlooker)
    try:
        shift.work(iter(numbers))
    except BaseException:
        crew.drop(shift.futures())
        raise


class _Shift:
    def __init__(self, crew: Crew, order: Order, retries: int, onlooker: Onlooker) -> None:
        self._crew, self._order, self._retries, self._onlooker = crew, order, retries, onlooker
        self._tokens = count()
        self._finished: queue.SimpleQueue[int] = queue.SimpleQueue()
        self._under_way: dict[int, tuple[Future, Attempt]] = {}
        self._again: deque[Attempt] = deque()
        self._done = self._failed = 0
        self._room, self._looked = 0, 0.0

    def futures(self) -> list[Future]:
        return [future for future, _ in self._under_way.values()]

    def work(self, fresh: Iterator[int]) -> None:
        while True:
            self._look()
            self._fill(fresh)
            if not self._under_way:
                return
            ended = [self._under_way.pop(token) for token in self._wait()]
            for (_, attempt), answer in zip(ended, self._crew.collect([future for future, _ in ended]), strict=True):
                self._settle(attempt, answer)

    def _look(self) -> None:
        now = time.monotonic()
        if now - self._looked >= _LOOK:
            self._looked = now
            strength = self._crew.strength()
            self._room = WINDOW * max(1, strength.workers)
            self._onlooker.strength(strength)

    def _fill(self, fresh: Iterator[int]) -> None:
        while len(self._under_way) < self._room and not self._hopeless:
            attempt = self._again.popleft() if self._again else _first_of(fresh)
            if attempt is None:
                return
            future, token = self._crew.submit(self._order, attempt.number, attempt.parts), next(self._tokens)
            self._under_way[token] = (future, attempt)
            future.add_done_callback(_putting(self._finished, token))

    @property
    def _hopeless(self) -> bool:
        return self._failed >= HOPELESS and not self._done

    def _wait(self) -> list[int]:
        """Tokens of what has ended, at least one if that does not take too long."""
        try:
            tokens = [self._finished.get(timeout=_LOOK)]
        except queue.Empty:
            return []
        while not self._finished.empty():
            tokens.append(self._finished.get())
        return tokens

    def _settle(self, attempt: Attempt, answer: Answer) -> None:
        if answer.error is None:
            self._done += 1
            self._onlooker.done(attempt.number, answer)
            return
        if isinstance(answer.error, (OutputError, EngineError)):
            raise answer.error
        after = attempt.after(answer, self._retries)
        if after is None:
            self._failed += 1
            self._onlooker.failed(attempt.number, answer)
        else:
            self._again.append(after)
            self._onlooker.again(attempt.number, answer, halved=after.parts > attempt.parts)


def _first_of(fresh: Iterator[int]) -> Attempt | None:
    number = next(fresh, None)
    return None if number is None else Attempt(number)


def _putting(finished: queue.SimpleQueue[int], token: int) -> Callable[[Any], None]:
    return lambda _: finished.put(token)


def failure(error: GridcarbError) -> dict[str, str]:
    """An error as plain data, for the event log and the ledger."""
    return {"kind": type(error).__name__, "where": error.where, "what": error.what, "mend": error.mend}
