"""What an interrupted run has finished is kept, and what goes on from it must be the same run."""

from __future__ import annotations

import json
import os
import shutil
from pathlib import Path

import pytest

import gridcarb.run.task as tasks
from gridcarb.errors import BlockError, InputError, OutputError
from gridcarb.run import charter as charters
from gridcarb.run import conduct, derived, prepare
from gridcarb.run.status import status
from gridcarb.write.ledger import LEDGER, Ledger

BLOCK = {"workers": 1, "block": {"time": 1, "cells": 24}}
"""Nine blocks."""


@pytest.fixture(autouse=True)
def _one_date(monkeypatch) -> None:
    """Stores that are compared tell the same date."""
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1800000000")


@pytest.fixture
def interrupt(recipe, watcher, tmp_path):
    """Begin a run of nine blocks and press Ctrl-C after so many of them; gives the ledger it leaves."""

    def begin(blocks: int = 4, **sections) -> Ledger:
        class Impatient(type(watcher)):
            def block_done(self, cells: int, note: str = "") -> None:
                super().block_done(cells, note)
                if len(self.done) == blocks:
                    raise KeyboardInterrupt

        with pytest.raises(KeyboardInterrupt):
            conduct(prepare(recipe(**{"engine": BLOCK} | sections)), Impatient())
        return Ledger(tmp_path / "result.partial" / LEDGER)

    return begin


