"""Verifying a finished result: every block there, every chunk as it was written, a sample made again from the inputs."""

from __future__ import annotations

import itertools
import random
from collections.abc import Iterable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import asdict, dataclass, field
from pathlib import Path
from typing import Literal

from gridcarb.errors import OutputError
from gridcarb.run.charter import Charter
from gridcarb.run.engines import cores
from gridcarb.run.plan import FILE, STORE
from gridcarb.run.report import Report, Section
from gridcarb.run.watching import Watcher
from gridcarb.run.workshop import Workshop
from gridcarb.write.encoding import file_checksum
from gridcarb.write.ledger import LEDGER, DamagedMarkerError, Ledger, Marker
from gridcarb.write.proof import FileProof, Proof

_SLAB = 1000
"""Blocks looked at between two looks at the watcher."""

_SHOWN = 50
"""Damages that are printed one by one; the JSON document holds all."""

Kind = Literal["marker", "frame", "chunk", "numbers", "file"]


@dataclass(frozen=True)
class Damage:
    """One thing that is not as it was written.

    kind : "marker" of a block in the ledger, "frame" (metadata or coordinates of the store), "chunk" of a field, "numbers"
        that another making does not give, or "file" made of the store.
    place : file inside the result.
    block : 1-based, 0 if it concerns none.
    """

    kind: Kind
    place: str
    what: str
    block: int = 0
    field: str = ""

    def __str__(self) -> str:
        named = f"block {self.block}: " * bool(self.block) + f"{self.field}: " * bool(self.field)
        return f"{named}{self.what}"


@dataclass
class Verdict:
    """What a verification found.

    blocks, chunks : how many were looked at.
    again : blocks that were made again and compared (1-based).
    not_again : why none could be.
    mended : what was damaged and is whole again.
    """

    result: Path
    blocks: int = 0
    chunks: int = 0
    files: list[str] = field(default_factory=list)
    again: list[int] = field(default_factory=list)
    not_again: list[str] = field(default_factory=list)
    damages: list[Damage] = field(default_factory=list)
    mended: list[Damage] = field(default_factory=list)

    def report(self) -> Report:
        """The verdict in words and as plain data."""
        again = ", ".join(f"block {number}" for number in self.again) or "none"
        looked = [
            ("blocks", f"{self.blocks:,}"), ("chunk files", f"{self.chunks:,}"),
            *(("file", name) for name in self.files), ("made again", again),
            *(("not made again", why) for why in self.not_again),
        ]
        sections = [Section(f"Looked at in {self.result}", looked)]
        for title, damages in (("Damaged", self.damages), ("Mended", self.mended)):
            rows = [(each.place, str(each)) for each in damages[:_SHOWN]]
            if len(damages) > _SHOWN:
                rows.append(("...", f"and {len(damages) - _SHOWN:,} more; --json lists all"))
            if rows:
                sections.append(Section(title, rows))
        if not self.damages:
            sections.append(Section("Verdict", [("whole", "everything is as it was written")]))
        return Report(sections, (), self.as_dict())

    def as_dict(self) -> dict[str, object]:
        """Only what JSON knows."""
        return {
            "result": str(self.result), "whole": not self.damages, "blocks": self.blocks, "chunks": self.chunks,
            "files": self.files, "made_again": self.again, "not_made_again": self.not_again,
            "damages": [asdict(each) for each in self.damages], "mended": [asdict(each) for each in self.mended],
        }  # fmt: skip


