"""Regions tile the grid exactly once, in whole chunks, with whole columns."""

from __future__ import annotations

import itertools
import math
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gridcarb.axes import Axes
from gridcarb.run.blocks import Layout, cells_per_unit, lay_out, reads_of_a_chunk

MAP, CELLS, COLUMN = ("y", "x"), ("cell",), ()


def axes_of(time: bool, vertical: bool, horizontal: tuple[str, ...]) -> Axes:
    return Axes("time" if time else None, "lev" if vertical else None, horizontal, None, None, None, None)


@st.composite
def layouts(draw: st.DrawFn) -> tuple[Layout, Axes, dict[str, int], dict[str, Any]]:
    """A grid of any kind, cut under any limit: the layout, its axes, chunks of the source, and how it was asked for."""
    axes = axes_of(draw(st.booleans()), draw(st.booleans()), draw(st.sampled_from((MAP, CELLS, COLUMN))))
    sizes = {dim: draw(st.integers(1, 9)) for dim in axes.order}
    source = {dim: draw(st.integers(1, size)) for dim, size in sizes.items() if draw(st.booleans())}
    block = {key: draw(st.integers(1, 12)) for key in ("time", "cells") if draw(st.booleans())}
    chunks = {key: draw(st.integers(1, 12)) for key in ("time", "cells", "levels") if draw(st.booleans())}
    asked = {"cells": draw(st.integers(0, 400)), "workers": draw(st.integers(1, 4)), "block": block, "chunks": chunks,
             "item_bytes": draw(st.sampled_from((4, 8, 300_000)))}
    return lay_out(sizes, axes, source_chunks=source, **asked), axes, source, asked


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
def test_a_block_keeps_the_limit_unless_one_unit_is_more(drawn) -> None:
    layout, axes, _, asked = drawn
    unit = cells_per_unit(layout, axes)
    columns = math.prod(layout.block[dim] for dim in axes.horizontal)
    steps = layout.block[axes.time] if axes.time else 1
    least = (math.prod(layout.chunks[dim] for dim in axes.horizontal), layout.chunks[axes.time] if axes.time else 1)
    assert columns <= max(asked["block"].get("cells", columns), least[0])
    if "time" in asked["block"]:
        assert least[1] > steps - asked["block"]["time"] or steps == least[1]
    if not asked["block"]:
        assert layout.cells_per_block <= max(asked["cells"], unit)
    assert unit <= layout.cells_per_block <= layout.cells


@given(layouts(), st.integers(0, 400), st.integers(1, 9), st.integers(1, 9), st.integers(1, 9))
def test_chunks_of_the_store_do_not_know_the_engine(drawn, cells, workers, time, columns) -> None:
    layout, axes, source, asked = drawn
    other = {**asked, "cells": cells, "workers": workers, "block": {"time": time, "cells": columns}}
    assert lay_out(layout.sizes, axes, source_chunks=source, **other).chunks == layout.chunks


@given(layouts())
def test_stated_chunks_are_at_most_as_long_as_stated(drawn) -> None:
    layout, axes, _, asked = drawn
    stated = asked["chunks"]
    columns = math.prod(layout.chunks[dim] for dim in axes.horizontal)
    assert columns <= stated.get("cells", columns)
    for key, dim in (("time", axes.time), ("levels", axes.vertical)):
        if dim and key in stated:
            assert layout.chunks[dim] == min(stated[key], layout.sizes[dim])


