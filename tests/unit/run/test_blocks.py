"""Regions tile the grid exactly once, in whole chunks, with whole columns."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gridcarb.axes import Axes
from gridcarb.run.blocks import Layout, lay_out, reads_of_a_chunk

MAP, CELLS, COLUMN = ("y", "x"), ("cell",), ()


def axes_of(time: bool, vertical: bool, horizontal: tuple[str, ...]) -> Axes:
    return Axes("time" if time else None, "lev" if vertical else None, horizontal, None, None, None, None)


@st.composite
def layouts(draw: st.DrawFn) -> tuple[Layout, Axes, dict[str, int], int, dict[str, int]]:
    """A grid of any kind, cut under any limit: the layout, its axes, chunks of the source, the limit, what was stated."""
    axes = axes_of(draw(st.booleans()), draw(st.booleans()), draw(st.sampled_from((MAP, CELLS, COLUMN))))
    sizes = {dim: draw(st.integers(1, 9)) for dim in axes.order}
    source = {dim: draw(st.integers(1, size)) for dim, size in sizes.items() if draw(st.booleans())}
    stated = {key: draw(st.integers(1, 12)) for key in ("time", "cells") if draw(st.booleans())}
    cells = draw(st.integers(0, 400))
    layout = lay_out(sizes, axes, cells=cells, workers=draw(st.integers(1, 4)), source_chunks=source, stated=stated,
                     item_bytes=draw(st.sampled_from((4, 8, 300_000))))
    return layout, axes, source, cells, stated


@given(layouts())
def test_the_regions_cover_every_cell_once(drawn) -> None:
    layout, *_ = drawn
    visits = np.zeros(tuple(layout.sizes.values()), dtype=int)
    for region in layout.regions():
        assert list(region) == list(layout.sizes)
        visits[tuple(region.values())] += 1
    assert (visits == 1).all()
    assert len(list(layout.regions())) == len(layout) == math.prod(layout.counts)


@given(layouts())
def test_blocks_are_whole_columns_and_whole_chunks(drawn) -> None:
    layout, axes, *_ = drawn
    for region in layout.regions():
        if axes.vertical:
            assert region[axes.vertical] == slice(0, layout.sizes[axes.vertical])
        for dim, part in region.items():
            assert part.start % layout.chunks[dim] == 0
            assert part.stop % layout.chunks[dim] == 0 or part.stop == layout.sizes[dim]


@given(layouts())
def test_a_block_keeps_the_limit_unless_one_column_is_more(drawn) -> None:
    layout, axes, _, cells, stated = drawn
    levels = layout.sizes[axes.vertical] if axes.vertical else 1
    columns = math.prod(layout.block[dim] for dim in axes.horizontal)
    steps = layout.block[axes.time] if axes.time else 1
    assert columns <= stated.get("cells", columns)
    assert steps <= stated.get("time", steps)
    if not stated:
        assert layout.cells_per_block <= max(cells, levels)
    assert layout.cells_per_block == levels * columns * steps <= layout.cells


@given(layouts())
def test_cuts_fall_on_edges_of_source_chunks_where_a_block_holds_one(drawn) -> None:
    layout, _, source, *_ = drawn
    for dim, chunk in source.items():
        block = layout.block[dim]
        assert block < chunk or block == layout.sizes[dim] or block % chunk == 0


@given(layouts())
def test_reads_of_a_chunk_are_counted_right(drawn) -> None:
    layout, _, source, *_ = drawn
    reads: dict[tuple[int, ...], int] = {}
    for region in layout.regions():
        touched = [range(part.start // source.get(dim, 1), (part.stop - 1) // source.get(dim, 1) + 1)
                   for dim, part in region.items()]
        for chunk in np.ndindex(*map(len, touched)):
            key = tuple(spread[at] for spread, at in zip(touched, chunk, strict=True))
            reads[key] = reads.get(key, 0) + 1
    assert reads_of_a_chunk(layout, source) == max(reads.values())


def test_a_single_cell_is_one_block_of_no_dimension() -> None:
    layout = lay_out({}, axes_of(False, False, COLUMN), cells=10**6, workers=2, source_chunks={}, stated={}, item_bytes=4)
    assert (len(layout), layout.cells, layout.cells_per_block, list(layout.regions())) == (1, 1, 1, [{}])


@pytest.mark.parametrize(("horizontal", "sizes", "stated", "block"), [
    (MAP, {"time": 12, "lev": 10, "y": 100, "x": 200}, {"time": 1, "cells": 400}, {"time": 1, "y": 2, "x": 200}),
    (MAP, {"time": 12, "lev": 10, "y": 100, "x": 200}, {"time": 5, "cells": 30}, {"time": 5, "y": 1, "x": 30}),
    (CELLS, {"time": 12, "lev": 10, "cell": 20_000}, {"time": 12, "cells": 7_000}, {"time": 12, "cell": 7_000}),
])
def test_a_stated_block_is_taken(horizontal, sizes, stated, block) -> None:
    axes = axes_of(True, True, horizontal)
    layout = lay_out(sizes, axes, cells=10**6, workers=2, source_chunks={}, stated=stated, item_bytes=4)
    assert layout.block == {"lev": 10, **block}


def test_every_worker_gets_some_blocks_of_a_large_grid() -> None:
    sizes = {"time": 120, "lev": 50, "y": 180, "x": 360}
    layout = lay_out(sizes, axes_of(True, True, MAP), cells=10**9, workers=8, source_chunks={}, stated={}, item_bytes=4)
    assert len(layout) >= 4 * 8


def test_stored_chunks_are_neither_the_whole_column_nor_crumbs() -> None:
    sizes = {"time": 120, "lev": 50, "y": 330, "x": 360}
    layout = lay_out(sizes, axes_of(True, True, MAP), cells=10**7, workers=2, source_chunks={}, stated={}, item_bytes=4)
    assert 2**20 <= math.prod(layout.chunks.values()) * 4 <= 2**23
