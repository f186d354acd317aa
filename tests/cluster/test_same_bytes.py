"""Threads, processes, a scheduler with two workers, other blocks: the same store, to the last byte."""

from __future__ import annotations

import json
import signal

import pytest

from tests.cluster.conftest import events_of, run_here, store_files

A_FIFTH = r"(?m)^ *(5|10|15|20) %"


def test_processes(gridcarb, write_recipe, on_threads, tmp_path) -> None:
    run = gridcarb("run", write_recipe(tmp_path / "result"), "--engine", "processes")
    assert run.wait() == 0, run.said
    assert store_files(tmp_path / "result") == on_threads
    workers = {event["worker"] for event in events_of(tmp_path / "result", "done")}
    assert len(workers) == 2
    assert "Traceback" not in run.said
    assert not (tmp_path / "result" / "job.pickle").exists()


def test_a_scheduler_told_in_the_recipe(gridcarb, cluster, write_recipe, on_threads, tmp_path) -> None:
    run = gridcarb("run", write_recipe(tmp_path / "result", address=cluster.address))
    assert run.wait() == 0, run.said
    assert store_files(tmp_path / "result") == on_threads
    pids = {int(event["worker"].split(":")[1]) for event in events_of(tmp_path / "result", "done")}
    assert pids == {worker.process.pid for worker in cluster.workers}
    begin, end = events_of(tmp_path / "result", "begin", "end")
    assert (begin["engine"], begin["blocks"], begin["pid"]) == ("scheduler", 72, run.process.pid)
    assert (end["state"], end["done"], end["failed"]) == ("complete", 72, 0)
    assert json.loads((tmp_path / "result" / "journal.json").read_text())["engine"]["address"] == cluster.address


def test_blocks_of_another_size(cluster, write_recipe, on_threads, tmp_path) -> None:
    run_here(write_recipe(tmp_path / "result", block={"time": 4, "cells": 100}, address=cluster.address))
    assert len(events_of(tmp_path / "result", "done")) == 6
    assert store_files(tmp_path / "result") == on_threads


def test_a_worker_killed_in_the_middle(gridcarb, own_cluster, write_recipe, on_threads, tmp_path) -> None:
    run = gridcarb("run", write_recipe(tmp_path / "result"), "--engine", own_cluster.address)
    run.wait_for(A_FIFTH)
    own_cluster.workers[0].end(signal.SIGKILL)
    assert run.wait() == 0, run.said
    assert store_files(tmp_path / "result") == on_threads
    done = events_of(tmp_path / "result", "done")
    assert sorted(event["block"] for event in done) == list(range(1, 73))
    last = {int(event["worker"].split(":")[1]) for event in done[-10:]}
    assert last == {own_cluster.workers[1].process.pid}


@pytest.mark.parametrize(("number", "code", "engine"), [
    (signal.SIGINT, 130, "processes"), (signal.SIGTERM, 143, "scheduler"),
])
def test_stopped_in_the_middle_and_gone_on(
    gridcarb, cluster, write_recipe, on_threads, tmp_path, number, code, engine
) -> None:
    recipe = write_recipe(tmp_path / "result")
    run = gridcarb("run", recipe, "--engine", cluster.address if engine == "scheduler" else engine)
    run.wait_for(A_FIFTH)
    assert run.end(number) == code, run.said
    assert "--resume" in run.said
    assert "Traceback" not in run.said
    (end,) = events_of(tmp_path / "result.partial", "end")
    assert end["state"] == "interrupted"
    assert not (tmp_path / "result.partial" / "job.pickle").exists()
    assert run_here(recipe, manner="resume") == on_threads
    assert len(events_of(tmp_path / "result", "begin")) == 2


def test_a_scheduler_lost_in_the_middle(gridcarb, own_cluster, write_recipe, on_threads, tmp_path) -> None:
    recipe = write_recipe(tmp_path / "result")
    run = gridcarb("run", recipe, "--engine", own_cluster.address)
    run.wait_for(A_FIFTH)
    own_cluster.scheduler.end(signal.SIGKILL)
    assert run.wait() == 7, run.said
    assert "Traceback" not in run.said
    assert "--resume" in run.said.splitlines()[-1]
    assert run_here(recipe, manner="resume") == on_threads
