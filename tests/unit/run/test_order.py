"""The order that goes to the workers, and a block that is done in halves."""

from __future__ import annotations

import pickle
import shutil
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest

from gridcarb.axes import Axes
from gridcarb.errors import EngineError
from gridcarb.run import order as orders
from gridcarb.run import prepare
from gridcarb.run.blocks import halves
from gridcarb.run.frame import make_store
from gridcarb.run.order import placed_order
from gridcarb.run.task import Job, run_block

DATE = datetime(2026, 1, 1, tzinfo=UTC)


@pytest.fixture
def job(recipe, tmp_path) -> Job:
    """A job of nine blocks with its store."""
    plan = prepare(recipe(engine={"block": {"time": 1, "cells": 24}}, chemistry={"fields": "all"}))
    made = plan.job(tmp_path)
    make_store(plan, made.store, DATE)
    return made


def store_bytes(store: Path) -> dict[str, bytes]:
    return {str(path.relative_to(store)): path.read_bytes() for path in store.rglob("*") if path.is_file()}


def test_an_order_is_small_and_its_job_is_read_once(job, tmp_path) -> None:
    with placed_order(job, tmp_path) as order:
        assert len(pickle.dumps(order)) < 1000 < Path(order.path).stat().st_size
        order.ready()
        travelled = pickle.loads(pickle.dumps(order))
        assert travelled._job() is order._job()
        assert travelled._job().layout == job.layout
        record = travelled(3, 1)
        assert record.number == 3
        path = Path(order.path)
    assert not path.exists()
    assert order._job().store == job.store, "who has read it needs the file no more"


def test_what_keeps_a_worker_from_the_job_is_told(job, tmp_path, monkeypatch) -> None:
    with placed_order(replace(job, constants="practice2022"), tmp_path) as order:
        with pytest.raises(EngineError, match="cannot read the result folder"):
            replace(order, path=f"{order.path}.elsewhere").ready()
        with pytest.raises(EngineError, match="another than was ordered"):
            replace(order, digest="0" * 64).ready()
        monkeypatch.setattr(orders, "numeric_versions", lambda: {"gridcarb": "9.9"})
        with pytest.raises(EngineError, match=r"gridcarb .* there, 9\.9 here") as caught:
            order.ready()
        assert "the same versions" in caught.value.mend


@pytest.mark.parametrize("block", [{"time": 3, "cells": 72}, {"time": 1, "cells": 24}, {"time": 1, "cells": 1}])
def test_halves_leave_the_same_bytes(recipe, tmp_path, block) -> None:
    stores: list[Any] = []
    for parts in (1, 2):
        plan = prepare(recipe(engine={"block": block}, chemistry={"fields": "all"}, reading={"density": "in situ"}))
        job = plan.job(tmp_path / str(parts))
        job.store.parent.mkdir()
        make_store(plan, job.store, DATE)
        records = [run_block(job, number, parts) for number in range(0, len(plan.layout), 5)]
        counts = [(record.cells, record.checksums, record.masked, record.tallies["ranges"].report()[
            "solution_status"]) for record in records]
        stores.append((store_bytes(job.store), counts))
        shutil.rmtree(job.store)
    assert stores[0] == stores[1]


@pytest.mark.parametrize(("region", "cut"), [
    ({"time": slice(4, 7), "lev": slice(0, 5), "lat": slice(2, 4), "lon": slice(0, 9)}, "time"),
    ({"time": slice(4, 5), "lev": slice(0, 5), "lat": slice(2, 4), "lon": slice(3, 9)}, "lon"),
    ({"time": slice(4, 5), "lev": slice(0, 5), "lat": slice(2, 6), "lon": slice(3, 5)}, "lat"),
    ({"time": slice(4, 5), "lev": slice(0, 5), "lat": slice(2, 3), "lon": slice(3, 4)}, None),
    ({"time": slice(4, 6), "lev": slice(0, 5)}, "time"), ({"time": slice(4, 5), "lev": slice(0, 5)}, None),
])
def test_halves_are_cut_in_time_first_and_never_in_depth(region, cut) -> None:
    found = halves(region, Axes("time", "lev", tuple(dim for dim in ("lat", "lon") if dim in region), *[None] * 4))
    if cut is None:
        assert found == (region,)
        return
    one, two = found
    assert (one[cut].start, one[cut].stop, two[cut].stop) == (region[cut].start, two[cut].start, region[cut].stop)
    assert all(part[dim] == region[dim] for part in found for dim in region if dim != cut)
    assert all(part[cut].stop > part[cut].start for part in found)
