"""What the loop over the blocks knows of those who do them."""

from __future__ import annotations

import os
import socket
import threading
import time
import traceback
from collections import Counter
from collections.abc import Callable, Sequence
from contextlib import suppress
from dataclasses import dataclass
from typing import Any, Protocol

import psutil

from gridcarb.errors import GridcarbError


class Order(Protocol):
    """A piece of work that can be sent to another process: small, for it travels with every task, and hashable."""

    def ready(self) -> None:
        """Get ready in this process; told once to every worker that is there at the beginning."""

    def __call__(self, number: int, parts: int) -> Any:
        """Do block `number`, in so many parts one after another."""


@dataclass(frozen=True)
class Answer:
    """What came of one attempt at one block: a record or an error, the seconds it took, and who it was.

    died : the worker itself came to its end, most likely for want of memory.
    """

    record: Any
    error: GridcarbError | None
    seconds: float
    worker: str
    died: bool = False


class Future(Protocol):
    """A promise of an answer."""

    def add_done_callback(self, fn: Callable[[Any], Any], /) -> Any: ...


@dataclass(frozen=True)
class Strength:
    """How many blocks can be done at a time at present, and the bytes the crew has resident."""

    workers: int
    resident: int


class Crew(Protocol):
    """Those who do the blocks."""

    def submit(self, order: Order, number: int, parts: int) -> Future:
        """Put one attempt at a block in the queue."""

    def collect(self, futures: Sequence[Any]) -> list[Answer]:
        """The answers of futures that are done.

        Raises
        ------
        EngineError : the crew is lost.
        """

    def strength(self) -> Strength:
        """How the crew stands at this moment; cheap enough to be asked every few seconds."""

    def drop(self, futures: Sequence[Any]) -> None:
        """Forget what has not begun, and come back when nothing is at work any more."""


_AT_WORK: Counter[Order] = Counter()
_AT_WORK_LOCK = threading.Lock()


def attempt(order: Order, number: int, parts: int) -> Answer:
    """One attempt, where the work is done. Errors of the family are answers: they carry the traceback as a note."""
    begun = time.perf_counter()
    record, fault = None, None
    _count(order, 1)
    try:
        record = order(number, parts)
    except GridcarbError as error:
        told = "".join(traceback.format_exception(error)).rstrip()
        fault = error.with_traceback(None)
        fault.add_note(told)
    finally:
        _count(order, -1)
    return Answer(record, fault, time.perf_counter() - begun, myself())


def is_at_work(order: Order) -> bool:
    """Whether this process is doing a block of an order at this moment."""
    with _AT_WORK_LOCK:
        return _AT_WORK[order] > 0


def _count(order: Order, change: int) -> None:
    with _AT_WORK_LOCK:
        _AT_WORK[order] += change


def myself() -> str:
    """This worker: host, process, and thread where there are several."""
    thread = threading.current_thread().name.rpartition("_")[2]
    return f"{socket.gethostname()}:{os.getpid()}" + (f":{thread}" if thread.isdigit() else "")


def resident_bytes(*, children: bool = True) -> int:
    """Bytes resident of this process, and of all it has started."""
    total = 0
    me = psutil.Process()
    for process in (me, *(me.children(recursive=True) if children else ())):
        with suppress(psutil.Error):  # ended between the list and the look
            total += process.memory_info().rss
    return total
