"""Memory on paper: what a block of so many cells costs, told before the first byte is read."""

from __future__ import annotations

from dataclasses import dataclass

from gridcarb.errors import BudgetError

DEFAULT_TASK_BYTES = 200_000_000
"""What one task may take when the recipe states no memory."""

_SCRATCH_BYTES = 4_000_000
"""Rows of a chemistry tile, compiled code's own stack, small things."""

_CLOTHED_ROWS = 9
"""Float64 fields that live together after harmonising: six roles, pressure, density, and one being made."""

_WORKING_ROWS = 6
"""Float64 fields in passing: conversions of temperature and salinity, broadcast inputs."""


@dataclass(frozen=True)
class Footprint:
    """What the cells of a run cost in memory.

    raw_bytes : bytes of all input roles of one cell as stored in the files.
    fields : number of float64 fields solved.
    item_bytes : bytes of a stored value.
    """

    raw_bytes: int
    fields: int
    item_bytes: int

    @property
    def bytes_per_cell(self) -> int:
        """Peak bytes of one cell on its way through a task."""
        return self.raw_bytes + 8 * (_CLOTHED_ROWS + _WORKING_ROWS) + self.fields * (8 + 2 * self.item_bytes)

    def projected(self, cells: int) -> int:
        """Peak bytes of a task of `cells` cells."""
        return _SCRATCH_BYTES + cells * self.bytes_per_cell

    def cells_within(self, allowed: int) -> int:
        """The most cells a task may have within `allowed` bytes; 0 if none."""
        return max(0, (allowed - _SCRATCH_BYTES) // self.bytes_per_cell)


def allowed_per_task(memory: int | None, workers: int) -> int:
    """Bytes one task may take: its share of the memory stated, else the default."""
    return DEFAULT_TASK_BYTES if memory is None else memory // workers


def refuse_over_budget(footprint: Footprint, cells: int, allowed: int, workers: int) -> None:
    """Raise BudgetError if a block of `cells` cells would not fit, with the size that would."""
    needed = footprint.projected(cells)
    if needed <= allowed:
        return
    fits = footprint.cells_within(allowed)
    raise BudgetError(
        f"a block of {cells:,} cells would take {needed / 1e6:,.0f} MB, and each of {workers} workers has "
        f"{allowed / 1e6:,.0f} MB",
        where="engine",
        mend=f"write `memory: {needed * workers / 1e9 + 0.1:.1f} GB` or fewer `workers` under `engine` in the recipe, "
        f"or a smaller `block` (up to {fits:,} cells with its whole column would fit)",
    )
