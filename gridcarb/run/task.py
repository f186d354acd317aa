"""The one task a block is: open its slice, clothe it, solve it, count it, write it, and give back a small record."""

from __future__ import annotations

import time
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import xarray as xr

from gridcarb.chemistry.stage import solve
from gridcarb.errors import BlockError, GridcarbError, InputError
from gridcarb.fields import Field
from gridcarb.harmonise import Understanding, clothe, weights
from gridcarb.products import PRODUCTS, Tally
from gridcarb.run.blocks import Layout
from gridcarb.sources import Collection, open_collection
from gridcarb.sources.storage import stamp
from gridcarb.write.amounts import per_volume
from gridcarb.write.store import write_block


@dataclass(frozen=True)
class Job:
    """What every block of a run has in common; plain data that travels to the workers once."""

    collection: Collection
    understanding: Understanding
    layout: Layout
    fields: tuple[Field, ...]
    constants: str
    volumes: bool
    store: Path

    @property
    def keys(self) -> tuple[str, ...]:
        """The catalogue keys to solve for."""
        return tuple(entry.key for entry in self.fields)


@dataclass(frozen=True)
class Record:
    """What is left of a block when it is done."""

    number: int
    cells: int
    checksums: Mapping[str, str]
    tallies: Mapping[str, Tally]
    masked: Mapping[str, int]
    seconds: Mapping[str, float] = field(default_factory=dict)


def run_block(job: Job, number: int) -> Record:
    """Do block `number` of a job from its files to the store. Doing it twice leaves the same bytes.

    Raises
    ------
    GridcarbError : whatever went wrong, with the block in its `where`.
    """
    place = f"block {number + 1} of {len(job.layout)}"
    try:
        return _run_block(job, number)
    except GridcarbError as error:
        error.where = f"{error.where} ({place})".strip()
        changed = changed_inputs(job.collection) if isinstance(error, InputError) else []
        if changed:
            error.mend = f"run again when nothing writes to the input: {', '.join(changed)} changed after the run began"
        raise
    except Exception as error:
        raise BlockError(
            f"{type(error).__name__}: {error}", where=f"{place}: {job.layout.region(number)}", mend=_mend(error),
        ) from error


def changed_inputs(collection: Collection) -> list[str]:
    """Paths of the files that are no longer what they were when the headers were read, or are gone."""
    return [file.path for file in collection.files if _stamp(file.path) != (file.size, file.mtime_ns)]


def _stamp(path: str) -> tuple[int, int] | None:
    try:
        return stamp(path)
    except OSError:
        return None


def _mend(error: Exception) -> str:
    if isinstance(error, MemoryError):
        return "write fewer `workers` or a smaller `memory` under `engine` in the recipe"
    return "run again with --debug to see where it happened; nothing of an earlier result was touched"


def _run_block(job: Job, number: int) -> Record:
    clock = _Clock()
    region = job.layout.region(number)
    raw = open_collection(job.collection).isel(region, missing_dims="ignore").load()
    clock.lap("read")
    clothed = clothe(raw, job.understanding)
    clock.lap("harmonise")
    solved = solve(clothed, job.keys, job.constants)
    if job.volumes:
        solved = per_volume(solved, clothed.get("density"))
    clock.lap("solve")
    tallies = _tallies(job.fields, solved.assign_coords(weights(raw, clothed, job.understanding, region)))
    clock.lap("summarise")
    checksums = write_block(job.store, region, solved)
    clock.lap("write")
    cells = int(solved[job.keys[0]].size)
    return Record(number, cells, checksums, tallies, clothed.attrs["masked_cells"], clock.laps)


def _tallies(fields: tuple[Field, ...], solved: xr.Dataset) -> dict[str, Tally]:
    tallies = {key: product.start(fields) for key, product in PRODUCTS.items()}
    for tally in tallies.values():
        tally.add(solved)
    return tallies


class _Clock:
    """Seconds of each leg of a task."""

    def __init__(self) -> None:
        self.laps: dict[str, float] = {}
        self._last = time.perf_counter()

    def lap(self, name: str) -> None:
        now = time.perf_counter()
        self.laps[name] = now - self._last
        self._last = now

