"""Watching a run: a bar on a terminal, one line per 5 % in a log, nothing when quiet. All of it on standard error."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, TextIO

if TYPE_CHECKING:
    from rich.progress import Progress, TaskID

    from gridcarb.run.watching import Watcher

STEP = 5  # per cent between two lines of a log
TOLD = 20  # failed blocks told one by one


def watcher(*, quiet: bool, stream: TextIO | None = None) -> Watcher:
    """The watcher that suits the stream (default: standard error)."""
    stream = stream or sys.stderr
    if quiet:
        return Silence()
    return Bar(stream) if stream.isatty() else Lines(stream)


def rate_words(cells: int, seconds: float) -> str:
    """Cells per second in words of three figures; empty before any time has passed."""
    if seconds <= 0 or not cells:
        return ""
    rate = cells / seconds
    for size, word in ((1e6, " million"), (1e3, " thousand")):
        if rate >= size:
            return f"{rate / size:.3g}{word} cells/s"
    return f"{rate:.3g} cells/s"


def duration_words(seconds: float) -> str:
    """A duration in its two largest units."""
    whole = round(seconds)
    if whole < 60:
        return f"{whole} s"
    if whole < 3600:
        return f"{whole // 60} min {whole % 60} s"
    return f"{whole // 3600} h {whole % 3600 // 60} min"


@dataclass
class Health:
    """How a run fares besides its pace: bytes resident, and blocks that failed."""

    resident: int = 0
    failures: int = 0

    def failed(self, note: str) -> str:
        """Count a failure; what to say of it, if anything: a hundred lines of one kind would hide all others."""
        self.failures += 1
        if self.failures < TOLD:
            return note
        return f"{note}; what fails from here on is only counted here, and told in events.jsonl" * (self.failures == TOLD)

    def words(self) -> str:
        """Such as ``1.25 GB  3 failed``; what is not known or does not exist is left out."""
        memory = f"{self.resident / 1e9:.2f} GB" if self.resident else ""
        return "  ".join(part for part in (memory, f"{self.failures} failed" if self.failures else "") if part)


class Silence:
    """A watcher that says nothing."""

    def start(self, total_blocks: int, cells: int) -> None:
        """Nothing is said."""

    def block_done(self, cells: int, note: str = "") -> None:
        """Nothing is said."""

    def block_failed(self, note: str) -> None:
        """Nothing is said; the error at the end names the block."""

    def strength(self, workers: int, resident: int) -> None:
        """Nothing is said."""

    def message(self, text: str) -> None:
        """Nothing is said."""

    def stop(self) -> None:
        """Nothing is said."""


class Lines:
    """A watcher for logs: one plain line whenever another 5 % of the blocks are done, and one at the end."""

    def __init__(self, stream: TextIO, clock: Callable[[], float] = time.monotonic) -> None:
        self._stream, self._clock = stream, clock
        self._begun = 0.0
        self._total = self._blocks = self._cells = self._told = 0
        self._health = Health()

    def start(self, total_blocks: int, cells: int) -> None:
        """Say how much there is to do."""
        self._begun, self._total = self._clock(), total_blocks
        self.message(f"{total_blocks} block{'s' if total_blocks != 1 else ''}, {cells:,} cells")

    def block_done(self, cells: int, note: str = "") -> None:
        """Count the block; say so when another 5 % are done."""
        if note:
            self.message(note)
        self._blocks += 1
        self._cells += cells
        percent = 100 * self._blocks // max(self._total, 1)
        if percent // STEP > self._told // STEP:
            self._told = percent
            self.message(self._line(percent))

    def block_failed(self, note: str) -> None:
        """Say so, until there have been many."""
        if told := self._health.failed(note):
            self.message(told)

    def strength(self, workers: int, resident: int) -> None:
        """Remember it for the next line."""
        self._health.resident = resident

    def message(self, text: str) -> None:
        """Write a line."""
        self._stream.write(f"{text}\n")
        self._stream.flush()

    def stop(self) -> None:
        """There is nothing to tidy up."""

    def _line(self, percent: int) -> str:
        passed = self._clock() - self._begun
        left = passed * (self._total - self._blocks) / self._blocks
        ending = f"about {duration_words(left)} left" if percent < 100 else f"in {duration_words(passed)}"
        parts = [f"{percent:3d} %", f"{self._blocks} of {self._total} blocks", rate_words(self._cells, passed), ending,
                 self._health.words()]  # fmt: skip
        return "  ".join(part for part in parts if part)


class Bar:
    """A watcher for terminals: a bar with blocks, cells per second and the time left."""

    def __init__(self, stream: TextIO, clock: Callable[[], float] = time.monotonic) -> None:
        from rich.console import Console
        from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

        self._clock = clock
        self._progress: Progress = Progress(
            BarColumn(bar_width=40), MofNCompleteColumn(), TextColumn("blocks  {task.fields[rate]}"),
            TimeRemainingColumn(elapsed_when_finished=True), TextColumn("{task.fields[health]}"),
            console=Console(file=stream, markup=False, highlight=False),
        )
        self._task: TaskID | None = None
        self._begun, self._cells = 0.0, 0
        self._health = Health()

    def start(self, total_blocks: int, cells: int) -> None:
        """Show the bar."""
        self._begun = self._clock()
        self._task = self._progress.add_task("", total=total_blocks, rate=f"{cells:,} cells", health="")
        self._progress.start()

    def block_done(self, cells: int, note: str = "") -> None:
        """Move the bar."""
        if note:
            self.message(note)
        if self._task is not None:
            self._cells += cells
            self._progress.update(self._task, advance=1, rate=rate_words(self._cells, self._clock() - self._begun))

    def block_failed(self, note: str) -> None:
        """Say so above the bar, until there have been many, and count it beside."""
        if told := self._health.failed(note):
            self.message(told)
        self._show_health()

    def strength(self, workers: int, resident: int) -> None:
        """Show it beside the bar."""
        self._health.resident = resident
        self._show_health()

    def _show_health(self) -> None:
        if self._task is not None:
            self._progress.update(self._task, health=self._health.words())

    def message(self, text: str) -> None:
        """Write a line above the bar."""
        self._progress.console.print(text, soft_wrap=True)

    def stop(self) -> None:
        """Leave the bar as it stands."""
        self._progress.stop()