class Inspector:
    """Looks at a finished result and changes nothing.

    Raises
    ------
    OutputError : it is no finished result, or has no ledger that can be read.
    """

    def __init__(self, result: Path, watcher: Watcher | None = None) -> None:
        self.result, self._watcher = result, watcher
        self.ledger = Ledger(result / LEDGER)
        self.charter = read_charter(result)
        self.layout = self.charter.grid_layout()
        self.store: Path | None = result / STORE if self.charter.settings["output"]["zarr"] else None
        self._proof = Proof(result / STORE)
        self.verdict = Verdict(result)

    def look(self) -> Verdict:
        """Frame, blocks and files; a sample is left to `compare`."""
        if self._watcher:
            self._watcher.start(len(self.layout), self.layout.cells)
        self.verdict.damages = [*self.frame(), *self.all_blocks()]
        if self._watcher:
            self._watcher.stop()
        self.verdict.damages += self.files()
        return self.verdict

    def frame(self) -> list[Damage]:
        """Metadata and coordinates of the store."""
        if self.store is None:
            return []
        names = self._proof.damaged_frame(self.charter.fixed)
        return [_file_damage("frame", self.store / name, f"{STORE}/{name}") for name in names]

    def all_blocks(self) -> Iterator[Damage]:
        """Markers, chunk files, and the numbers in the NetCDF file."""
        with ThreadPoolExecutor(cores()) as pool, FileProof(self.result / FILE) as file:
            for slab in _slabs(range(len(self.layout)), _SLAB):
                for found, chunks in pool.map(self._block, slab, itertools.repeat(file)):
                    yield from found
                    self.verdict.blocks += 1
                    self.verdict.chunks += chunks
                    if self._watcher:
                        self._watcher.block_done(self.layout.cells // len(self.layout))

    def _block(self, block: int, file: FileProof) -> tuple[list[Damage], int]:
        try:
            marker = self.marker(block)
        except DamagedMarkerError as error:
            place = self.ledger.place(block).relative_to(self.result).as_posix()
            return [Damage("marker", place, str(error), block + 1)], 0
        looked = sum(map(len, marker.chunks.values())) if self.store else 0
        return [*self.chunks(marker), *self._in_file(marker, file)], looked

    def marker(self, block: int) -> Marker:
        """The marker of a block, which must be there and of this run."""
        found = self.ledger.get(block)
        if found is None:
            raise DamagedMarkerError("the block has no marker")
        if (found.recipe, found.inputs) != (self.charter.recipe_digest, self.charter.inputs_digest):
            raise DamagedMarkerError("it is the marker of another run")
        return found

    def chunks(self, marker: Marker) -> list[Damage]:
        """Chunk files of a block that are not as they were written."""
        if self.store is None:
            return []
        try:
            found = self._proof.damaged_chunks(marker)
        except Exception as error:  # whatever Zarr says of metadata that are damaged
            return [Damage("chunk", STORE, f"cannot be reached ({type(error).__name__})", marker.block + 1)]
        return [_file_damage("chunk", path, path.relative_to(self.result).as_posix(), marker.block + 1, field)
                for field, path in found]  # fmt: skip

    def _in_file(self, marker: Marker, file: FileProof) -> list[Damage]:
        return [Damage("file", FILE, "holds other numbers than were written", marker.block + 1, field)
                for field in file.damaged_fields(marker)]  # fmt: skip

    def files(self) -> list[Damage]:
        """What was made of the store: the NetCDF file and the figures."""
        self.verdict.files = list(self.charter.derived)
        found = []
        for name, noted in self.charter.derived.items():
            self._say(f"looking at {name}")
            if file_checksum(self.result / name) != noted:
                found.append(_file_damage("file", self.result / name, name))
        return found

    def compare(self, shop: Workshop, blocks: Sequence[int]) -> list[Damage]:
        """Make these blocks again and hold what they give against what is there, to the last bit."""
        found = []
        for block in blocks:
            self._say(f"making block {block + 1} of {len(self.layout)} again")
            again, marker = shop.redo(block), self.marker(block)
            found += [Damage("numbers", STORE, "made again it gives other numbers", block + 1, field)
                      for field in again.values if again.values[field] != marker.values.get(field)
                      or again.chunks[field] != marker.chunks.get(field)]  # fmt: skip
            self.verdict.again.append(block + 1)
        return found

    def _say(self, text: str) -> None:
        if self._watcher:
            self._watcher.message(text)

    def sample(self, wanted: int) -> list[int]:
        """Some of the blocks that were found whole, another choice each time."""
        bad = {damage.block - 1 for damage in self.verdict.damages}
        blocks = range(len(self.layout))
        drawn = random.sample(blocks, min(len(blocks), wanted))
        return sorted(block for block in drawn if block not in bad)


def read_charter(result: Path) -> Charter:
    """The charter of a finished result.

    Raises
    ------
    OutputError : there is none.
    """
    if not result.is_dir():
        partial = result.parent / f"{result.name}.partial"
        left = "an interrupted run has left part of it" if partial.is_dir() else "there is no such result"
        mend = f"`gridcarb status {result}` tells how far it came" if partial.is_dir() else "name the folder of a result"
        raise OutputError(left, where=str(result), mend=mend)
    content = Ledger(result / LEDGER).charter()
    try:
        return Charter.read(content or {})
    except TypeError:
        what = "its ledger cannot be read" if content or (result / LEDGER).exists() else "it has no ledger"
        raise OutputError(
            f"{what}, so nothing tells how the result was written", where=str(result),
            mend="run its recipe again with --replace; results have a ledger since they can be resumed",
        ) from None


def _file_damage(kind: Kind, path: Path, place: str, block: int = 0, field: str = "") -> Damage:
    what = "is not as it was written" if path.is_file() else "is missing"
    return Damage(kind, place, what, block, field)


def _slabs(numbers: Iterable[int], length: int) -> Iterator[list[int]]:
    rest = iter(numbers)
    while slab := list(itertools.islice(rest, length)):
        yield slab
