"""From what a few blocks took to what a whole run will take: plain arithmetic, nothing is read or measured here."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Sample:
    """What one block took, or what neighbouring blocks took on the average.

    wet : cells that were solved.
    legs : leg of the task -> wall seconds.
    core_seconds : how long a core was taken: wall seconds, or CPU seconds of all threads where those are more.
    cpu_seconds : CPU seconds of all threads.
    store_bytes, chunk_files : what was written to the store, compressed.
    marker_bytes : its marker in the ledger.
    file_bytes, file_seconds : its copy in a NetCDF file; 0 where none is wanted.
    """

    cells: float
    wet: float
    legs: Mapping[str, float]
    core_seconds: float
    cpu_seconds: float
    store_bytes: float
    chunk_files: float
    marker_bytes: float
    file_bytes: float = 0.0
    file_seconds: float = 0.0


@dataclass(frozen=True)
class Span:
    """An estimate: all samples together, and the lowest and the highest of any one."""

    likely: float
    lowest: float
    highest: float

    def as_dict(self) -> dict[str, float]:
        """Only what JSON knows."""
        return {"likely": self.likely, "lowest": self.lowest, "highest": self.highest}


@dataclass(frozen=True)
class Costs:
    """What a run will take.

    cells_per_second : of one core.
    shares : leg -> its part of the time of a task, 0 to 1.
    core_hours, block_hours : of all blocks; the latter by the clock, on `cores` cores.
    export_hours, file_bytes : of the NetCDF file, which one core writes once the blocks are done.
    store_bytes, chunk_files, marker_bytes : of the store and its ledger.
    wet : part of the cells of the samples that were solved.
    busy : part of the core's time in which it computed; the rest it waited, for a disk or for others on the machine.
    """

    cores: int
    cells_per_second: Span
    shares: Mapping[str, float]
    core_hours: Span
    block_hours: Span
    export_hours: Span
    store_bytes: Span
    file_bytes: Span
    chunk_files: float
    marker_bytes: float
    wet: float
    busy: float


def blended(first: Sample, neighbour: Sample, blocks_per_chunk: float) -> Sample:
    """A typical block where so many share a chunk of the source: one of them pays for reading it, its neighbours do not.

    first : reads chunks nobody has read before; it alone tells of the NetCDF copy.
    neighbour : needs only chunks that `first` has read.
    """
    part = 1.0 / blocks_per_chunk
    cells = _mean(first.cells, neighbour.cells)

    def typical(one: float, other: float) -> float:
        """Seconds: those of a cell of either block, the dear one as seldom as it comes."""
        return cells * (part * one / first.cells + (1.0 - part) * other / neighbour.cells)

    return Sample(
        cells, _mean(first.wet, neighbour.wet),
        {leg: typical(seconds, neighbour.legs.get(leg, 0.0)) for leg, seconds in first.legs.items()},
        typical(first.core_seconds, neighbour.core_seconds), typical(first.cpu_seconds, neighbour.cpu_seconds),
        _mean(first.store_bytes, neighbour.store_bytes), _mean(first.chunk_files, neighbour.chunk_files),
        _mean(first.marker_bytes, neighbour.marker_bytes),
        cells * first.file_bytes / first.cells, cells * first.file_seconds / first.cells,
    )


def _mean(one: float, other: float) -> float:
    return (one + other) / 2.0


def costs(samples: Sequence[Sample], *, cells: int, blocks: int, cores: int) -> Costs:
    """What a run of so many cells in so many blocks will take, if the rest of it is like the samples.

    Everything grows with the cells, markers with the blocks. The cores are taken not to hinder each other; there is nothing
    to do for more of them than there are blocks.

    samples : at least one.
    """
    used = min(cores, blocks)
    core_hours = _over_cells(samples, lambda block: block.core_seconds, cells / 3600.0)
    pace = _over_cells(samples, lambda block: block.core_seconds, 1.0)
    spent = {leg: math.fsum(block.legs.get(leg, 0.0) for block in samples) for leg in samples[0].legs}
    total = math.fsum(spent.values())
    return Costs(
        cores=used,
        cells_per_second=Span(1 / pace.likely, 1 / pace.highest, 1 / pace.lowest),
        shares={leg: seconds / total for leg, seconds in spent.items()},
        core_hours=core_hours,
        block_hours=Span(core_hours.likely / used, core_hours.lowest / used, core_hours.highest / used),
        export_hours=_over_cells(samples, lambda block: block.file_seconds, cells / 3600.0),
        store_bytes=_over_cells(samples, lambda block: block.store_bytes, cells),
        file_bytes=_over_cells(samples, lambda block: block.file_bytes, cells),
        chunk_files=_over_cells(samples, lambda block: block.chunk_files, cells).likely,
        marker_bytes=blocks * math.fsum(block.marker_bytes for block in samples) / len(samples),
        wet=math.fsum(block.wet for block in samples) / math.fsum(block.cells for block in samples),
        busy=math.fsum(block.cpu_seconds for block in samples) / math.fsum(block.core_seconds for block in samples),
    )


def _over_cells(samples: Sequence[Sample], of: Callable[[Sample], float], cells: float) -> Span:
    """An amount of the samples, spread over so many cells."""
    likely = math.fsum(map(of, samples)) / math.fsum(block.cells for block in samples)
    each = [of(block) / block.cells for block in samples]
    return Span(cells * likely, cells * min(each), cells * max(each))
