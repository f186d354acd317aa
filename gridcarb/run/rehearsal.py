"""A rehearsal: a few real blocks of a plan, done aside and thrown away, so that the plan can tell what all will take."""

from __future__ import annotations

import math
import os
import random
import time
from collections.abc import Callable, Iterable, Mapping, Sequence
from contextlib import ExitStack
from dataclasses import dataclass, replace
from pathlib import Path
from shutil import rmtree
from tempfile import TemporaryDirectory

import xarray as xr

from gridcarb.errors import BlockError, EngineError, GridcarbError, Notice, OutputError
from gridcarb.run.blocks import Layout
from gridcarb.run.costs import Costs, Sample, blended, costs
from gridcarb.run.frame import date_of_writing, make_store
from gridcarb.run.marking import do_block, marker_of
from gridcarb.run.plan import FILE, STORE, Plan, source_chunks
from gridcarb.run.report import Report, rehearsal_report
from gridcarb.run.stopping import ends_tidily
from gridcarb.run.task import Job, Record
from gridcarb.run.watching import Watcher
from gridcarb.sources import Collection, close_all
from gridcarb.sources.places import is_url, split
from gridcarb.sources.storage import storage_kind
from gridcarb.write.disk import free_bytes, sized
from gridcarb.write.ledger import LEDGER
from gridcarb.write.netcdf import export

_SOLVED = ("solved", "outside_validity")
_GOLDEN = 0.618
_FILES, _FOLDERS = 400, 12
"""How many files, and folders, of one folder are looked at to tell the size of a store: it may hold a million."""


@dataclass(frozen=True)
class Rehearsal:
    """What a few blocks told about a run.

    blocks : numbers of the blocks that were measured.
    neighbours : how many of them were done to see what a block takes whose chunks of the source have been read.
    bytes_in : of the inputs as they lie on the disk; None where that cannot be told.
    frame_files, frame_bytes : of the store before the first block.
    free : bytes free where the result will go.
    """

    plan: Plan
    blocks: tuple[int, ...]
    neighbours: int
    cells: int
    seconds: float
    costs: Costs
    bytes_in: int | None
    frame_files: int
    frame_bytes: int
    free: int

    @property
    def needed(self) -> tuple[float, float]:
        """Bytes the whole result takes while it is made: what is likely, and the most."""
        fixed = self.frame_bytes + self.costs.marker_bytes
        store, file = self.costs.store_bytes, self.costs.file_bytes
        return fixed + store.likely + file.likely, fixed + store.highest + file.highest

    @property
    def files(self) -> int:
        """Files of the result: chunks, metadata and markers."""
        return round(self.costs.chunk_files) + self.frame_files + len(self.plan.layout)

    @property
    def notices(self) -> tuple[Notice, ...]:
        """Those of the plan, and whether the result would not fit."""
        likely, most = self.needed
        if most <= self.free:
            return self.plan.notices
        without = likely - self.costs.file_bytes.likely
        netcdf = self.plan.recipe.output.netcdf and without <= self.free
        told = Notice(
            "room_short",
            f"the result {'would' if likely > self.free else 'might'} not fit: it takes about {sized(likely)} "
            f"(at most {sized(most)}) while it is made, {sized(self.free)} are free at {self.plan.folder.target}",
            "output: {netcdf: false}" if netcdf else "output: {folder: ...}",
        )
        return (*self.plan.notices, told)

    def report(self) -> Report:
        """The plan in words and numbers, with what it will cost."""
        return rehearsal_report(self)


