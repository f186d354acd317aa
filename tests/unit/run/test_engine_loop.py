"""The loop over the blocks, on threads and on a crew that does what it is told: every block once, failures in order."""

from __future__ import annotations

import itertools
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from types import SimpleNamespace
from typing import Any

import pytest

from gridcarb.errors import BlockError, EngineError, InputError, OutputError
from gridcarb.recipe.engine import EngineSettings
from gridcarb.run import loop
from gridcarb.run.engines import open_crew
from gridcarb.run.engines.crew import Answer, Strength
from gridcarb.run.loop import HOPELESS, WINDOW, work_through


@dataclass
class Book:
    """An onlooker that remembers."""

    records: dict[int, Any] = field(default_factory=dict)
    events: list[tuple[str, int]] = field(default_factory=list)
    strengths: list[Strength] = field(default_factory=list)

    def done(self, number: int, answer: Answer) -> None:
        assert number not in self.records
        self.records[number] = answer.record

    def again(self, number: int, answer: Answer, *, halved: bool) -> None:
        self.events.append(("halved" if halved else "again", number))

    def failed(self, number: int, answer: Answer) -> None:
        self.events.append(("failed", number))

    def strength(self, now: Strength) -> None:
        self.strengths.append(now)


class Order:
    """Calls a function of number and parts."""

    def __init__(self, function: Callable[[int, int], Any]) -> None:
        self.function = function

    def ready(self) -> None:
        pass

    def __call__(self, number: int, parts: int) -> Any:
        return self.function(number, parts)


def on_threads(
    function: Callable[[int, int], Any], numbers: Any, workers: int = 2, retries: int = 1, book: Any = None
) -> Book:
    book = book or Book()
    order = Order(function)
    with open_crew(EngineSettings(), workers, order, lambda _: None) as crew:
        work_through(crew, order, numbers, retries=retries, onlooker=book)
    return book


def failing(*numbers: int, error: type[Exception] = BlockError, until: int = 10**9, whole_only: bool = False) -> Any:
    """A function that fails for some numbers: the first `until` times, or only when the block is done whole."""
    calls: dict[int, int] = {}

    def function(number: int, parts: int) -> int:
        calls[number] = calls.get(number, 0) + 1
        if number in numbers and calls[number] <= until and not (whole_only and parts > 1):
            raise error(f"block {number}")
        return parts

    return function


def test_every_number_is_called_once_and_elsewhere() -> None:
    here, seen = threading.get_ident(), []
    book = on_threads(lambda number, _: (seen.append((number, threading.get_ident())), number**2)[1], range(40), workers=3)
    assert sorted(number for number, _ in seen) == list(range(40))
    assert book.records == {number: number**2 for number in range(40)}
    assert here not in {thread for _, thread in seen}
    assert book.strengths[0].workers == 3
    assert book.strengths[0].resident > 1e6


def test_no_more_than_the_workers_at_a_time() -> None:
    lock, at_work, most = threading.Lock(), 0, 0

    def function(*_: int) -> None:
        nonlocal at_work, most
        with lock:
            at_work += 1
            most = max(most, at_work)
        time.sleep(0.002)
        with lock:
            at_work -= 1

    on_threads(function, range(30), workers=3)
    assert most == 3


def test_a_run_without_end_begins_at_once_and_the_crew_knows_of_few() -> None:
    taken: list[int] = []

    def endless() -> Iterator[int]:
        for number in itertools.count():
            taken.append(number)
            yield number

    class Enough(Book):
        def done(self, number: int, answer: Answer) -> None:
            assert len(taken) - len(self.records) <= WINDOW * 2
            super().done(number, answer)
            if len(self.records) == 50:
                raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        on_threads(lambda number, _: number, endless(), book=Enough())
    assert len(taken) < 60


def test_a_block_that_fails_once_is_tried_again() -> None:
    book = on_threads(failing(3, until=1), range(6))
    assert book.events == [("again", 3)]
    assert book.records == dict.fromkeys(range(6), 1)


def test_a_block_that_fails_again_is_done_in_halves() -> None:
    book = on_threads(failing(3, whole_only=True), range(6))
    assert book.events == [("again", 3), ("halved", 3)]
    assert book.records == {**dict.fromkeys(range(6), 1), 3: 2}


def test_a_block_that_still_fails_is_recorded_and_the_others_are_done() -> None:
    book = on_threads(failing(0, 5), range(6), workers=1)
    assert sorted(book.records) == [1, 2, 3, 4]
    assert [event for event, number in book.events if number == 5] == ["again", "halved", "failed"]
    assert [event for event, number in book.events if number == 0] == ["again", "halved", "failed"]


