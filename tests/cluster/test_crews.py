"""Blocks that kill their worker, blocks that fail, workers that cannot do the work: on processes of this machine."""

from __future__ import annotations

import time
from pathlib import Path
from typing import Any

import pytest

from gridcarb.errors import EngineError
from gridcarb.recipe.engine import EngineSettings
from gridcarb.run.engines import open_crew
from gridcarb.run.engines.crew import Answer, Strength
from gridcarb.run.loop import WINDOW, work_through
from tests.cluster.orders import StandIn


class Book:
    """An onlooker that remembers."""

    def __init__(self, enough: int = 10**9) -> None:
        self.parts: dict[int, int] = {}
        self.events: list[tuple[str, int]] = []
        self.strengths: list[Strength] = []
        self.enough = enough

    def done(self, _: int, answer: Answer) -> None:
        number, parts = answer.record
        self.parts[number] = parts
        if len(self.parts) == self.enough:
            raise KeyboardInterrupt

    def again(self, number: int, answer: Answer, *, halved: bool) -> None:
        self.events.append(("halved" if halved else "again", number))

    def failed(self, number: int, answer: Answer) -> None:
        self.events.append(("failed", number))

    def strength(self, now: Strength) -> None:
        self.strengths.append(now)


def work(order: StandIn, book: Book, numbers: Any = range(30), **engine: Any) -> list[str]:
    said: list[str] = []
    with open_crew(EngineSettings.model_validate(engine), 2, order, said.append) as crew:
        work_through(crew, order, numbers, retries=1, onlooker=book)
    return said


def test_a_block_that_kills_its_worker_is_done_in_halves(tmp_path: Path) -> None:
    book = Book()
    said = work(StandIn(str(tmp_path), deadly=(7,), broken=(11,)), book, kind="processes")
    assert book.parts == {number: 1 + (number == 7) for number in range(30) if number != 11}
    assert [event for event, number in book.events if number == 7] == ["halved"]
    assert [event for event, number in book.events if number == 11] == ["again", "halved", "failed"]
    assert book.strengths[0].workers == 2
    assert book.strengths[0].resident > 1e8
    assert "starting 2 processes" in said


def test_nothing_is_at_work_after_ctrl_c_and_few_had_been_sent(cluster, tmp_path: Path) -> None:
    with pytest.raises(KeyboardInterrupt):
        work(StandIn(str(tmp_path), seconds=0.2), Book(enough=3), range(10**6), address=cluster.address)
    names = [path.suffix for path in tmp_path.iterdir()]
    assert ".begun" not in names
    time.sleep(0.5)
    assert len(list(tmp_path.iterdir())) == len(names) <= 3 + 2 * WINDOW


def test_a_worker_that_cannot_do_the_work_is_named(cluster, tmp_path: Path) -> None:
    with pytest.raises(EngineError, match="cannot read the result folder") as caught:
        work(StandIn(str(tmp_path), able=False), Book(), address=cluster.address)
    assert caught.value.where.startswith("worker tcp://127.0.0.1:")