def rehearse(plan: Plan, watcher: Watcher, blocks: int = 3) -> Rehearsal:
    """Do some blocks of a plan one after the other in this thread, in a temporary folder that goes with them.

    One block is done first and not measured: it compiles the chemistry and opens the files.

    Parameters
    ----------
    blocks : how many are measured, spread over time and the map. Where blocks share chunks of the source, a neighbour of
        each is done as well.

    Raises
    ------
    BlockError : a block could not be done, with the reason in its `others`.
    OutputError : the temporary folder cannot be written.
    """
    begun = time.perf_counter()
    layout, chunks = plan.layout, source_chunks(plan.collection)
    steps = layout.counts[0] if plan.collection.axes.time else 1
    chosen = spread_blocks(steps, len(layout) // steps, blocks)
    sharing = blocks_per_chunk(layout, chunks)
    pairs = [(number, neighbour(layout, chunks, number) if sharing > 1 else None) for number in chosen]
    with ends_tidily(), TemporaryDirectory(prefix="gridcarb-") as folder, ExitStack() as after:
        after.callback(close_all)
        watcher.message("preparing the chemistry (some fifteen seconds the first time on this machine)")
        _Stage(plan, Path(folder) / "first").do(_one_beside(chosen, len(layout)))
        rmtree(Path(folder) / "first")
        stage = _Stage(plan, Path(folder) / "measured")
        samples = _measured(stage, pairs, sharing, watcher)
    watcher.stop()
    found = costs(samples, cells=layout.cells, blocks=len(layout), cores=plan.workers * plan.recipe.engine.machines)
    done = sorted({number for pair in pairs for number in pair if number is not None})
    return Rehearsal(
        plan, tuple(done), len(done) - len(pairs), sum(_cells(layout, number) for number in done),
        time.perf_counter() - begun, found, bytes_of_inputs(plan.collection), stage.frame_files, stage.frame_bytes,
        free_bytes(plan.folder.target),
    )


def _measured(
    stage: _Stage, pairs: Sequence[tuple[int, int | None]], sharing: float, watcher: Watcher
) -> list[Sample]:
    """What each block took, blended with its neighbour where it has one."""
    layout = stage.plan.layout
    cells = [_cells(layout, number) for pair in pairs for number in pair if number is not None]
    watcher.start(len(cells), sum(cells))
    samples = []
    for number, beside in pairs:
        if beside is not None:
            close_all()  # what an earlier pair has read must not help this one
        sample = stage.measured(number, copy=stage.plan.recipe.output.netcdf)
        watcher.block_done(_cells(layout, number))
        if beside is not None:
            sample = blended(sample, stage.measured(beside, copy=False), sharing)
            watcher.block_done(_cells(layout, beside))
        samples.append(sample)
    return samples


def _cells(layout: Layout, number: int) -> int:
    return math.prod(layout.extent(layout.region(number)))


class _Stage:
    """An empty store like that of the run, in a folder of its own."""

    def __init__(self, plan: Plan, folder: Path) -> None:
        folder.mkdir()
        self.plan, self._folder = plan, folder
        self._job: Job = replace(plan.job(folder), recipe="rehearsal", inputs="rehearsal")
        make_store(plan, folder / STORE, date_of_writing())
        found = _files(folder)
        self.frame_files, self.frame_bytes = len(found), sum(size for size, _ in found.values())

    def do(self, number: int) -> Record:
        """Do a block and mark it."""
        try:
            return do_block(self._job, number)
        except (OutputError, EngineError):
            raise
        except GridcarbError as error:
            told = BlockError(
                "a block of the rehearsal could not be done, and the run would end incomplete",
                where=self._job.name(number), mend="mend what is told below, then plan again",
            )
            told.others = (error,)
            raise told from error

    def measured(self, number: int, *, copy: bool) -> Sample:
        """Do a block and tell what it took; with `copy`, write it to a NetCDF file as well."""
        before = _files(self._folder)
        wall, busy = time.perf_counter(), time.process_time()
        record = self.do(number)
        wall, busy = time.perf_counter() - wall, time.process_time() - busy
        new = {path: found[0] for path, found in _files(self._folder).items() if found != before.get(path)}
        markers = [size for path, size in new.items() if path.startswith(f"{LEDGER}/")]
        status = marker_of(self._job, record).status
        sample = Sample(
            record.cells, sum(status.get(word, 0) for word in _SOLVED),
            {**record.seconds, "mark": max(0.0, wall - math.fsum(record.seconds.values()))}, max(wall, busy),
            busy, sum(new.values()) - sum(markers), len(new) - len(markers), sum(markers),
        )
        if not copy:
            return sample
        size, seconds = self._copied(record)
        return replace(sample, file_bytes=size, file_seconds=seconds)

    def _copied(self, record: Record) -> tuple[int, float]:
        """Bytes and seconds of a NetCDF file of one block, made as that of the run is."""
        store, file = self._folder / "piece.zarr", self._folder / FILE
        keys = [field.key for field in self.plan.fields]
        with xr.open_zarr(self._folder / STORE, consolidated=False, chunks=None, decode_cf=False) as whole:
            piece = whole[keys].isel(record.region, missing_dims="ignore").load().drop_vars(list(whole.coords))
        lengths = {}
        for key in keys:
            chunks = piece[key].encoding["chunks"]
            lengths[key] = {"chunks": tuple(map(min, chunks, piece[key].shape))}
            piece[key].encoding.clear()
        piece.to_zarr(store, encoding=lengths, consolidated=False, zarr_format=3)
        begun = time.perf_counter()
        export(store, file)
        size, seconds = file.stat().st_size, time.perf_counter() - begun
        rmtree(store)
        file.unlink()
        return size, seconds


def spread_blocks(steps: int, places: int, wanted: int) -> list[int]:
    """Numbers of blocks, spread evenly over time and, in another order, over the map; all of them where there are no more.

    steps : blocks along time. places : blocks of one step.
    """
    total = steps * places
    if wanted >= total:
        return list(range(total))
    turn = next(turn for turn in range(max(1, round(_GOLDEN * wanted)), wanted + 2) if math.gcd(turn, wanted) == 1)
    found = {}
    for nth in range(wanted):
        step = (2 * nth + 1) * steps // (2 * wanted)
        place = (2 * (nth * turn % wanted) + 1) * places // (2 * wanted)
        found[step * places + place] = True
    spare = (number for number in range(total) if number not in found)
    while len(found) < wanted:
        found[next(spare)] = True
    return sorted(found)


def _one_beside(chosen: Iterable[int], total: int) -> int:
    """A block that is not among the chosen; the first of them where there is no other."""
    taken = list(chosen)
    return next((number for number in range(total) if number not in taken), taken[0])


def blocks_per_chunk(layout: Layout, source: Mapping[str, int]) -> float:
    """How many blocks need a chunk of the source, on the average.

    source : dimension -> chunk length, 1 for one that is not named.
    """
    found = 1.0
    for dim, size in layout.sizes.items():
        chunk, block = source.get(dim, 1), layout.block[dim]
        needs = sum((min(start + block, size) - 1) // chunk - start // chunk + 1 for start in range(0, size, block))
        found *= needs / math.ceil(size / chunk)
    return found


def neighbour(layout: Layout, source: Mapping[str, int], number: int) -> int | None:
    """A block beside `number`, in any dimension, which needs no chunk of the source that `number` does not; else None."""
    def needed(block: int) -> list[tuple[int, int]]:
        return [(part.start // source.get(dim, 1), (part.stop - 1) // source.get(dim, 1))
                for dim, part in layout.region(block).items()]  # fmt: skip

    own, stride = needed(number), 1
    for count in reversed(layout.counts):
        place = number // stride % count
        for other in [number + stride] * (place + 1 < count) + [number - stride] * (place > 0):
            if all(first <= low and high <= last for (first, last), (low, high) in zip(own, needed(other), strict=True)):
                return other
        stride *= count
    return None


def bytes_of_inputs(collection: Collection) -> int | None:
    """Bytes of the input as it lies on the disk: whole files, and of Zarr stores the variables that are read.

    The chunk files of a large store are counted, and their size is taken from some. None if a store lies behind a URL.
    """
    sizes = {split(file.path)[0]: file.size for file in collection.files}
    variables = {(segment.path, segment.variable) for role in collection.roles.values() for segment in role.array.segments}
    files = {split(path)[0] for path, _ in variables if storage_kind(path) == "netcdf"}
    if any(is_url(path) and split(path)[0] not in files for path, _ in variables):
        return None
    folders = [_array_folder(path, variable) for path, variable in variables if split(path)[0] not in files]
    return sum(sizes[file] for file in files) + round(math.fsum(map(_bytes_below, folders)))


def _array_folder(path: str, variable: str) -> Path:
    """Where a variable of a Zarr store lies: in the group named, or in one above that lends it."""
    store, group = split(path)
    place = Path(store) / group
    while not (place / variable).is_dir() and place != Path(store):
        place = place.parent
    return place / variable


def _bytes_below(folder: Path) -> float:
    """Bytes of the files in a folder and below, from some of them where there are many."""
    with os.scandir(folder) as entries:
        found = sorted(entries, key=lambda entry: entry.name)
    folders = [Path(entry.path) for entry in found if entry.is_dir()]
    files = [Path(entry.path) for entry in found if not entry.is_dir()]
    return _summed(files, _FILES, lambda file: file.stat().st_size) + _summed(folders, _FOLDERS, _bytes_below)


def _summed(paths: Sequence[Path], most: int, of: Callable[[Path], float]) -> float:
    """The sum over all paths, from at most so many of them; drawn, for an even step would meet one place in every month."""
    some = random.Random(0).sample(paths, min(len(paths), most))
    return len(paths) / len(some) * math.fsum(map(of, some)) if some else 0.0


def _files(folder: Path) -> dict[str, tuple[int, int]]:
    """Place of every file below `folder` -> its bytes, and when it was written (ns)."""
    found = {path: path.stat() for path in folder.rglob("*") if path.is_file()}
    return {path.relative_to(folder).as_posix(): (stat.st_size, stat.st_mtime_ns) for path, stat in found.items()}
