"""A dask scheduler and two workers in processes of their own on the loopback, and runs through the command line."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from gridcarb.recipe import load
from gridcarb.run import conduct, prepare
from tests.processes import COMMAND_LINE, Watched, write_small_ocean

PATIENCE = 90.0
"""Seconds after which a process that does not do what is waited for has failed the test."""


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    for item in items:
        if Path(__file__).parent in item.path.parents:
            item.add_marker(pytest.mark.cluster)


@pytest.fixture(scope="session")
def ocean_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Six months on 12 x 24 columns of 5 levels."""
    return write_small_ocean(tmp_path_factory.mktemp("ocean") / "ocean.nc", 12, 24)


@contextmanager
def started(folder: Path, *command: str) -> Iterator[Watched]:
    """A process of this Python that finds this checkout, ended with the block."""
    folder.mkdir(exist_ok=True)
    environment = {**os.environ, "PYTHONPATH": str(Path(__file__).parents[2])}
    log = folder / f"{time.monotonic_ns()}.log"
    with log.open("w") as file:
        process = subprocess.Popen(
            [sys.executable, *command], stdout=file, stderr=file, text=True, cwd=folder, env=environment
        )
    running = Watched(process, log, PATIENCE)
    try:
        yield running
    finally:
        running.end()


@dataclass
class Cluster:
    """A scheduler with its workers."""

    address: str
    scheduler: Watched
    workers: list[Watched]


@contextmanager
def cluster_in(folder: Path) -> Iterator[Cluster]:
    """`dask scheduler` and twice `dask worker`, as the README tells to start them."""
    told = folder / "scheduler.json"
    with ExitStack() as stack:
        here = ("--host", "127.0.0.1", "--no-dashboard")
        scheduler = stack.enter_context(started(
            folder, "-m", "dask", "scheduler", *here, "--port", "0", "--scheduler-file", str(told)))
        scheduler.wait_for("Scheduler at:")
        address = json.loads(told.read_text())["address"]
        workers = [
            stack.enter_context(started(folder, "-m", "dask", "worker", address, "--nthreads", "1", "--no-nanny", *here))
            for _ in range(2)
        ]
        for worker in workers:
            worker.wait_for("Registered to:")
        yield Cluster(address, scheduler, workers)


@pytest.fixture(scope="session")
def cluster(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Cluster]:
    """For tests that leave it whole."""
    with cluster_in(tmp_path_factory.mktemp("cluster")) as found:
        yield found


@pytest.fixture
def own_cluster(tmp_path: Path) -> Iterator[Cluster]:
    """For tests that break it."""
    with cluster_in(tmp_path / "cluster") as found:
        yield found


@pytest.fixture(scope="session")
def write_recipe(ocean_file: Path) -> Callable[..., Path]:
    """Write a recipe whose result is `folder`; by default a run of 72 blocks."""

    def write(folder: Path, **engine: Any) -> Path:
        block = {"time": 1, "cells": 24}
        base = {
            "recipe": 1, "inputs": {"files": str(ocean_file)}, "reading": {"density": "1026 kg m-3"},
            "chemistry": {"fields": ["ph_total_scale", "aragonite_saturation"]},
            "engine": {"workers": 2, "block": block, **engine},
            "output": {"folder": str(folder), "netcdf": False, "chunks": block},
        }
        path = folder.with_suffix(".yaml")
        path.write_text(json.dumps(base))
        return path

    return write


@pytest.fixture
def gridcarb(tmp_path: Path) -> Iterator[Callable[..., Watched]]:
    """Begin `gridcarb ...` in a process of its own."""
    with ExitStack() as stack:
        yield lambda *words: stack.enter_context(started(tmp_path / "logs", "-c", COMMAND_LINE, *map(str, words)))


class Silent:
    """A watcher that looks away."""

    def start(self, total_blocks: int, cells: int) -> None: ...
    def block_done(self, cells: int, note: str = "") -> None: ...
    def block_failed(self, note: str) -> None: ...
    def strength(self, workers: int, resident: int) -> None: ...
    def message(self, text: str) -> None: ...
    def stop(self) -> None: ...


def run_here(recipe: Path, **words: Any) -> dict[str, bytes]:
    """A run in this process; the files of its store."""
    outcome = conduct(prepare(load(recipe)), Silent(), **words)
    return store_files(outcome.written["Zarr store"].parent)


@pytest.fixture(scope="session")
def on_threads(write_recipe: Callable[..., Path], tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    """Every file of the store that threads make: what all others are held against."""
    return run_here(write_recipe(tmp_path_factory.mktemp("threads") / "result"))


def store_files(result: Path) -> dict[str, bytes]:
    """Every file of the store, by its place. The history of the store tells when it was made."""
    files = {}
    for path in (result / "fields.zarr").rglob("*"):
        if path.is_file():
            files[str(path.relative_to(result))] = re.sub(rb"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d", b"then", path.read_bytes())
    assert files
    return files


def events_of(result: Path, *kinds: str) -> list[dict[str, Any]]:
    """The events of a run, of these kinds."""
    lines = (result / "events.jsonl").read_text().splitlines()
    return [event for event in map(json.loads, lines) if event["event"] in kinds]