@given(layouts())
def test_every_block_is_numbered_once_and_those_that_share_chunks_follow_each_other(drawn) -> None:
    layout, _, source, _ = drawn
    numbers = list(layout.numbers(source))
    assert sorted(numbers) == list(range(len(layout)))
    if all(source.get(dim, 1) % layout.block[dim] == 0 for dim in layout.sizes):
        corners = [{dim: part.start for dim, part in layout.region(number).items()} for number in numbers]
        seen = [tuple(start // source.get(dim, 1) for dim, start in corner.items()) for corner in corners]
        changes = sum(one != other for one, other in pairwise(seen))
        assert changes == len(set(seen)) - 1


@given(layouts(), st.integers(1, 5))
def test_processes_abreast_are_given_blocks_of_their_own_chunks(drawn, abreast: int) -> None:
    layout, _, source, _ = drawn
    numbers = list(layout.numbers(source, abreast))
    assert sorted(numbers) == list(range(len(layout)))
    if all(source.get(dim, 1) % layout.block[dim] == layout.sizes[dim] % source.get(dim, 1) == 0 for dim in layout.sizes):
        groups = math.prod(layout.sizes[dim] // source.get(dim, 1) for dim in layout.sizes)
        blocks_each, full = len(layout) // groups, groups // abreast * abreast
        for process in range(abreast):
            mine = [layout.region(number) for number in numbers[process:full * blocks_each:abreast]]
            seen = [tuple(part.start // source.get(dim, 1) for dim, part in region.items()) for region in mine]
            assert sum(one != other for one, other in pairwise(seen)) == max(0, len(set(seen)) - 1)


@given(layouts())
def test_reads_of_a_chunk_are_counted_right(drawn) -> None:
    layout, _, source, _ = drawn
    reads: dict[tuple[int, ...], int] = {}
    for region in layout.regions():
        touched = [range(part.start // source.get(dim, 1), (part.stop - 1) // source.get(dim, 1) + 1)
                   for dim, part in region.items()]
        for chunk in np.ndindex(*map(len, touched)):
            key = tuple(spread[at] for spread, at in zip(touched, chunk, strict=True))
            reads[key] = reads.get(key, 0) + 1
    assert reads_of_a_chunk(layout, source) == max(reads.values())


def cut(sizes: dict[str, int], source: dict[str, int], horizontal: tuple[str, ...] = MAP, **asked: Any) -> Layout:
    axes = axes_of("time" in sizes, "lev" in sizes, horizontal)
    asked = {"cells": 700_000, "workers": 2, "block": {}, "chunks": {}, "item_bytes": 4, **asked}
    return lay_out(sizes, axes, source_chunks=source, **asked)


def test_a_single_cell_is_one_block_of_no_dimension() -> None:
    layout = cut({}, {}, COLUMN)
    assert (len(layout), layout.cells, layout.cells_per_block, list(layout.regions())) == (1, 1, 1, [{}])
    assert list(layout.numbers({})) == [0]


@pytest.mark.parametrize(("horizontal", "sizes", "stated", "block"), [
    (MAP, {"time": 12, "lev": 10, "y": 100, "x": 200}, {"time": 1, "cells": 400}, {"time": 1, "y": 2, "x": 200}),
    (MAP, {"time": 12, "lev": 10, "y": 100, "x": 200}, {"time": 5, "cells": 50}, {"time": 5, "y": 1, "x": 50}),
    (CELLS, {"time": 12, "lev": 10, "cell": 21_000}, {"time": 12, "cells": 7_000}, {"time": 12, "cell": 7_000}),
])
def test_stated_chunks_and_blocks_are_taken(horizontal, sizes, stated, block) -> None:
    layout = cut(sizes, {}, horizontal, block=stated, chunks=stated)
    assert layout.block == {"lev": 10, **block}
    assert {**layout.chunks, "lev": 10} == layout.block


def test_a_block_smaller_than_a_chunk_is_one_chunk() -> None:
    sizes = {"time": 12, "lev": 10, "y": 100, "x": 200}
    layout = cut(sizes, {}, chunks={"time": 4, "cells": 1000}, block={"time": 5, "cells": 1})
    assert layout.block == {"time": 8, "lev": 10, "y": 5, "x": 200}


def test_every_worker_gets_some_blocks_of_a_large_grid() -> None:
    layout = cut({"time": 120, "lev": 50, "y": 180, "x": 360}, {}, cells=10**9, workers=8)
    assert len(layout) >= 4 * 8


def test_stored_chunks_are_neither_the_whole_column_nor_crumbs() -> None:
    layout = cut({"time": 120, "lev": 50, "y": 330, "x": 360}, {}, cells=10**7)
    assert 2**19 <= math.prod(layout.chunks.values()) * 4 <= 2**21
    assert layout.chunks["lev"] == 50
    assert cut({"time": 120, "lev": 50, "y": 330, "x": 360}, {}, item_bytes=8).chunks["lev"] == 25


@pytest.mark.parametrize(("source", "unit"), [
    ({"time": 1, "lev": 75, "y": 135, "x": 180}, {"time": 1, "y": 27, "x": 180}),  # five units fill a chunk
    ({"time": 1, "lev": 1, "y": 1080, "x": 1440}, {"time": 1, "y": 4, "x": 1440}),  # whole maps
    ({}, {"time": 1, "y": 4, "x": 1440}),  # contiguous
    ({"time": 12, "lev": 75, "y": 10, "x": 10}, {"time": 12, "y": 10, "x": 40}),  # series
])
def test_units_of_a_large_grid_follow_the_chunks_of_the_source(source, unit) -> None:
    layout = cut({"time": 1800, "lev": 75, "y": 1080, "x": 1440}, source)
    assert {dim: layout.chunks[dim] for dim in unit} == unit
    assert layout.block == {**unit, "lev": 75}


def test_numbers_of_a_million_blocks_begin_at_once() -> None:
    source = {"time": 1, "lev": 75, "y": 135, "x": 180}
    layout = cut({"time": 4000, "lev": 75, "y": 1080, "x": 1440}, source)
    assert len(layout) > 10**6
    assert list(itertools.islice(layout.numbers(source), 6)) == [0, 8, 16, 24, 32, 1]