@pytest.mark.parametrize(("retries", "events"), [(0, ["halved", "failed"]), (3, ["again"] * 3 + ["halved", "failed"])])
def test_as_many_retries_as_are_stated(retries, events) -> None:
    assert [event for event, _ in on_threads(failing(0), range(2), retries=retries).events] == events


def test_what_cannot_be_read_whole_cannot_be_read_in_halves() -> None:
    assert on_threads(failing(1, error=InputError), range(3)).events == [("again", 1), ("failed", 1)]


@pytest.mark.parametrize("error", [OutputError, EngineError])
def test_what_no_other_block_would_escape_ends_the_run(error) -> None:
    begun: list[int] = []

    def function(number: int, _: int) -> None:
        begun.append(number)
        time.sleep(0.002)
        if number == 4:
            raise error("the disk is full")

    with pytest.raises(error, match="the disk is full"):
        on_threads(function, range(1000))
    assert len(begun) < 20


def test_when_nothing_can_be_done_the_rest_is_not_begun() -> None:
    calls: list[int] = []

    def function(number: int, _: int) -> None:
        calls.append(number)
        raise InputError("gone")

    book = on_threads(function, range(10_000))
    assert HOPELESS <= len(book.events) / 2 <= HOPELESS + 2 * WINDOW
    assert not book.records
    assert len(calls) < 3 * (HOPELESS + 2 * WINDOW)


def test_many_failures_end_nothing_once_a_block_was_done() -> None:
    book = on_threads(failing(*range(1, 40), error=InputError), range(60))
    assert len(book.records) == 21


def test_an_error_nobody_foresaw_ends_the_run() -> None:
    with pytest.raises(ZeroDivisionError):
        on_threads(lambda number, _: 1 // (number - 3), range(100))


def test_ctrl_c_waits_for_what_is_at_work_and_drops_the_rest() -> None:
    begun, ended = [], []

    def function(number: int, _: int) -> None:
        begun.append(number)
        time.sleep(0.05 if number % 2 else 0.001)
        ended.append(number)

    class Impatient(Book):
        def done(self, number: int, answer: Answer) -> None:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        on_threads(function, range(100), workers=4, book=Impatient())
    assert sorted(ended) == sorted(begun)
    assert len(begun) < 20
    assert not [thread for thread in threading.enumerate() if thread.name.startswith("block")]


def test_the_traceback_of_a_block_comes_along_as_a_note() -> None:
    class Notes(Book):
        def failed(self, number: int, answer: Answer) -> None:
            assert answer.error is not None
            self.records[number] = answer.error

    book = on_threads(failing(0), range(1), book=Notes())
    assert "in function" in book.records[0].__notes__[0]
    assert book.records[0].__traceback__ is None


class Scripted:
    """A crew of workers that come and go; every attempt ends the moment it is submitted."""

    def __init__(self, strengths: list[int], dying: set[int]) -> None:
        self.strengths, self.dying, self.known, self.most = strengths, dying, 0, 0

    def submit(self, order: Any, number: int, parts: int) -> Any:
        self.known += 1
        self.most = max(self.most, self.known)
        died = number in self.dying and parts == 1
        answer = Answer(parts, BlockError("died") if died else None, 0.0, "one", died=died)
        return SimpleNamespace(answer=answer, add_done_callback=lambda call: call(None))

    def collect(self, futures: Any) -> list[Answer]:
        self.known -= len(futures)
        return [future.answer for future in futures]

    def strength(self) -> Strength:
        return Strength(self.strengths.pop(0) if len(self.strengths) > 1 else self.strengths[0], 1)

    def drop(self, futures: Any) -> None:
        pass


def test_the_window_follows_the_workers(monkeypatch) -> None:
    monkeypatch.setattr(loop, "_LOOK", 0.0)
    for workers, most in ((0, WINDOW), (1, WINDOW), (7, 7 * WINDOW)):
        crew, book = Scripted([workers], set()), Book()
        work_through(crew, Order(lambda *_: None), range(100), retries=1, onlooker=book)
        assert crew.most == most
        assert len(book.records) == 100


def test_a_block_that_kills_its_worker_is_halved_at_once() -> None:
    book = Book()
    work_through(Scripted([2], {4}), Order(lambda *_: None), range(9), retries=5, onlooker=book)
    assert book.events == [("halved", 4)]
    assert book.records[4] == 2
