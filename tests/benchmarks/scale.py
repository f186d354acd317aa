"""What many blocks cost before and beside the work: planner time, time to the first block, memory of the scheduler.

    python -m tests.benchmarks.scale [BLOCKS ...]        default: 1000 10000 100000

The input is a sparse NetCDF file as large as the number of blocks asks for; blocks are stand-ins that do nothing, so that
what is left is the planner, the loop and a dask scheduler with two workers in processes of their own. Prints a table.
dask remembers the last 100,000 keys it has split into words: its scheduler grows by that (about 90 MB) up to there.
"""

from __future__ import annotations

import json
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

import netCDF4
import numpy as np
import psutil

from gridcarb.recipe import check
from gridcarb.recipe.engine import EngineSettings
from gridcarb.run import prepare
from gridcarb.run.engines import open_crew
from gridcarb.run.engines.crew import Answer, Strength
from gridcarb.run.loop import work_through

ROWS, COLUMNS, BANDS = 20, 40, 10
"""A small map, cut into bands: every step of time makes ten blocks."""


@dataclass(frozen=True)
class Nothing:
    """A block that takes no time."""

    def ready(self) -> None:
        """There is nothing to get ready."""

    def __call__(self, number: int, parts: int) -> int:
        return number * parts


class Book:
    """Counts, and notes when the first block was done and the most bytes the scheduler had resident."""

    def __init__(self, scheduler: psutil.Process) -> None:
        self.blocks, self.first, self.begun, self._scheduler = 0, 0.0, time.perf_counter(), scheduler
        self.at_first = self.most = 0

    def done(self, _: int, __: Answer) -> None:
        self.blocks += 1
        if self.blocks == 1:
            self.first = time.perf_counter() - self.begun
            self.at_first = self._scheduler.memory_info().rss

    def again(self, number: int, answer: Answer, *, halved: bool) -> None:
        raise AssertionError(f"block {number} failed: {answer.error}; {halved}")

    def failed(self, number: int, answer: Answer) -> None:
        raise AssertionError(f"block {number} failed: {answer.error}")

    def strength(self, _: Strength) -> None:
        self.most = max(self.most, self._scheduler.memory_info().rss)


def sparse_ocean(folder: Path, steps: int) -> Path:
    """A file with the headers of `steps` months; only a few steps hold numbers, the rest is fill and takes no room."""
    path = folder / f"ocean_{steps}.nc"
    with netCDF4.Dataset(path, "w") as file:
        for name, values, words in (
            ("time", 15.0 + 30.0 * np.arange(steps),
             {"units": "days since 0001-01-01", "calendar": "360_day", "axis": "T"}),
            ("lat", np.linspace(-60, 60, ROWS), {"units": "degrees_north", "standard_name": "latitude"}),
            ("lon", np.linspace(4.5, 355.5, COLUMNS), {"units": "degrees_east", "standard_name": "longitude"}),
        ):
            file.createDimension(name, len(values))
            file.createVariable(name, "f8", (name,))[:] = values
            file[name].setncatts(words)
        for name, value, units, standard in (
            ("temp", 15.0, "degC", "sea_water_conservative_temperature"),
            ("salt", 35.0, "1", "sea_water_practical_salinity"),
            ("dic", 2050.0, "umol kg-1", "mole_concentration_of_dissolved_inorganic_carbon_in_sea_water"),
            ("alk", 2350.0, "umol kg-1", "sea_water_alkalinity_expressed_as_mole_equivalent"),
        ):
            field = file.createVariable(name, "f4", ("time", "lat", "lon"), fill_value=1e20, chunksizes=(1, ROWS, COLUMNS))
            field.setncatts({"units": units, "standard_name": standard})
            for step in np.linspace(0, steps - 1, 12).astype(int):
                field[step] = np.full((ROWS, COLUMNS), value, dtype="f4")
    return path


def planner(blocks: int, folder: Path) -> tuple[int, float]:
    """Blocks planned, and the seconds that took."""
    path, band = sparse_ocean(folder, max(1, blocks // BANDS)), {"time": 1, "cells": ROWS * COLUMNS // BANDS}
    text = {
        "recipe": 1, "inputs": {"files": str(path)}, "reading": {"depth": "surface", "temperature": "conservative"},
        "chemistry": {"fields": ["ph_total_scale"]},
        "output": {"folder": str(folder / "result"), "netcdf": False, "chunks": band},
        "engine": {"workers": 2, "block": band},
    }  # fmt: skip
    begun = time.perf_counter()
    plan = prepare(check(json.dumps(text)))
    return len(plan.layout), time.perf_counter() - begun


@contextmanager
def cluster(folder: Path) -> Iterator[tuple[str, psutil.Process]]:
    """A scheduler and two workers in processes of their own; its address and the scheduler's process."""
    told = folder / "scheduler.json"
    told.unlink(missing_ok=True)
    dask, here = (sys.executable, "-m", "dask"), ("--host", "127.0.0.1", "--no-dashboard")
    quiet = {"stdout": subprocess.DEVNULL, "stderr": subprocess.DEVNULL}
    started = [subprocess.Popen([*dask, "scheduler", *here, "--port", "0", "--scheduler-file", str(told)], **quiet)]
    try:
        while not told.exists():
            time.sleep(0.1)
        address = json.loads(told.read_text())["address"]
        worker = [*dask, "worker", address, *here, "--nthreads", "1", "--no-nanny"]
        started += [subprocess.Popen(worker, **quiet) for _ in range(2)]
        yield address, psutil.Process(started[0].pid)
    finally:
        for process in started:
            process.kill()
            process.wait()


def dispatch(blocks: int, address: str, scheduler: psutil.Process) -> tuple[Book, float]:
    """The book of a run of so many stand-ins, and its seconds."""
    book, order = Book(scheduler), Nothing()
    with open_crew(EngineSettings(address=address), 2, order, lambda _: None) as crew:
        book.begun = time.perf_counter()
        work_through(crew, order, iter(range(blocks)), retries=0, onlooker=book)
    assert book.blocks == blocks
    return book, time.perf_counter() - book.begun


def main() -> None:
    """Print the table."""
    sizes = [int(word) for word in sys.argv[1:]] or [1_000, 10_000, 100_000]
    print("   blocks  planner s  first block s  blocks/s  scheduler MB: at first      most")
    with tempfile.TemporaryDirectory() as name:
        for size in sizes:
            blocks, planned = planner(size, Path(name))
            with cluster(Path(name)) as (address, scheduler):
                book, spent = dispatch(blocks, address, scheduler)
            print(f"{blocks:9,}  {planned:9.2f}  {book.first:13.3f}  {blocks / spent:8,.0f}  {book.at_first / 1e6:22.0f}  "
                  f"{book.most / 1e6:8.0f}", flush=True)


if __name__ == "__main__":
    main()
