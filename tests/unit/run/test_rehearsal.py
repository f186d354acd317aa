"""A rehearsal leaves nothing behind, and what it tells of a run is what the run then takes."""

from __future__ import annotations

import json
import os
import tempfile
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

import gridcarb.run.task as tasks
from gridcarb.errors import BlockError, InputError, OutputError
from gridcarb.run import conduct, prepare, rehearsal
from gridcarb.run.blocks import Layout
from gridcarb.run.costs import Sample, Span, blended, costs
from gridcarb.run.rehearsal import Rehearsal, blocks_per_chunk, bytes_of_inputs, neighbour, rehearse, spread_blocks
from gridcarb.run.report import lasting


def cut(cells: int = 36, **output: object) -> dict[str, dict[str, object]]:
    """The sections of a recipe that make blocks of one month and so many columns, half of the map by default."""
    return {"engine": {"workers": 2, "block": {"time": 1, "cells": cells}}, "output": output}


@pytest.fixture
def aside(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Where temporary folders are made meanwhile."""
    place = tmp_path / "aside"
    place.mkdir()
    monkeypatch.setattr(tempfile, "tempdir", str(place))
    return place


@pytest.fixture
def rehearsed(recipe, watcher) -> Callable[..., Rehearsal]:
    return lambda blocks=3, **words: rehearse(prepare(recipe(**cut(**words))), watcher, blocks)


def rows(found: Rehearsal) -> dict[str, str]:
    (section,) = [section for section in found.report().sections if section.title.startswith("What it will cost")]
    return dict(section.rows)


def test_costs_are_plain_arithmetic() -> None:
    one = Sample(100, 50, {"read": 1.0, "solve": 3.0}, 4.0, 3.0, 1000, 4, 10, 800, 0.5)
    other = Sample(300, 250, {"read": 3.0, "solve": 1.0}, 2.0, 1.5, 1400, 4, 20, 2400, 1.5)
    found = costs([one, other], cells=144_000, blocks=480, cores=3)
    assert found.core_hours == Span(0.6, 144_000 * 2 / 300 / 3600, 1.6)
    assert found.block_hours == Span(found.core_hours.likely / 3, found.core_hours.lowest / 3, found.core_hours.highest / 3)
    assert found.cells_per_second.as_dict() == pytest.approx({"likely": 400 / 6, "lowest": 25.0, "highest": 150.0})
    assert found.store_bytes.as_dict() == pytest.approx({"likely": 864_000, "lowest": 672_000, "highest": 1_440_000})
    assert found.file_bytes.as_dict() == pytest.approx({"likely": 1_152_000, "lowest": 1_152_000, "highest": 1_152_000})
    assert found.export_hours.likely == pytest.approx(0.2)
    assert (found.shares, found.wet, found.busy, found.cores) == ({"read": 0.5, "solve": 0.5}, 0.75, 0.75, 3)
    assert (found.chunk_files, found.marker_bytes) == (2880, 7200)


def test_there_is_nothing_to_do_for_more_cores_than_blocks() -> None:
    sample = Sample(100, 50, {"solve": 3.6}, 3.6, 3.6, 1000, 4, 10)
    found = costs([sample], cells=200, blocks=2, cores=64)
    assert (found.cores, found.core_hours.likely, found.block_hours.likely) == (2, 0.002, 0.001)


def test_of_blocks_that_share_a_chunk_one_pays_for_reading_it() -> None:
    first = Sample(100, 80, {"read": 10.0, "solve": 2.0}, 12.0, 8.0, 500, 4, 10, 300, 0.5)
    after = Sample(300, 40, {"read": 6.0, "solve": 6.0}, 12.0, 12.0, 300, 8, 20)
    found = blended(first, after, 4)
    assert found.legs == pytest.approx({"read": 8.0, "solve": 4.0})
    assert replace(found, legs={}) == Sample(200, 60, {}, 12.0, 10.0, 400, 6, 15, 600, 1.0)


@pytest.mark.parametrize(("steps", "places", "wanted", "found"), [
    (1, 1, 3, [0]), (2, 2, 4, [0, 1, 2, 3]), (12, 1, 3, [2, 6, 10]), (1, 9, 3, [1, 4, 7]), (1800, 8, 1, [7204]),
    (1800, 8, 3, [300 * 8 + 1, 900 * 8 + 6, 1500 * 8 + 4]),
])
def test_blocks_are_spread_over_time_and_the_map(steps: int, places: int, wanted: int, found: list[int]) -> None:
    assert spread_blocks(steps, places, wanted) == found


@pytest.mark.parametrize("wanted", range(1, 21))
@pytest.mark.parametrize(("steps", "places"), [(2, 11), (5, 5), (1000, 21), (1, 40)])
def test_as_many_blocks_as_wanted_and_no_stretch_of_time_left_out(steps: int, places: int, wanted: int) -> None:
    found = spread_blocks(steps, places, wanted)
    assert len(set(found)) == wanted
    assert min(found) >= 0
    assert max(found) < steps * places
    if wanted <= steps:
        assert len({number // places for number in found}) == wanted
    if wanted <= places:
        assert len({number % places for number in found}) == wanted


def test_how_many_blocks_need_a_chunk() -> None:
    sizes = {"time": 4, "lat": 10, "lon": 8}
    layout = Layout(sizes, {"time": 1, "lat": 2, "lon": 8}, {})
    assert blocks_per_chunk(layout, {"time": 1, "lat": 2, "lon": 8}) == 1
    assert blocks_per_chunk(layout, {}) == 1
    assert blocks_per_chunk(layout, {"time": 4}) == 4
    assert blocks_per_chunk(layout, {"lat": 5, "lon": 8}) == 3
    assert [neighbour(layout, {"lat": 4, "lon": 8}, number) for number in range(6)] == [1, 0, 3, 2, None, 6]
    fine = Layout(sizes, {"time": 1, "lat": 2, "lon": 4}, {})
    assert [neighbour(fine, {"lat": 4, "lon": 4}, number) for number in range(10)] == [2, 3, 0, 1, 6, 7, 4, 5, None, None]
    assert neighbour(Layout(sizes, sizes, {}), {"lat": 4}, 0) is None
    assert [neighbour(layout, {"time": 2, "lat": 2}, number) for number in range(0, 20, 5)] == [5, 0, 15, 10]


def test_it_leaves_nothing_behind_and_says_how_far_it_is(rehearsed, watcher, aside, tmp_path) -> None:
    found = rehearsed()
    assert found.blocks == (0, 3, 5)
    assert watcher.total == (3, 540)
    assert watcher.done == [180, 180, 180]
    assert list(aside.iterdir()) == []
    assert [path.name for path in tmp_path.iterdir()] == ["aside"]


def test_when_all_blocks_are_rehearsed_it_tells_what_the_run_then_writes(rehearsed, recipe, watcher, tmp_path) -> None:
    found = rehearsed(blocks=6, netcdf=True)
    conduct(prepare(recipe(**cut(netcdf=True))), watcher)
    result = tmp_path / "result"
    store = {path: path.stat().st_size for path in (result / "fields.zarr").rglob("*") if path.is_file()}
    markers = [path.stat().st_size for path in (result / "ledger").rglob("0*.json")]
    assert len(markers) == 6
    assert found.files == len(store) + len(markers)
    assert found.costs.store_bytes.likely + found.frame_bytes == pytest.approx(sum(store.values()), abs=100)  # the date
    assert found.costs.marker_bytes == pytest.approx(sum(markers), rel=0.2)
    assert 0 < found.costs.file_bytes.lowest < found.costs.file_bytes.highest
    assert found.costs.export_hours.lowest > 0
    report = json.loads((result / "journal.json").read_text())
    solved = report["products"]["ranges"]["solution_status"]
    assert found.costs.wet == (solved["solved"] + solved["outside_validity"]) / 1080


def test_without_a_netcdf_file_none_is_told(rehearsed) -> None:
    found = rehearsed(blocks=1)
    assert found.costs.file_bytes == found.costs.export_hours == Span(0, 0, 0)
    assert "NetCDF copy" not in rows(found)


def test_neighbours_are_done_where_blocks_share_chunks_of_the_source(rehearsed, watcher) -> None:
    found = rehearsed(blocks=2, cells=12)
    assert (len(found.plan.layout), found.neighbours, len(found.blocks), len(watcher.done)) == (18, 2, 4, 4)
    assert {number // 3 for number in found.blocks} == {0, 5}
    assert "2 of them to share chunks with another" in rows(found)["measured"]


def test_a_block_may_be_its_neighbours_neighbour(rehearsed, watcher) -> None:
    found, apart = rehearsed(blocks=18, cells=12), rehearsed(blocks=6, cells=36)
    assert (len(found.blocks), found.neighbours, found.cells) == (18, 0, 1080)
    assert (len(watcher.done), watcher.total) == (36 + 6, (6, 1080))
    assert found.costs.chunk_files > 2.5 * apart.costs.chunk_files  # three times as many, but none of only fill


def test_the_report_is_the_plan_and_a_section_more(rehearsed) -> None:
    found = rehearsed(netcdf=True)
    plain, told = found.plan.report(), found.report()
    titles = [section.title for section in told.sections]
    assert titles == [
        "What will be read", "How it is understood", "What will be computed", "What it will take",
        "What it will cost, measured on 3 blocks", "Where it will go",
    ]
    assert [section for section in told.sections if section.title != titles[4]] == plain.sections
    shown = rows(found)
    assert list(shown) == ["measured", "speed of a core", "spent on", "core-hours", "by the clock", "NetCDF copy",
                           "files in", "store out", "files out", "room"]  # fmt: skip
    assert shown["measured"].startswith("540 of 1,080 cells")
    assert "on 2 cores" in shown["by the clock"]
    assert [part.split()[0] for part in shown["spent on"].partition(";")[0].split(", ")] == list(found.costs.shares)
    assert shown["room"].endswith("free: it fits")
    data = told.as_dict()
    cost = data.pop("cost")
    assert data == plain.as_dict()
    assert json.loads(json.dumps(cost, allow_nan=False)) == cost
    assert cost["blocks"] == [1, 4, 6]
    assert cost["core_hours"]["lowest"] <= cost["core_hours"]["likely"] <= cost["core_hours"]["highest"]
    assert cost["core_hours"]["likely"] == pytest.approx(1080 / cost["cells_per_second"]["likely"] / 3600)
    assert 0 < cost["busy_share"] <= 1
    assert sum(cost["shares"].values()) == pytest.approx(1)


def test_a_result_that_would_not_fit_is_told(rehearsed) -> None:
    found = rehearsed(netcdf=True)
    store, file, most = found.costs.store_bytes.likely, found.costs.file_bytes.likely, found.needed[1]
    fixed = found.frame_bytes + found.costs.marker_bytes
    assert found.needed[0] == pytest.approx(store + file + fixed)
    for free, words, state in (
        (most - 1, "it might not fit", "output: {netcdf: false}"),
        (store + fixed + 1, "it would not fit", "output: {netcdf: false}"),
        (10, "it would not fit", "output: {folder: ...}"),
    ):
        short = replace(found, free=int(free))
        assert rows(short)["room"].endswith(words)
        assert [(notice.code, notice.state) for notice in short.notices[len(found.notices):]] == [("room_short", state)]
        assert short.report().as_dict()["notices"][-1]["code"] == "room_short"


def test_land_alone_tells_nothing_of_water(rehearsed) -> None:
    found = rehearsed(blocks=1)
    assert "caution" not in rows(found)
    dry = replace(found, costs=replace(found.costs, wet=0.0))
    assert "all of these blocks were land" in rows(dry)["caution"]


@pytest.mark.parametrize("raised", [InputError("the file breaks off", where="ocean.nc"), ValueError("odd")])
def test_a_block_that_fails_is_told_as_by_a_run(rehearsed, monkeypatch, aside, raised) -> None:
    def fail(*_: object) -> None:
        raise raised

    monkeypatch.setattr(tasks, "_solve", fail)
    with pytest.raises(BlockError, match="would end incomplete") as caught:
        rehearsed()
    (reason,) = caught.value.others
    assert "block 2 of 6" in caught.value.where
    assert "block 2 of 6" in reason.where
    assert str(raised) in f"{reason.what}{raised}"
    assert list(aside.iterdir()) == []


@pytest.mark.parametrize("raised", [KeyboardInterrupt(), OutputError("the disk is full")])
def test_what_ends_a_run_at_once_ends_a_rehearsal(rehearsed, watcher, monkeypatch, aside, raised) -> None:
    begun: list[int] = []
    do_block = rehearsal.do_block

    def stopped(job, number):
        begun.append(number)
        if len(begun) == 3:
            raise raised
        return do_block(job, number)

    monkeypatch.setattr(rehearsal, "do_block", stopped)
    with pytest.raises(type(raised)):
        rehearsed()
    assert begun == [1, 0, 3]
    assert watcher.done == [180]
    assert list(aside.iterdir()) == []


def test_bytes_of_files_and_of_stores(recipe, ocean, ocean_file, tmp_path) -> None:
    assert bytes_of_inputs(prepare(recipe()).collection) == ocean_file.stat().st_size
    store = tmp_path / "ocean.zarr"
    dataset = ocean()
    encoding = {name: {"chunks": (1, 5, 3, 12)} for name in dataset.data_vars}
    for variable in dataset.variables.values():
        variable.encoding.clear()
        variable.attrs.pop("_FillValue", None)
    unread = (dataset["so"].dims, dataset["so"].values)
    dataset.assign(unread=unread).to_zarr(store, encoding=encoding, consolidated=False)
    read = [path for name in dataset.data_vars for path in (store / str(name)).rglob("*") if path.is_file()]
    assert bytes_of_inputs(prepare(recipe(store)).collection) == sum(path.stat().st_size for path in read)
    inner = tmp_path / "groups.zarr"
    dataset[["so"]].to_zarr(inner, encoding={"so": encoding["so"]}, consolidated=False)
    rest = {name: words for name, words in encoding.items() if name != "so"}
    dataset.drop_vars("so").to_zarr(inner, group="model", encoding=rest, consolidated=False)
    grouped = prepare(recipe(f"{inner}#model")).collection  # which lends the salinity from the group above
    assert bytes_of_inputs(grouped) == sum(path.stat().st_size for path in read)


@pytest.mark.parametrize(("folders", "files"), [(1, 40), (40, 1), (7, 13)])
def test_a_large_store_is_weighed_by_some_of_its_files(tmp_path, monkeypatch, folders: int, files: int) -> None:
    monkeypatch.setattr(rehearsal, "_FILES", 5)
    monkeypatch.setattr(rehearsal, "_FOLDERS", 5)
    for folder in range(folders):
        (tmp_path / "all" / str(folder)).mkdir(parents=True)
        for file in range(files):
            (tmp_path / "all" / str(folder) / str(file)).write_bytes(b"x" * 30)
    entered: list[object] = []
    scandir = os.scandir
    monkeypatch.setattr(os, "scandir", lambda place: entered.append(place) or scandir(place))
    assert rehearsal._bytes_below(tmp_path / "all") == pytest.approx(30 * folders * files)
    assert len(entered) == 1 + min(folders, 5)


def test_times_in_words() -> None:
    assert [lasting(seconds) for seconds in (0.123, 12, 600, 7200, 36_000 * 24, 2.16e11)] == [
        "0.12 s", "12 s", "10 min", "2 h", "10 days", "2,500,000 days"]  # fmt: skip
