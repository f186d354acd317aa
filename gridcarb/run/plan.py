"""The plan: everything a run will do, found out from headers, coordinates and small samples."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr

from gridcarb.errors import Fault, Faults, GridcarbError, Notice, RecipeError
from gridcarb.fields import FIELDS, Field
from gridcarb.figures import FIGURES
from gridcarb.harmonise import Understanding
from gridcarb.recipe import Recipe
from gridcarb.recipe.text import parse
from gridcarb.run.blocks import Layout, cells_per_unit, lay_out, reads_of_a_chunk, shared_part
from gridcarb.run.budget import Footprint, allowed_per_task, kept_per_process, refuse_over_budget
from gridcarb.run.engines import cores
from gridcarb.run.findings import Finding, assumptions, stops
from gridcarb.run.inspection import Inspection, inspect
from gridcarb.run.task import Job
from gridcarb.sources import Collection
from gridcarb.sources.survey import Survey
from gridcarb.write.amounts import per_volume, per_volume_field
from gridcarb.write.folder import ResultFolder
from gridcarb.write.parts import parts_of
from gridcarb.write.validate import check_grid

if TYPE_CHECKING:
    from gridcarb.run.report import Report

STORE = "fields.zarr"
FILE = "fields.nc"
FILES = "netcdf"
FIGURE_FOLDER = "figures"
STATUS = "solution_status"


@dataclass(frozen=True)
class Plan:
    """A recipe that has been held against its inputs; nothing is computed and nothing written yet.

    fields : what will be written, the status last, as it will be written (per mass or per volume).
    footprint, allowed : memory of a cell, and of a task, in bytes.
    kept : bytes of unpacked chunks of the source that each process keeps for blocks that share them.
    survey, findings : the whole report of the audit.
    """

    recipe: Recipe
    collection: Collection
    understanding: Understanding
    layout: Layout
    fields: tuple[Field, ...]
    workers: int
    footprint: Footprint
    allowed: int
    kept: int
    folder: ResultFolder
    survey: Survey
    notices: tuple[Notice, ...] = ()
    findings: tuple[Finding, ...] = ()

    @property
    def bytes_in(self) -> int:
        """Bytes of all roles, uncompressed."""
        return sum(source.array.nbytes for source in self.collection.roles.values())

    @property
    def bytes_out(self) -> int:
        """Bytes of all fields, uncompressed, in one copy."""
        width = np.dtype(self.recipe.output.precision).itemsize
        cells = self.layout.cells
        return sum(cells * (1 if field.part == "status" else width) for field in self.fields)

    @property
    def processes(self) -> int:
        """How many processes of one machine share its memory."""
        return 1 if self.recipe.engine.chosen == "threads" else self.workers

    def check_budget(self) -> None:
        """Raise BudgetError if a block would take more memory than there is."""
        axes = self.collection.axes
        refuse_over_budget(
            self.footprint, self.layout.cells_per_block, column=self.layout.sizes.get(axes.vertical or "", 1),
            unit=cells_per_unit(self.layout, axes), memory=self.recipe.engine.memory_bytes, workers=self.workers,
            kept=self.processes * self.kept,
        )  # fmt: skip

    def reads_of_a_chunk(self) -> int:
        """How often a chunk of the source is read, at most."""
        return 1 if self.kept else self.blocks_of_a_chunk()

    def memory_to_read_once(self) -> int:
        """Bytes of `memory` with which no chunk of the source would be read twice."""
        shared = _shared_bytes(self.layout, self.collection)
        tasks = self.workers * self.footprint.projected(cells_per_unit(self.layout, self.collection.axes))
        return max(2 * shared * self.processes, shared * self.processes + tasks)

    def blocks_of_a_chunk(self) -> int:
        """How many blocks need the same chunk of the source, at most."""
        return reads_of_a_chunk(self.layout, source_chunks(self.collection))

    def numbers(self) -> Iterator[int]:
        """Every block, those that share chunks of the source one after the other in each process."""
        return self.layout.numbers(source_chunks(self.collection), self.processes)

    def job(self, partial: Path) -> Job:
        """What the blocks have in common, for a store in the folder `partial`."""
        return Job(
            self.collection, self.understanding, self.layout, self.fields, self.recipe.chemistry.constants,
            self.recipe.output.amounts == "per volume", self.recipe.output.precision, partial / STORE, self.kept,
        )

    def report(self) -> Report:
        """The plan in words and numbers."""
        from gridcarb.run.report import plan_report

        return plan_report(self)


@dataclass(frozen=True)
class Draft:
    """A recipe held against its inputs as far as it goes; the plan is None where anything is wrong."""

    inspection: Inspection
    plan: Plan | None
    findings: tuple[Finding, ...]
    faults: tuple[GridcarbError, ...]


def prepare(recipe: Recipe) -> Plan:
    """Hold a recipe against its inputs: headers, coordinates and small samples are read, nothing is written.

    Raises
    ------
    GridcarbError : for whatever would keep the run from ending well, as far as it can be known now; with all else that
        would in its `others`.
    """
    found = draft(recipe)
    faults = Faults()
    for fault in found.faults:
        faults.put(fault)
    faults.tell()
    assert found.plan is not None  # or there would have been a fault
    return found.plan


def draft(recipe: Recipe) -> Draft:
    """As `prepare`, with everything that was found instead of an error."""
    result, figures, engine = Faults(), Faults(), Faults()
    folder = ResultFolder(recipe.output_folder(), replace=recipe.output.replace)
    result.attempt(folder.check)
    seen = inspect(recipe.inputs, recipe.base, recipe.reading)
    notices, plan = seen.notices, None
    if seen.raw is not None and seen.collection is not None:
        _check_figures(recipe, seen.raw, figures)
        if seen.understanding:
            notices += result.attempt(check_grid, seen.raw, seen.collection.axes) or ()
            if recipe.output.netcdf:  # times that make no periods are better told now than after the last block
                result.attempt(parts_of, seen.raw, (), seen.collection.axes.time, recipe.output.netcdf_files)
            plan = engine.attempt(_plan, recipe, seen, seen.collection, seen.understanding, folder)
    found = (
        *(finding for finding in seen.findings if finding.level == "fine"), *assumptions(notices),
        *(finding for finding in seen.findings if finding.level == "stop"),
        *stops("figures", figures.found), *stops("engine", engine.found), *stops("result", result.found),
    )
    faults = (*result.found, *seen.faults, *figures.found, *engine.found)
    if plan is None or faults:
        return Draft(seen, None, found, faults)
    told = tuple({(notice.code, notice.text): notice for notice in notices}.values())
    return Draft(seen, replace(plan, notices=told, findings=found), found, ())


def _plan(
    recipe: Recipe, seen: Inspection, collection: Collection, understanding: Understanding, folder: ResultFolder
) -> Plan:
    fields = _fields(recipe, understanding)
    workers = recipe.engine.workers or cores()
    footprint = _footprint(recipe, collection, fields)
    memory, processes = recipe.engine.memory_bytes, 1 if recipe.engine.chosen == "threads" else workers
    kept, allowed = 0, allowed_per_task(memory, workers)
    layout = _layout(recipe, collection, footprint, allowed, workers)
    shared = _shared_bytes(layout, collection)
    if shared:
        tasks = workers * footprint.projected(cells_per_unit(layout, collection.axes))
        kept = kept_per_process(shared, memory, processes, tasks)
        allowed = allowed_per_task(memory, workers, processes * kept)
        layout = _layout(recipe, collection, footprint, allowed, workers)
    plan = Plan(recipe, collection, understanding, layout, fields, workers, footprint, allowed, kept, folder, seen.survey)
    plan.check_budget()
    return plan


def _check_figures(recipe: Recipe, raw: xr.Dataset, faults: Faults) -> None:
    """Every figure can be drawn, and none would overwrite another."""
    taken: dict[str, int] = {}
    for number, settings in enumerate(recipe.figures):
        kind = FIGURES[settings.kind]
        faults.attempt(kind.check, raw, settings, recipe.chemistry.fields)
        name = Faults().attempt(kind.file_name, raw, settings, recipe.chemistry.fields)
        if name in taken:
            faults.put(_same_file(recipe, name, taken[name], number))
        elif name:
            taken[name] = number


def _same_file(recipe: Recipe, name: str, first: int, second: int) -> RecipeError:
    lines = parse(recipe.text)
    what = f"the figure would be written to {name}, as the one on line {lines.line(('figures', first))}"
    mend = "give one of the two a name of its own: `file: another_name.png`"
    fault = Fault(lines.line(("figures", second)), f"figures[{second}]", what, mend)
    return RecipeError("the recipe has one fault", where=str(recipe.path or "recipe"), faults=(fault,))


def source_chunks(collection: Collection) -> dict[str, int]:
    """Chunk length of the input along each dimension: the largest of any role; 1 where nothing is chunked."""
    found: dict[str, int] = {}
    for source in collection.roles.values():
        for dim, length in zip(source.array.dims, source.array.chunks or (), strict=False):
            found[dim] = max(found.get(dim, 1), length)
    return found


def _fields(recipe: Recipe, understanding: Understanding) -> tuple[Field, ...]:
    keys = [*(key for key in recipe.chemistry.fields if key != STATUS), STATUS]
    if recipe.output.amounts == "per mass":
        return tuple(FIELDS[key] for key in keys)
    if understanding.density.kind == "none":
        per_volume(xr.Dataset(), None)  # refuses, with the line to write
    return tuple(per_volume_field(FIELDS[key]) for key in keys)


def _footprint(recipe: Recipe, collection: Collection, fields: Sequence[Field]) -> Footprint:
    raw = sum(np.dtype(source.array.dtype).itemsize for source in collection.roles.values())
    return Footprint(raw, len(fields), np.dtype(recipe.output.precision).itemsize, recipe.output.amounts != "per mass")


def _layout(recipe: Recipe, collection: Collection, footprint: Footprint, allowed: int, workers: int) -> Layout:
    axes = collection.axes
    block, chunks = ({key: value for key, value in (each.model_dump() if each else {}).items() if value}
                     for each in (recipe.engine.block, recipe.output.chunks))  # fmt: skip
    return lay_out(
        {dim: collection.sizes[dim] for dim in axes.order}, axes, cells=footprint.cells_within(allowed),
        workers=workers * recipe.engine.machines, source_chunks=source_chunks(collection), block=block, chunks=chunks,
        item_bytes=footprint.item_bytes,
    )  # fmt: skip


def _shared_bytes(layout: Layout, collection: Collection) -> int:
    """Bytes, unpacked, of the chunks of all roles that blocks share which are done one after the other."""
    part = shared_part(layout, source_chunks(collection))
    if part is None:
        return 0
    sources = [role.array for role in collection.roles.values()]
    return sum(math.prod(part[dim].stop for dim in source.dims) * np.dtype(source.dtype).itemsize for source in sources)
