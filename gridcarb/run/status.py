"""How a run stands, told from what lies on the disk: any terminal that sees the result folder may ask."""

from __future__ import annotations

import time
from collections.abc import Mapping
from dataclasses import asdict, dataclass, field
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, Literal

from gridcarb.errors import OutputError
from gridcarb.run.charter import Charter
from gridcarb.run.report import Report, Rows, Section
from gridcarb.write.folder import ResultFolder
from gridcarb.write.journal import JOURNAL, read_journal
from gridcarb.write.ledger import LEDGER, Ledger
from gridcarb.write.lock import Holder, holder_of

State = Literal["beginning", "running", "finishing", "interrupted", "failed", "complete"]

_WORDS = {
    "beginning": "beginning: no block yet", "running": "running", "finishing": "all blocks are done, files are being made",
    "interrupted": "interrupted", "failed": "failed", "complete": "complete",
}
_SHOWN = 10


@dataclass(frozen=True)
class Standing:
    """How a run stands.

    seen : whether the process could be looked at; one of another host is taken to live.
    cells_per_second, seconds_left : None where nothing tells them.
    failed : block (1-based) -> why it could not be done.
    earlier : whether a complete result of an earlier run stands meanwhile.
    """

    result: Path
    state: State
    blocks: int = 0
    done: int = 0
    cells: int = 0
    begun: str | None = None
    ended: str | None = None
    cells_per_second: float | None = None
    seconds_left: float | None = None
    failed: Mapping[int, Mapping[str, str]] = field(default_factory=dict)
    error: str | None = None
    host: str | None = None
    pid: int | None = None
    seen: bool = True
    earlier: bool = False

    def report(self) -> Report:
        """The standing in words and as plain data."""
        rows: Rows = [("state", _WORDS[self.state]), ("blocks", f"{self.done:,} of {self.blocks:,} done")]
        if self.pid is not None:
            unseen = "" if self.seen else "; whether it lives cannot be seen from here"
            rows.append(("process", f"{self.pid} on {self.host}{unseen}"))
        rows += [(name, when) for name, when in (("begun", self.begun), ("ended", self.ended)) if when]
        if self.cells_per_second is not None:
            rows.append(("speed", f"{self.cells_per_second:,.0f} cells per second"))
        if self.seconds_left is not None:
            rows.append(("time left", f"about {_lasting(self.seconds_left)}"))
        if self.error:
            rows.append(("ended with", " ".join(self.error.split())))
        if self.earlier:
            rows.append(("beside it", "the result of an earlier run stands, until this one is complete"))
        if self.state in ("interrupted", "failed") and self.done:
            rows.append(("to go on", "gridcarb run RECIPE --resume"))
        sections = [Section(str(self.result), rows)]
        if self.failed:
            shown = [(f"block {block}", told.get("what", "")) for block, told in list(self.failed.items())[:_SHOWN]]
            rest = [("...", f"and {len(self.failed) - _SHOWN:,} more")] * (len(self.failed) > _SHOWN)
            sections.append(Section("Failed blocks", [*shown, *rest]))
        return Report(sections, (), self.as_dict())

    def as_dict(self) -> dict[str, object]:
        """Only what JSON knows."""
        failed = [{"block": block, **told} for block, told in self.failed.items()]
        return asdict(self) | {"result": str(self.result), "failed": failed}


def status(result: Path) -> Standing:
    """How the run of a result stands, or has ended.

    Raises
    ------
    OutputError : there is nothing of that name.
    """
    if result.name.endswith(".partial"):
        result = result.with_name(result.name.removesuffix(".partial"))
    folder = ResultFolder(result)
    holder = holder_of(folder.lock)
    living = holder is not None and not holder.is_dead()
    if folder.partial.is_dir():
        return _standing(folder, folder.partial, holder, living=living)
    if living and not folder.target.exists():
        assert holder is not None
        return Standing(folder.target, "beginning", host=holder.host, pid=holder.pid, seen=holder.is_of_this_host())
    if folder.target.is_dir() and (folder.target / JOURNAL).is_file():
        return _standing(folder, folder.target, None, living=False)
    raise OutputError("there is no result of that name, and no run of it", where=str(folder.target),
                      mend="name the result folder, as under `output: {folder: ...}` in the recipe")


def _standing(folder: ResultFolder, place: Path, holder: Holder | None, *, living: bool) -> Standing:
    journal = read_journal(place / JOURNAL)
    ledger = Ledger(place / LEDGER)
    done, (blocks, cells) = ledger.count(), _extent(ledger, journal)
    state = _state(journal, living=living, done=done, blocks=blocks)
    rate = _rate(journal, ledger, done, cells / blocks if blocks else 0.0)
    left = (blocks - done) * cells / blocks / rate if rate and state == "running" else None
    error = journal.get("error")
    return Standing(
        folder.target, state, blocks, done, cells, journal.get("begun"), journal.get("ended"), rate, left,
        {block + 1: told for block, told in ledger.failures().items()},
        str(error["text"]) if isinstance(error, dict) and "text" in error and not living else None,
        holder.host if holder else None, holder.pid if holder else None,
        holder is None or holder.is_of_this_host(), place == folder.partial and folder.target.exists(),
    )  # fmt: skip


def _state(journal: Mapping[str, Any], *, living: bool, done: int, blocks: int) -> State:
    told = journal.get("state")
    if living:
        return "beginning" if not done else "finishing" if done == blocks else "running"
    # A journal that says "running" without a process was left by one that died without a word.
    return told if told in ("failed", "complete") else "interrupted"


def _extent(ledger: Ledger, journal: Mapping[str, Any]) -> tuple[int, int]:
    """Blocks and cells in all, from the charter, or from the plan in the journal before there is one."""
    try:
        layout = Charter.read(ledger.charter() or {}).grid_layout()
    except (KeyError, TypeError):
        return int(journal.get("plan", {}).get("blocks", {}).get("count", 0)), 0
    return len(layout), layout.cells


def _rate(journal: Mapping[str, Any], ledger: Ledger, done: int, cells_of_a_block: float) -> float | None:
    """Cells per second since the present process began, up to the last block it has done."""
    fresh, last = done - int(journal.get("blocks_taken_up") or 0), ledger.last()
    if fresh <= 0 or last is None or not cells_of_a_block:
        return None
    spent = last - datetime.fromisoformat(journal["begun"]).astimezone(UTC).timestamp()
    return fresh * cells_of_a_block / spent if spent > 0 else None


def _lasting(seconds: float) -> str:
    if seconds < 100:
        return f"{seconds:.0f} s"
    return time.strftime("%H h %M min", time.gmtime(seconds)) if seconds < 86_400 else f"{seconds / 86_400:.1f} days"
