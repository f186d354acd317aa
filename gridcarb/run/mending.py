"""Mending a damaged result: what verification found is made again from the inputs, and nothing else is touched."""

from __future__ import annotations

import socket
from collections.abc import Iterable
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path

from gridcarb.run.derived import draw_figures, make_files
from gridcarb.run.plan import STORE
from gridcarb.run.verify import Damage, Inspector, Verdict
from gridcarb.run.watching import Watcher
from gridcarb.run.workshop import Workshop, planned, workshop
from gridcarb.write import lock
from gridcarb.write.encoding import file_checksum
from gridcarb.write.folder import ResultFolder
from gridcarb.write.journal import JOURNAL, read_journal, write_journal
from gridcarb.write.proof import put_file


def verify(result: Path, watcher: Watcher, *, sample: int = 3, repair: bool = False) -> Verdict:
    """Hold a finished result against its ledger, and some of its blocks against another making from the inputs.

    Parameters
    ----------
    result : the folder of the result.
    sample : how many blocks are made again.
    repair : make again what is damaged, and just that.

    Raises
    ------
    OutputError : there is no finished result with a ledger; or a repair is asked for while a run is at work on it.
    """
    result = result.resolve()
    inspector = Inspector(result, watcher)
    if not repair:
        return _verify(inspector, watcher, sample, repair=False)
    held = ResultFolder(result).lock
    lock.take(held, result)
    try:
        return _verify(inspector, watcher, sample, repair=True)
    finally:
        held.unlink(missing_ok=True)


def _verify(inspector: Inspector, watcher: Watcher, sample: int, *, repair: bool) -> Verdict:
    verdict = inspector.look()
    if not sample and not (repair and verdict.damages):
        return verdict
    with workshop(inspector.charter) as shop:
        if not isinstance(shop, Workshop):
            verdict.not_again = shop
            return verdict
        verdict.damages += inspector.compare(shop, inspector.sample(sample))
        if repair and verdict.damages:
            _Mender(inspector, shop, watcher).mend()
    return verdict


class _Mender:
    """Makes again what an inspector found damaged."""

    def __init__(self, inspector: Inspector, shop: Workshop, watcher: Watcher) -> None:
        self._at, self._shop, self._watcher = inspector, shop, watcher
        self._result = inspector.result

    def mend(self) -> None:
        verdict = self._at.verdict
        before = verdict.damages
        if self._at.store is not None:
            self._mend_frame(each for each in before if each.kind == "frame")
        for block in sorted({each.block - 1 for each in before if each.kind in ("marker", "chunk", "numbers")}):
            self._watcher.message(f"making block {block + 1} again")
            self._mend_block(block)
        stale = {each.place for each in before if each.kind == "file"}
        if any(each.kind == "numbers" for each in before):
            stale |= self._at.charter.derived.keys()
        if self._at.store is not None and stale:
            self._mend_files(stale)
        self._look_again(before)
        self._note()

    def _mend_frame(self, damages: Iterable[Damage]) -> None:
        for damage in damages:
            inside = Path(damage.place).relative_to(STORE)
            if file_checksum(self._shop.store / inside) == self._at.charter.fixed[inside.as_posix()]:
                put_file(self._shop.store / inside, self._result / damage.place)

    def _mend_block(self, block: int) -> None:
        marker = self._shop.redo(block)
        for inside, checksum in self._shop.files(marker):
            if self._at.store is not None and file_checksum(self._at.store / inside) != checksum:
                put_file(self._shop.store / inside, self._at.store / inside)
        self._at.ledger.put(marker)

    def _mend_files(self, stale: set[str]) -> None:
        charter, watcher = self._at.charter, self._watcher
        files = {name for name in stale if name.endswith(".nc")}
        if files:
            make_files(charter.recipe(), self._result, watcher)
        if stale - files:
            draw_figures(planned(charter, self._shop.store.parent / "result", figures=True).recipe, self._result, watcher)
        derived = {name: file_checksum(self._result / name) for name in charter.derived}
        self._at.charter = replace(charter, derived=derived)
        self._at.ledger.open(self._at.charter.as_dict())

    def _look_again(self, before: list[Damage]) -> None:
        """What is still damaged is told by another look at all of it; the rest is mended."""
        verdict = self._at.verdict
        found = Inspector(self._result).look()
        verdict.damages = found.damages
        verdict.mended = [each for each in before if each not in found.damages]

    def _note(self) -> None:
        """The journal tells of repairs."""
        path = self._result / JOURNAL
        journal = read_journal(path)
        repairs = journal.get("repairs", [])
        mended = [f"{each.place}: {each}" for each in self._at.verdict.mended]
        told = {"at": datetime.now(UTC).isoformat(timespec="seconds"), "host": socket.gethostname(), "mended": mended}
        write_journal(path, {**journal, "repairs": [*(repairs if isinstance(repairs, list) else []), told]})
