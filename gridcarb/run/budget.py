"""Memory on paper: what a block of so many cells costs, told before the first byte is read."""

from __future__ import annotations

import math
from dataclasses import dataclass

from gridcarb.errors import BudgetError

DEFAULT_TASK_BYTES = 200_000_000
"""What one task may take when the recipe states no memory."""

DEFAULT_KEPT_BYTES = 128_000_000
"""What unpacked chunks of the source may take in each process when the recipe states no memory."""

PROGRAM_BYTES = 400_000_000
"""What the process takes before the first block, for libraries and the compiler (measured); it comes on top."""

_SCRATCH_BYTES = 4_000_000
"""Rows of a chemistry tile, compressed chunks on their way, small things."""

_CLOTHED_ROWS = 9
"""Float64 fields that live together after harmonising: six roles, pressure, density, and one being made."""

_WORKING_ROWS = 5
"""Float64 fields in passing: conversions of temperature and salinity, broadcast inputs. Twelve to thirteen rows in all were
measured at the peak; a test holds what is projected against what is measured."""


@dataclass(frozen=True)
class Footprint:
    """What the cells of a run cost in memory.

    raw_bytes : bytes of all input roles of one cell as stored in the files.
    fields : number of fields solved.
    item_bytes : bytes of a stored value.
    per_volume : whether results are solved in float64 and kept until they are divided by a volume.
    """

    raw_bytes: int
    fields: int
    item_bytes: int
    per_volume: bool = False

    @property
    def bytes_per_cell(self) -> int:
        """Peak bytes of one cell on its way through a task."""
        result = self.item_bytes + (8 if self.per_volume else 0)
        return self.raw_bytes + 8 * (_CLOTHED_ROWS + _WORKING_ROWS) + self.fields * result

    def projected(self, cells: int) -> int:
        """Peak bytes of a task of `cells` cells."""
        return _SCRATCH_BYTES + cells * self.bytes_per_cell

    def cells_within(self, allowed: int) -> int:
        """The most cells a task may have within `allowed` bytes; 0 if none."""
        return max(0, (allowed - _SCRATCH_BYTES) // self.bytes_per_cell)


def allowed_per_task(memory: int | None, workers: int, kept: int = 0) -> int:
    """Bytes one task may take: its share of the memory stated without the chunks `kept`, else the default."""
    return DEFAULT_TASK_BYTES if memory is None else (memory - kept) // workers


def kept_per_process(shared: int, memory: int | None, processes: int, tasks: int) -> int:
    """Bytes of unpacked chunks that each process keeps, so that blocks which share a chunk of the source read it once.

    shared : bytes of the chunks that blocks read one after the other share; 0 where none do.
    tasks : bytes that the smallest blocks of all workers take, which come first.

    Twice as much is kept where there is room, since workers do not all come to the next chunks at once; nothing where there
    is too little, since each chunk would be dropped before it is needed again.
    """
    room = DEFAULT_KEPT_BYTES if memory is None else min(memory // 2, memory - tasks) // processes
    return min(2 * shared, room) if shared <= room else 0


def refuse_over_budget(
    footprint: Footprint, cells: int, *, column: int, unit: int, memory: int | None, workers: int, kept: int = 0
) -> None:
    """Raise BudgetError if a block of `cells` cells would not fit, with the size that would.

    column : cells of one water column at one time. unit : cells of the smallest block. kept : bytes of unpacked chunks.
    """
    needed, allowed = footprint.projected(cells), allowed_per_task(memory, workers, kept)
    if needed <= allowed:
        return
    total = needed * workers + kept
    ways = [f"write `memory: {math.ceil(total / 1e8) / 10:.1f} GB`"]
    if memory and workers > 1 and needed + kept <= memory:
        ways.append(f"`workers: {(memory - kept) // needed}`")
    columns = footprint.cells_within(allowed) // column
    if columns and cells > unit:
        ways.append(f"a smaller `block`, of at most {columns:,} columns times steps")
    more = f"; or smaller chunks of the store: `output: {{chunks: {{time: 1, cells: {columns}}}}}`" if columns else ""
    raise BudgetError(
        f"a block of {cells:,} cells would take {needed / 1e6:,.1f} MB, and each of {workers} workers has "
        f"{allowed / 1e6:,.1f} MB",
        where="engine", mend=f"{' or '.join(ways)} under `engine` in the recipe{more if cells <= unit else ''}",
    )
