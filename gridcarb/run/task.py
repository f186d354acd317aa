"""The one task a block is: open its slice, clothe it, solve it, count it, write it, and give back a small record."""

from __future__ import annotations

import functools
import math
import time
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import xarray as xr

from gridcarb.chemistry.stage import solve
from gridcarb.errors import BlockError, GridcarbError, InputError
from gridcarb.fields import Field
from gridcarb.harmonise import Understanding, clothe, weights
from gridcarb.products import PRODUCTS, Tally
from gridcarb.run.blocks import Layout, Region, halves
from gridcarb.sources import Collection, keep_chunks, open_collection
from gridcarb.sources.storage import stamp
from gridcarb.write.amounts import per_volume
from gridcarb.write.encoding import Precision, dims_of, dtype_of, stored
from gridcarb.write.store import Written, write_block


@dataclass(frozen=True)
class Job:
    """What every block of a run has in common; plain data that travels to the workers once.

    kept : bytes of unpacked chunks of the source a process keeps for the blocks that share them.
    recipe, inputs : digests of what the run is made of, for the marks of its blocks.
    """

    collection: Collection
    understanding: Understanding
    layout: Layout
    fields: tuple[Field, ...]
    constants: str
    volumes: bool
    precision: Precision
    store: Path
    kept: int = 0
    recipe: str = ""
    inputs: str = ""

    @property
    def keys(self) -> tuple[str, ...]:
        """The catalogue keys to solve for."""
        return tuple(entry.key for entry in self.fields)

    @property
    def solved_in(self) -> Precision:
        """The precision results leave the chemistry in: that of the store, unless they are divided by volumes first."""
        return "float64" if self.volumes else self.precision

    def name(self, number: int) -> str:
        """What a block is called, counted from one."""
        return f"block {number + 1} of {len(self.layout)}"


@dataclass(frozen=True)
class Record:
    """What is left of a block when it is done."""

    number: int
    region: Region
    cells: int
    checksums: Mapping[str, Written]
    tallies: Mapping[str, Tally]
    masked: Mapping[str, int]
    seconds: Mapping[str, float] = field(default_factory=dict)


def run_block(job: Job, number: int, parts: int = 1) -> Record:
    """Do block `number` of a job from its files to the store. Doing it twice leaves the same bytes.

    parts : 2 to compute it in halves, one after the other, in about half the memory. It is written as one all the same:
        chunks of the store, checksums and the ledger know nothing of halves.

    Raises
    ------
    GridcarbError : whatever went wrong, with the block in its `where`.
    """
    place = job.name(number)
    try:
        return _run_block(job, number, parts)
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
    except (OSError, InputError):
        return None


def _mend(error: Exception) -> str:
    if isinstance(error, MemoryError):
        return "write fewer `workers` or a smaller `memory` under `engine` in the recipe"
    return "run again with --debug to see where it happened; nothing of an earlier result was touched"


def _run_block(job: Job, number: int, parts: int) -> Record:
    keep_chunks(job.kept)
    clock = _Clock()
    region = job.layout.region(number)
    share = _solve(job, region, clock) if parts == 1 else _solve_halves(job, region, clock)
    checksums = write_block(job.store, region, share.solved)
    clock.lap("write")
    return Record(number, region, math.prod(job.layout.extent(region)), checksums, share.tallies, share.masked, clock.laps)


@dataclass(frozen=True)
class _Share:
    """A region that is solved and not written yet."""

    solved: xr.Dataset
    tallies: dict[str, Tally]
    masked: dict[str, int]


def _solve(job: Job, region: Region, clock: _Clock) -> _Share:
    raw = _read(job.collection, region)
    clock.lap("read")
    clothed = clothe(raw, job.understanding)
    clock.lap("harmonise")
    solved = solve(clothed, job.keys, job.constants, job.solved_in)
    if job.volumes:
        solved = per_volume(solved, clothed.get("density"))
        solved = solved.assign({
            field.key: solved[field.key].copy(data=stored(solved[field.key].values, dtype_of(field, job.precision)))
            for field in job.fields
        })
    clock.lap("solve")
    bare = solved.drop_vars(list(solved.coords))  # the coordinates of the grid may bear any name
    tallies = _tallies(job.fields, bare.assign_coords(weights(raw, clothed, job.understanding, region)))
    clock.lap("summarise")
    return _Share(solved, tallies, clothed.attrs["masked_cells"])


def _read(collection: Collection, region: Region) -> xr.Dataset:
    """A region of the inputs. Workers that begin together on neighbours begin with different variables: where they share
    chunks, each then reads its own part of them instead of waiting for the other."""
    raw = _opened(collection).isel(region, missing_dims="ignore")
    names = list(raw.data_vars)
    number = sum(part.start // max(1, part.stop - part.start) for part in region.values())
    first = len(names) * (0, 2, 1, 3)[number % 4] // 4
    for name in names[first:] + names[:first]:
        raw.variables[name].load()
    return raw.load()


@functools.lru_cache(maxsize=1)
def _opened(collection: Collection) -> xr.Dataset:
    """The inputs of the job at hand; each block takes its slice of them."""
    return open_collection(collection)


def _solve_halves(job: Job, region: Region, clock: _Clock) -> _Share:
    """Of each half no more is kept than what will be stored, in the width it is stored in."""
    dims = {field.key: dims_of(field, job.collection.axes) for field in job.fields}
    whole = xr.Dataset({
        field.key: (dims[field.key], np.empty(job.layout.extent(region, dims[field.key]), dtype_of(field, job.precision)))
        for field in job.fields
    })
    tallies, masked = {key: product.start(job.fields) for key, product in PRODUCTS.items()}, Counter[str]()
    for half in halves(region, job.collection.axes):
        share = _solve(job, half, clock)
        for key, variable in share.solved.data_vars.items():
            place = tuple(slice(half[dim].start - region[dim].start, half[dim].stop - region[dim].start)
                          for dim in dims[str(key)])  # fmt: skip
            kept = whole[key].values
            kept[place] = stored(variable.transpose(*dims[str(key)]).values, kept.dtype)
        for key, tally in tallies.items():
            tally.merge(share.tallies[key])
        masked.update(share.masked)
    return _Share(whole, tallies, dict(masked))


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

