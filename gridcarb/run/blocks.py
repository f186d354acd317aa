"""Blocks: a stretch of time and a piece of the map with the whole water column. The unit of work, memory and writing."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from gridcarb.axes import Axes

Region = dict[str, slice]

_CHUNK_BYTES = 2 * 2**20
"""A stored chunk of a field aims at this size: large enough to compress and to read at one seek, small enough that one
level of one month does not cost a whole water column of a decade."""


@dataclass(frozen=True)
class Layout:
    """How a grid is cut into blocks.

    sizes : dimension -> length, in canonical order.
    block : dimension -> length of a block; the vertical is always whole.
    chunks : dimension -> length of a stored chunk; blocks are made of whole chunks.
    """

    sizes: Mapping[str, int]
    block: Mapping[str, int]
    chunks: Mapping[str, int]

    @property
    def counts(self) -> tuple[int, ...]:
        """How many blocks along each dimension."""
        return tuple(math.ceil(self.sizes[dim] / self.block[dim]) for dim in self.sizes)

    def __len__(self) -> int:
        return math.prod(self.counts)

    @property
    def cells(self) -> int:
        """Cells of the whole grid."""
        return math.prod(self.sizes.values())

    @property
    def cells_per_block(self) -> int:
        """Cells of the largest block."""
        return math.prod(self.block.values())

    def region(self, number: int) -> Region:
        """The part of the grid that block `number` (0-based, the last dimension fastest) covers."""
        found: Region = {}
        for dim, count in reversed(list(zip(self.sizes, self.counts, strict=True))):
            number, place = divmod(number, count)
            start = place * self.block[dim]
            found[dim] = slice(start, min(start + self.block[dim], self.sizes[dim]))
        return dict(reversed(found.items()))

    def extent(self, region: Region, dims: Sequence[str] | None = None) -> tuple[int, ...]:
        """The lengths of a region along `dims` (default: all of the grid)."""
        return tuple(region[dim].stop - region[dim].start for dim in dims or self.sizes)

    def regions(self) -> Iterator[Region]:
        """Every region, in the order of the block numbers."""
        return (self.region(number) for number in range(len(self)))


def lay_out(
    sizes: Mapping[str, int], axes: Axes, *, cells: int, workers: int, source_chunks: Mapping[str, int],
    stated: Mapping[str, int], item_bytes: int,
) -> Layout:
    """Cut a grid into blocks of at most `cells` cells.

    Parameters
    ----------
    sizes : dimension -> length in canonical order.
    cells : most cells of a block.
    workers : there should be some blocks for each of them, if the blocks do not become tiny.
    source_chunks : dimension -> chunk length of the input; a cut falls on its edges where that is possible.
    stated : "time" and "cells" (grid columns) where the recipe states them.
    item_bytes : bytes of a stored value.
    """
    levels = sizes[axes.vertical] if axes.vertical else 1
    columns = math.prod(sizes[dim] for dim in axes.horizontal)
    steps = sizes[axes.time] if axes.time else 1
    enough = max(levels, min(cells, _shared(levels * columns * steps, workers)))
    block = dict(sizes)
    fewest = stated.get("cells") or min(columns, max(1, enough // levels))
    block.update(_piece_of_map(sizes, axes, fewest, source_chunks))
    if axes.time:
        per_step = levels * math.prod(block[dim] for dim in axes.horizontal)
        wanted = stated.get("time") or max(1, enough // per_step)
        block[axes.time] = _on_edges(min(wanted, steps), source_chunks.get(axes.time, 1))
    return Layout(dict(sizes), block, _chunks(block, axes, item_bytes))


def _shared(cells: int, workers: int) -> int:
    """Cells of a block when every worker gets four, but not fewer than are worth a task."""
    worth_a_task = 100_000
    return max(worth_a_task, math.ceil(cells / (4 * workers)))


def _piece_of_map(sizes: Mapping[str, int], axes: Axes, columns: int, source: Mapping[str, int]) -> dict[str, int]:
    """Whole rows as long as they fit, then pieces of one row."""
    found: dict[str, int] = {}
    room = columns
    for dim in reversed(axes.horizontal):
        found[dim] = _on_edges(min(sizes[dim], max(1, room)), source.get(dim, 1), sizes[dim])
        room //= found[dim]
    return found


def _on_edges(length: int, chunk: int, whole: int = 0) -> int:
    """`length`, shortened to a multiple of the source's chunk where it holds at least one; a whole stays whole."""
    return length if length < chunk or length == whole else length - length % chunk


def _chunks(block: Mapping[str, int], axes: Axes, item_bytes: int) -> dict[str, int]:
    chunks = dict(block)
    if axes.vertical:
        layer = math.prod(length for dim, length in block.items() if dim != axes.vertical) * item_bytes
        chunks[axes.vertical] = min(block[axes.vertical], max(1, round(_CHUNK_BYTES / layer)))
    return chunks


def halves(region: Region, axes: Axes) -> tuple[Region, ...]:
    """A region cut in two: in time where it has several steps, else along the longer side of the map; one column is left
    whole."""
    lengths = {dim: region[dim].stop - region[dim].start for dim in region}
    across = sorted(axes.horizontal, key=lambda dim: -lengths[dim])[:1]
    long = [dim for dim in (axes.time, *across) if dim and lengths[dim] > 1]
    if not long:
        return (region,)
    dim = long[0]
    middle = region[dim].start + lengths[dim] // 2
    return {**region, dim: slice(region[dim].start, middle)}, {**region, dim: slice(middle, region[dim].stop)}


def reads_of_a_chunk(layout: Layout, source_chunks: Mapping[str, int]) -> int:
    """How many blocks a chunk of the source is read for, at most."""
    most = 1
    for dim, size in layout.sizes.items():
        chunk, block = source_chunks.get(dim, 1), layout.block[dim]
        starts = range(0, size, chunk)[:10_000]
        most *= max((min(start + chunk, size) - 1) // block - start // block + 1 for start in starts)
    return most
