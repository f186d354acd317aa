"""The event log of a run, for machines: one JSON object a line, each written as it happens."""

from __future__ import annotations

import json
from contextlib import suppress
from datetime import UTC, datetime
from pathlib import Path
from typing import TextIO

from gridcarb.write.disk import room_for

EVENTS = "events.jsonl"
"""The name of the event log in a result folder. A resumed run adds to it."""


class EventLog:
    """The log at `path`.

    Every line holds `time` (UTC, ISO 8601) and `event`: begin, done, retried, halved, failed, end. Those of a block hold
    `block` (1-based, as people are told), `seconds` and `worker`; failures hold what was wrong.
    """

    def __init__(self, path: Path) -> None:
        self._path = path
        with room_for(path, 0):
            self._file: TextIO = path.open("a", encoding="utf-8")

    def put(self, event: str, **more: object) -> None:
        """Add a line."""
        line = json.dumps({"time": datetime.now(UTC).isoformat(timespec="milliseconds"), "event": event, **more},
                          ensure_ascii=False)  # fmt: skip
        with room_for(self._path, len(line)):
            self._file.write(f"{line}\n")
            self._file.flush()

    def close(self) -> None:
        """The end; a disk too full for the last line has been told already."""
        with suppress(OSError):
            self._file.close()
