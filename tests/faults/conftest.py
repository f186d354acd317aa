"""Real processes through the command line: the invented ocean on disk, a recipe cut into many small blocks."""

from __future__ import annotations

import json
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import pytest

from tests.processes import COMMAND_LINE, Watched, write_small_ocean

PATIENCE = 40.0
"""Seconds after which a process that does not do what is waited for has failed the test."""

MIDDLE = r"(?m)^ *(5|10|15|20) %"
"""What a run in its first fifth has said."""


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    for item in items:
        if Path(__file__).parent in item.path.parents:
            item.add_marker(pytest.mark.faults)


@pytest.fixture(scope="session")
def ocean_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Six months on 10 x 20 columns of 5 levels."""
    return write_small_ocean(tmp_path_factory.mktemp("ocean") / "ocean.nc", 10, 20)


def started(recipe: Path, words: tuple[str, ...]) -> Watched:
    """One ``gridcarb run`` of a recipe in a process of its own."""
    log = recipe.with_suffix(f".{time.monotonic_ns()}.log")
    with log.open("w") as file:
        process = subprocess.Popen(
            [sys.executable, "-c", COMMAND_LINE, "run", str(recipe), *words], stdout=file, stderr=file, text=True,
        )
    return Watched(process, log, PATIENCE)


@dataclass
class Place:
    """A folder with a recipe in it, and the result the recipe leads to."""

    folder: Path
    recipe: Path
    running: list[Watched] = field(default_factory=list)

    @property
    def result(self) -> Path:
        return self.folder / "result"

    @property
    def partial(self) -> Path:
        return self.folder / "result.partial"

    @property
    def lock(self) -> Path:
        return self.folder / "result.lock"

    def begin(self, *words: str) -> Watched:
        run = started(self.recipe, words)
        self.running.append(run)
        return run

    def begin_and_reach_the_middle(self, *words: str) -> Watched:
        run = self.begin(*words)
        run.wait_for(MIDDLE)
        return run

    def put_earlier_result(self) -> dict[str, bytes]:
        """A result of an earlier run, as far as one can tell from outside."""
        self.result.mkdir()
        (self.result / "journal.json").write_text('{"state": "complete"}')
        (self.result / "fields.nc").write_bytes(b"numbers of an earlier day")
        return self.contents()

    def contents(self) -> dict[str, bytes]:
        return {path.name: path.read_bytes() for path in self.result.rglob("*") if path.is_file()}

    def journal(self, folder: Path) -> dict[str, Any]:
        told: dict[str, Any] = json.loads((folder / "journal.json").read_text())
        return told


@pytest.fixture
def place(tmp_path: Path, ocean_file: Path) -> Iterator[Callable[..., Place]]:
    """Make a place: `place(output={...}, engine={...}, ...)`; by default a run of 60 small blocks, a few seconds long."""
    made: list[Place] = []

    def make(folder: Path = tmp_path, files: Path = ocean_file, **sections: dict[str, Any]) -> Place:
        base: dict[str, Any] = {
            "recipe": 1, "inputs": {"files": str(files)}, "reading": {"density": "1026 kg m-3"},
            "chemistry": {"fields": ["ph_total_scale"]}, "engine": {"workers": 2, "block": {"time": 1, "cells": 20}},
            "output": {"folder": str(folder / "result"), "netcdf": False},
        }
        for section, words in sections.items():
            base[section] = base[section] | words
        if base["engine"].get("block"):  # of such a small grid the planner would make one chunk
            base["output"].setdefault("chunks", base["engine"]["block"])
        recipe = tmp_path / f"recipe{len(made)}.yaml"
        recipe.write_text(json.dumps(base))
        made.append(Place(folder, recipe))
        return made[-1]

    yield make
    for each in made:
        for run in each.running:
            if run.process.poll() is None:
                run.end(signal.SIGKILL)


@pytest.fixture
def tiny_disk(tmp_path: Path) -> Iterator[Path]:
    """A disk of 300 kB; mounting it is for root alone."""
    folder = tmp_path / "disk"
    folder.mkdir()
    command = ["mount", "-t", "tmpfs", "-o", "size=300k", "tmpfs", str(folder)]
    mounted = subprocess.run(command, capture_output=True, check=False)
    if mounted.returncode:
        pytest.skip(f"a small tmpfs cannot be mounted here: {mounted.stderr.decode().strip()}")
    yield folder
    subprocess.run(["umount", "-l", str(folder)], check=True)