def contents(folder: Path) -> dict[str, bytes]:
    return {str(path.relative_to(folder)): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def whole(recipe, watcher, tmp_path, **sections) -> Path:
    output = {"folder": str(tmp_path / "whole"), "netcdf": False, **sections.pop("output", {})}
    return conduct(prepare(recipe(**{"engine": BLOCK} | sections | {"output": output})), watcher).written["Zarr store"]


@pytest.mark.parametrize("zarr_format", [2, 3])
def test_a_resumed_run_does_the_rest_and_leaves_the_same_bytes(
    recipe, watcher, interrupt, tmp_path, monkeypatch, zarr_format
):
    output = {"zarr_format": zarr_format}
    reference = whole(recipe, type(watcher)(), tmp_path, output=output)
    ledger = interrupt(4, output=output)
    done = ledger.count()
    assert 4 <= done < 9
    again = []
    run_block = tasks._run_block
    monkeypatch.setattr(tasks, "_run_block", lambda job, block, parts: again.append(block) or run_block(job, block, parts))
    outcome = conduct(prepare(recipe(engine=BLOCK, output=output)), watcher, "resume")
    assert len(again) == len(set(again)) == 9 - done
    assert watcher.total == (9 - done, (9 - done) * 120)
    assert contents(outcome.written["Zarr store"]) == contents(reference)
    told, first = (json.loads((folder / "journal.json").read_text()) for folder in (tmp_path / "result", reference.parent))
    assert told["products"] == first["products"]
    assert told["masked_cells"] == first["masked_cells"]
    assert told["blocks_taken_up"] == done
    assert first["blocks_taken_up"] is None


def test_other_workers_memory_and_figures_may_go_on_and_the_blocks_stay(recipe, watcher, interrupt, tmp_path):
    reference = whole(recipe, type(watcher)(), tmp_path)
    interrupt(4)
    other = recipe(engine={"workers": 2, "block": None, "memory": "1 GB"},
                   output={"netcdf": True, "chunks": BLOCK["block"]},
                   figures=[{"kind": "map", "field": "ph_total_scale", "depth": 0}])
    outcome = conduct(prepare(other), watcher, "resume")
    assert len(outcome.plan.layout) == 9
    assert {"NetCDF file", "figure 1"} <= set(outcome.written)
    assert contents(outcome.written["Zarr store"]) == contents(reference)


def test_a_plain_run_neither_goes_on_nor_destroys(recipe, watcher, interrupt, tmp_path):
    done = interrupt(4).count()
    before = contents(tmp_path / "result.partial")
    with pytest.raises(OutputError, match=f"has finished {done} blocks, which would be lost") as caught:
        conduct(prepare(recipe(engine=BLOCK)), watcher)
    assert "--resume`" in caught.value.mend
    assert "--anew" in caught.value.mend
    assert contents(tmp_path / "result.partial") == before
    assert not (tmp_path / "result.lock").exists()
    outcome = conduct(prepare(recipe(engine=BLOCK)), watcher, "anew")
    assert watcher.total[0] == 9
    assert "partial_removed" in {notice.code for notice in outcome.notices}


def test_nothing_to_resume_is_a_run_from_the_start(recipe, watcher):
    outcome = conduct(prepare(recipe(engine=BLOCK)), watcher, "resume")
    assert watcher.total[0] == 9
    assert "nothing_to_resume" in {notice.code for notice in outcome.notices}


@pytest.mark.parametrize(("sections", "difference"), [
    ({"chemistry": {"constants": "practice2022"}}, '`chemistry.constants` was "guide2007", is "practice2022"'),
    ({"chemistry": {"fields": ["revelle_factor"]}}, '"aragonite_saturation"], is ["revelle_factor"]'),
    ({"reading": {"density": "1027 kg m-3"}}, '`reading.density` was "1026 kg m-3", is "1027 kg m-3"'),
    ({"output": {"precision": "float64"}}, '`output.precision` was "float32", is "float64"'),
    ({"title": "Another"}, '`title` was "Marine carbonate system", is "Another"'),
])  # fmt: skip
def test_another_recipe_is_refused_with_the_difference(recipe, watcher, interrupt, tmp_path, sections, difference):
    interrupt(3)
    before = contents(tmp_path / "result.partial")
    with pytest.raises(OutputError, match="not the run that was interrupted") as caught:
        conduct(prepare(recipe(**{"engine": BLOCK} | sections)), watcher, "resume")
    assert difference in caught.value.what
    assert caught.value.what.count("\n") == 1, "this difference and no other"
    assert "--anew" in caught.value.mend
    assert contents(tmp_path / "result.partial") == before
    assert not (tmp_path / "result.lock").exists()


def test_another_input_is_refused_with_the_difference(recipe, watcher, interrupt, ocean_file, tmp_path):
    path = Path(shutil.copy2(ocean_file, tmp_path / "moving.nc"))
    interrupt(3, files=path)
    stamp = path.stat()
    path.touch()
    with pytest.raises(OutputError, match=r"moving\.nc was last changed 20.*, now 20") as caught:
        conduct(prepare(recipe(path, engine=BLOCK)), watcher, "resume")
    assert caught.value.what.count("\n") == 1
    path.write_bytes(path.read_bytes() + b"\0" * 8)
    with pytest.raises(OutputError, match=rf"moving\.nc had {stamp.st_size:,} bytes, has {stamp.st_size + 8:,}"):
        conduct(prepare(recipe(path, engine=BLOCK)), watcher, "resume")
    shutil.copy2(ocean_file, path)
    os.utime(path, ns=(stamp.st_atime_ns, stamp.st_mtime_ns))
    conduct(prepare(recipe(path, engine=BLOCK)), watcher, "resume")


def test_another_program_is_refused(recipe, watcher, interrupt, monkeypatch):
    interrupt(3)
    now = charters.numeric_versions()
    monkeypatch.setattr(charters, "numeric_versions", lambda: {**now, "numpy": "9.9"})
    with pytest.raises(OutputError, match=f"program: numpy was {now['numpy']}, is 9.9"):
        conduct(prepare(recipe(engine=BLOCK)), watcher, "resume")


def damage(path: Path, at: int = -20) -> None:
    content = bytearray(path.read_bytes())
    content[at] ^= 64
    path.write_bytes(content)


def test_a_damaged_marker_counts_as_none_and_is_told(recipe, watcher, interrupt, tmp_path):
    reference = whole(recipe, type(watcher)(), tmp_path)
    ledger = interrupt(5)
    ledger.place(1).write_bytes(ledger.place(1).read_bytes().replace(b'"cells": 120', b'"cells": 121'))
    ledger.place(2).write_bytes(b"")
    done = ledger.count() - 2
    outcome = conduct(prepare(recipe(engine=BLOCK)), watcher, "resume")
    assert watcher.total[0] == 9 - done
    told = [notice.text for notice in outcome.notices if notice.code == "done_again"]
    assert any("block 2 is done again: its marker is damaged: its own checksum" in text for text in told)
    assert any("block 3 is done again: its marker is damaged: it cannot be read" in text for text in told)
    assert contents(outcome.written["Zarr store"]) == contents(reference)


def test_what_never_reached_the_disk_is_done_again(recipe, watcher, interrupt, tmp_path):
    """A machine that dies may keep the name of a marker and lose the chunk written before it."""
    reference = whole(recipe, type(watcher)(), tmp_path)
    ledger = interrupt(5)
    store = tmp_path / "result.partial" / "fields.zarr"
    chunk = min((store / "ph_total_scale").glob("c.*"))
    chunk.write_bytes(b"\0" * 100)
    (chunk.parent / "c.0.0.0.0.0123456789abcdef.partial").write_bytes(b"half")
    (ledger.folder / "0000" / ".0000008.json.99.99").write_bytes(b"half")
    done = ledger.count() - 1
    outcome = conduct(prepare(recipe(engine=BLOCK)), watcher, "resume")
    assert watcher.total[0] == 9 - done
    assert "finished last" in " ".join(notice.text for notice in outcome.notices)
    assert contents(outcome.written["Zarr store"]) == contents(reference)
    assert not list((tmp_path / "result").rglob(".*"))


def test_a_store_with_a_damaged_frame_is_not_gone_on_with(recipe, watcher, interrupt, tmp_path):
    interrupt(3)
    damage(tmp_path / "result.partial" / "fields.zarr" / "lat" / "c.0")
    with pytest.raises(OutputError, match=r"lat/c\.0"):
        conduct(prepare(recipe(engine=BLOCK)), watcher, "resume")


def test_a_run_that_failed_after_its_blocks_only_makes_the_files(recipe, watcher, monkeypatch, tmp_path):
    def fail(*_: object, **__: object) -> None:
        raise InputError("no export")

    with monkeypatch.context() as patch:
        patch.setattr(derived, "export", fail)
        with pytest.raises(InputError, match="no export"):
            conduct(prepare(recipe(engine=BLOCK, output={"netcdf": True})), watcher)
    assert "9 of 9 blocks are done" in watcher.messages[-1]
    again = type(watcher)()
    outcome = conduct(prepare(recipe(engine=BLOCK, output={"netcdf": True})), again, "resume")
    assert again.done == []
    assert outcome.written["NetCDF file"].is_file()


def test_a_block_that_cannot_be_done_is_noted_the_others_complete_and_it_alone_is_done_later(
    recipe, watcher, monkeypatch, tmp_path
):
    reference = whole(recipe, type(watcher)(), tmp_path)
    run_block = tasks._run_block

    def broken(job, number, parts):
        if number == 5:
            raise InputError("the file is cut short", where="march.nc")
        return run_block(job, number, parts)

    with monkeypatch.context() as patch:
        patch.setattr(tasks, "_run_block", broken)
        with pytest.raises(BlockError, match="1 of 9 blocks could not be done"):
            conduct(prepare(recipe(engine=BLOCK)), watcher)
    stands = status(tmp_path / "result")
    assert (stands.state, stands.done, stands.blocks) == ("failed", 8, 9)
    assert stands.failed[6]["what"] == "the file is cut short"
    assert "march.nc (block 6 of 9)" in stands.failed[6]["where"]
    again = type(watcher)()
    outcome = conduct(prepare(recipe(engine=BLOCK)), again, "resume")
    assert len(again.done) == 1
    assert contents(outcome.written["Zarr store"]) == contents(reference)
    assert Ledger(tmp_path / "result" / LEDGER).failures() == {}
