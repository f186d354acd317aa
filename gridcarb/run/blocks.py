"""Blocks: a stretch of time and a piece of the map with the whole water column. The unit of work, memory and writing."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from gridcarb.axes import Axes

Region = dict[str, slice]

_UNIT_CELLS = 2**19
"""Cells of the smallest block of a large grid: its chunks are large enough to compress and to read at one seek, and a small
machine can hold it. It does not depend on the engine, so that every engine leaves the same files."""

_FEWEST_CELLS = 100_000
"""Cells that are worth a task of their own."""

_CHUNK_BYTES = 2 * 2**20
"""A stored chunk of a field aims at this size: whole water columns are split into a few pieces, so that one level of a map
does not cost all of them."""


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

    def numbers(self, source_chunks: Mapping[str, int], abreast: int = 1) -> Iterator[int]:
        """Every block, those that read the same chunks of the source one after the other.

        abreast : how many processes read for themselves: the blocks of so many groups come in turn, one of each, so that
            each process is mostly given blocks of its own group.
        """
        groups = self._groups(source_chunks)
        while some := list(itertools.islice(groups, abreast)):
            yield from (number for row in itertools.zip_longest(*some) for number in row if number is not None)

    def _groups(self, source_chunks: Mapping[str, int]) -> Iterator[Iterator[int]]:
        """The blocks that lie in the same chunks of the source, chunk by chunk."""
        group = [max(1, round(source_chunks.get(dim, 1) / self.block[dim])) for dim in self.sizes]
        corners = (range(0, count, step) for count, step in zip(self.counts, group, strict=True))
        return (self._within(corner, group) for corner in itertools.product(*corners))

    def _within(self, corner: Sequence[int], group: Sequence[int]) -> Iterator[int]:
        strides = [math.prod(self.counts[place + 1:]) for place in range(len(self.counts))]
        parts = (range(at, min(at + step, count)) for at, step, count in zip(corner, group, self.counts, strict=True))
        for place in itertools.product(*parts):
            yield sum(at * stride for at, stride in zip(place, strides, strict=True))

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
    block: Mapping[str, int], chunks: Mapping[str, int], item_bytes: int,
) -> Layout:
    """Cut a grid into blocks of at most `cells` cells, or of one unit where that has more.

    A unit is the part of the map and of the time that one chunk of the store covers, with the whole water column. It
    follows from the grid, the chunks of the input and `chunks` alone; a block is a number of units.

    Parameters
    ----------
    sizes : dimension -> length in canonical order.
    cells : most cells of a block.
    workers : there should be some blocks for each of them, if the blocks do not become tiny.
    source_chunks : dimension -> chunk length of the input; units and blocks fill these one after the other.
    block, chunks : "time" and "cells" (grid columns) where the recipe states them, of chunks also "levels".
    item_bytes : bytes of a stored value.
    """
    levels = sizes[axes.vertical] if axes.vertical else 1
    total = math.prod(sizes.values())
    bounds = {dim: min(source_chunks.get(dim, 1), size) for dim, size in sizes.items()}
    few = max(_FEWEST_CELLS, min(_UNIT_CELLS, math.ceil(total / 16)))
    unit = _grown(dict.fromkeys(sizes, 1), sizes, axes, bounds, room=max(1, few // levels), stated=chunks)
    places = _count(unit, sizes, axes)
    enough = min(cells, max(_FEWEST_CELLS, math.ceil(total / (4 * workers))))
    lengths = _grown(unit, sizes, axes, bounds, room=max(places, enough // levels), stated=block)
    if axes.vertical:
        unit[axes.vertical] = _levels(chunks.get("levels"), levels, places * levels * item_bytes)
        lengths[axes.vertical] = levels
    return Layout(dict(sizes), lengths, unit)


def _grown(
    lengths: Mapping[str, int], sizes: Mapping[str, int], axes: Axes, bounds: Mapping[str, int], *, room: int,
    stated: Mapping[str, int],
) -> dict[str, int]:
    """Multiply lengths while the columns times steps they hold stay within `room`, or until those `stated` are reached.

    First a chunk of the source is filled, its columns and then its steps; then the map, row by row, and then the time.
    """
    found = dict(lengths)
    if axes.time and "time" in stated:
        found[axes.time] = _whole(stated["time"], lengths[axes.time], sizes[axes.time])
    order = [*axes.horizontal[::-1], *([axes.time] if axes.time and "time" not in stated else [])]
    for limits, dim in itertools.product((bounds, sizes), order):
        if "cells" in stated and dim != axes.time:
            space = stated["cells"] / math.prod(found[each] for each in axes.horizontal)
        else:
            space = room / _count(found, sizes, axes)
        count = math.ceil(limits[dim] / found[dim])
        times = _share(count, space)
        found[dim] = min(found[dim] * times, sizes[dim])
        if times < count:
            break
    return found


def _count(lengths: Mapping[str, int], sizes: Mapping[str, int], axes: Axes) -> int:
    """Columns times steps."""
    return math.prod(lengths[dim] for dim in sizes if dim != axes.vertical)


def _whole(wanted: int, unit: int, size: int) -> int:
    """`wanted`, rounded up to whole units."""
    return min(size, unit * math.ceil(wanted / unit))


def _share(count: int, room: float) -> int:
    """How many of `count` to take together so that they fall into parts of about the same length, none above `room`; one
    where there is no room. Parts that come out even are preferred, if they are not much shorter."""
    if count <= room:
        return count
    even = math.ceil(count / math.ceil(count / max(1, math.floor(room))))
    divisor = max(part for part in range(1, even + 1) if count % part == 0)
    return divisor if 4 * divisor >= 3 * even else even


def _levels(stated: int | None, levels: int, unit_bytes: int) -> int:
    return min(levels, stated or math.ceil(levels / math.ceil(unit_bytes / _CHUNK_BYTES)))


def cells_per_unit(layout: Layout, axes: Axes) -> int:
    """Cells of the smallest block there can be, one chunk of the store with the whole water column."""
    return math.prod(layout.block[dim] if dim == axes.vertical else layout.chunks[dim] for dim in layout.sizes)


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


def shared_part(layout: Layout, source_chunks: Mapping[str, int]) -> Region | None:
    """The part of the grid whose chunks of the source are shared by blocks that are done one after the other; None where
    every block holds whole chunks."""
    if reads_of_a_chunk(layout, source_chunks) == 1:
        return None
    return {dim: slice(0, min(size, max(source_chunks.get(dim, 1), layout.block[dim])))
            for dim, size in layout.sizes.items()}  # fmt: skip
