"""Orders for workers in other processes, which stand in for blocks."""

from __future__ import annotations

import os
import time
from dataclasses import dataclass

from gridcarb.errors import BlockError, EngineError


@dataclass(frozen=True)
class StandIn:
    """Takes `seconds` for a block and writes its number down.

    deadly : blocks that end their worker when they are done whole.
    broken : blocks that fail however they are done.
    able : whether a worker says it can do the order.
    """

    folder: str
    seconds: float = 0.0
    deadly: tuple[int, ...] = ()
    broken: tuple[int, ...] = ()
    able: bool = True

    def ready(self) -> None:
        if not self.able:
            raise EngineError("this worker cannot read the result folder", where="somewhere")

    def __call__(self, number: int, parts: int) -> tuple[int, int]:
        if number in self.deadly and parts == 1:
            os._exit(1)
        if number in self.broken:
            raise BlockError(f"block {number} is broken")
        begun = os.path.join(self.folder, f"{number}.begun")
        with open(begun, "w", encoding="utf-8"):
            time.sleep(self.seconds)
        os.rename(begun, os.path.join(self.folder, f"{number}.done"))
        return number, parts
