"""What one who looks on a run is told."""

from __future__ import annotations

from typing import Protocol


class Watcher(Protocol):
    """One who looks on; called from one thread."""

    def start(self, total_blocks: int, cells: int) -> None:
        """The blocks begin: so many, so many cells in all."""

    def block_done(self, cells: int, note: str = "") -> None:
        """A block is done; a note, if any, is worth a line."""

    def block_failed(self, note: str) -> None:
        """A block failed for good."""

    def strength(self, workers: int, resident: int) -> None:
        """Every few seconds: how many blocks are done at a time, and the bytes all processes have resident."""

    def message(self, text: str) -> None:
        """Something worth telling at once."""

    def stop(self) -> None:
        """The blocks are over, well or not; may be called twice."""
