"""A run in which blocks fail: the others are done, the list is told and logged, and the run can be gone on with."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

import gridcarb.run.task as tasks
from gridcarb.errors import BlockError, InputError
from gridcarb.run import conduct, prepare
from gridcarb.write.ledger import LEDGER, Ledger

ENGINE = {"workers": 2, "block": {"time": 1, "cells": 24}}


def events(folder: Path) -> list[dict]:
    return [json.loads(line) for line in (folder / "events.jsonl").read_text(encoding="utf-8").splitlines()]


def failing(
    monkeypatch: pytest.MonkeyPatch, where: dict[str, int], error: Callable[[], Exception], *, halves_too: bool = True
) -> None:
    """Blocks that begin at this place fail with this error; with `halves_too`, also when they are done in halves."""
    solve = tasks._solve

    def meddled(job, region, clock):
        whole = region["lon"].stop - region["lon"].start == 12
        if all(region[dim].start == start for dim, start in where.items()) and (whole or halves_too):
            raise error()
        return solve(job, region, clock)

    monkeypatch.setattr(tasks, "_solve", meddled)


def test_the_others_are_done_and_the_rest_can_be_gone_on_with(recipe, watcher, monkeypatch, tmp_path, same_bits) -> None:
    whole = conduct(prepare(recipe(engine=ENGINE, output={"folder": str(tmp_path / "whole")})), watcher)
    made = recipe(engine=ENGINE)
    with monkeypatch.context() as patch:
        failing(patch, {"time": 1}, lambda: InputError("the file breaks off", where="ocean.nc"))
        with pytest.raises(BlockError, match="3 of 9 blocks could not be done") as caught:
            conduct(prepare(made), watcher)
    error = caught.value
    assert error.exit_code == 6
    assert str(tmp_path / "result.partial") == error.where
    assert "--resume" in error.mend
    assert sorted(other.where for other in error.others) == [f"ocean.nc (block {number} of 9)" for number in (4, 5, 6)]
    assert "the first 3 of them:" in str(error)
    assert len(watcher.failed) == 3
    told = events(tmp_path / "result.partial")
    kinds = [event["event"] for event in told]
    assert [kinds.count(kind) for kind in ("begin", "done", "retried", "halved", "failed", "end")] == [1, 6, 3, 0, 3, 1]
    assert (told[-1]["event"], told[-1]["state"], told[-1]["done"], told[-1]["failed"]) == ("end", "failed", 6, 3)
    ledger = Ledger(tmp_path / "result.partial" / LEDGER)
    assert sorted(ledger.failures()) == [3, 4, 5]
    assert ledger.count() == 6
    again = conduct(prepare(made), watcher, "resume")
    assert same_bits(again.written["Zarr store"], whole.written["Zarr store"])
    assert not Ledger(tmp_path / "result" / LEDGER).failures()
    more = events(tmp_path / "result")
    assert [event["to_do"] for event in more if event["event"] == "begin"] == [9, 3]


def test_halves_are_said_aloud_and_change_no_bit(recipe, watcher, monkeypatch, tmp_path, same_bits) -> None:
    whole = conduct(prepare(recipe(engine=ENGINE, output={"folder": str(tmp_path / "whole")})), watcher)
    failing(monkeypatch, {"time": 1, "lat": 2}, lambda: MemoryError("no room"), halves_too=False)
    outcome = conduct(prepare(recipe(engine=ENGINE)), watcher)
    assert "block 5 of 9 failed again and is done in halves: MemoryError: no room" in watcher.messages
    assert same_bits(outcome.written["Zarr store"], whole.written["Zarr store"])
    assert outcome.status_counts == whole.status_counts
    with xr.open_zarr(outcome.written["Zarr store"], consolidated=False, chunks=None) as found:
        assert np.isfinite(found["ph_total_scale"].isel(time=1)).any()
    kinds = [event["event"] for event in events(tmp_path / "result") if event.get("block") == 5]
    assert kinds == ["retried", "halved", "done"]


def test_the_event_log_tells_each_block_with_its_worker(recipe, watcher, tmp_path) -> None:
    conduct(prepare(recipe(engine=ENGINE)), watcher)
    first, *blocks, last = events(tmp_path / "result")
    assert (first["event"], first["blocks"], first["cells"], first["engine"]) == ("begin", 9, 1080, "threads")
    assert sorted(event["block"] for event in blocks) == list(range(1, 10))
    assert sum(event["cells"] for event in blocks) == 1080
    assert all(event["event"] == "done" and event["seconds"] > 0 and event["worker"] for event in blocks)
    assert (last["event"], last["state"]) == ("end", "complete")
    times = [event["time"] for event in (first, *blocks, last)]
    assert times == sorted(times)
