"""What a plan and an outcome say: rows for people, plain data for machines."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from gridcarb.chemistry import CONSTANTS
from gridcarb.errors import Notice
from gridcarb.fields import Field
from gridcarb.run.budget import PROGRAM_BYTES
from gridcarb.run.costs import Span
from gridcarb.write.disk import free_bytes, sized
from gridcarb.write.settings import OutputSettings

if TYPE_CHECKING:
    from gridcarb.run.conduct import Outcome
    from gridcarb.run.plan import Plan
    from gridcarb.run.rehearsal import Rehearsal

Rows = list[tuple[str, str]]


@dataclass(frozen=True)
class Section:
    """A titled group of rows, each a label and a value."""

    title: str
    rows: Rows


@dataclass(frozen=True)
class Report:
    """Sections in the order to be read, the notices, and the same as plain data."""

    sections: Sequence[Section]
    notices: Sequence[Notice]
    data: dict[str, object] = field(default_factory=dict)

    def as_dict(self) -> dict[str, object]:
        """The report for machines: only what JSON knows."""
        return self.data


def plan_report(plan: Plan) -> Report:
    """What will be read and how it is understood, the blocks, and what they cost."""
    sections = [
        Section("What will be read", _read_rows(plan)),
        Section("How it is understood", _understood_rows(plan)),
        Section("What will be computed", _computed_rows(plan)),
        Section("What it will take", _cost_rows(plan)),
        Section("Where it will go", _place_rows(plan)),
    ]
    return Report(sections, plan.notices, plan_data(plan, plan.notices))


def rehearsal_report(rehearsal: Rehearsal) -> Report:
    """The plan, with what it will cost as some blocks of it told."""
    told = plan_report(rehearsal.plan)
    count = len(rehearsal.blocks)
    title = f"What it will cost, measured on {count} block{'s' * (count != 1)}"
    sections = [*told.sections[:-1], Section(title, _rehearsed_rows(rehearsal)), told.sections[-1]]
    notices = rehearsal.notices
    data = {**told.data, "notices": [notice.as_dict() for notice in notices], "cost": _cost_data(rehearsal)}
    return Report(sections, notices, data)


def outcome_report(outcome: Outcome) -> Report:
    """What was read, computed and written, and what to look at first."""
    plan = outcome.plan
    sections = [
        Section("What was read", _read_rows(plan)),
        Section("How it was understood", _understood_rows(plan)),
        Section("What was computed", [*_computed_rows(plan), *_status_rows(outcome), *_range_rows(outcome)]),
        Section("Where it was written", [(name, str(path)) for name, path in outcome.written.items()]),
        Section("What to look at first", _first_looks(outcome)),
    ]
    data = {**plan_data(plan, outcome.notices), "written": {name: str(path) for name, path in outcome.written.items()},
            "products": outcome.products, "seconds": outcome.seconds}  # fmt: skip
    return Report(sections, outcome.notices, data)


def plan_data(plan: Plan, notices: Sequence[Notice]) -> dict[str, object]:
    """A plan as plain data, with the notices of the plan, or of the whole run."""
    return {
        "title": plan.recipe.title,
        "inputs": plan.collection.describe(),
        "grid": {"kind": plan.collection.kind, "sizes": dict(plan.layout.sizes)},
        "understood": [
            {"subject": each.subject, "reading": each.reading, "because": each.because}
            for each in plan.understanding.decisions
        ],
        "notices": [notice.as_dict() for notice in notices],
        "constants": plan.recipe.chemistry.constants,
        "fields": [entry.key for entry in plan.fields],
        "blocks": {
            "count": len(plan.layout), "size": dict(plan.layout.block), "stored_chunks": dict(plan.layout.chunks),
            "reads_of_a_source_chunk": plan.reads_of_a_chunk(),
        },
        "bytes": {"in": plan.bytes_in, "out": plan.bytes_out},
        "memory": {
            "workers": plan.workers, "allowed_per_task": plan.allowed,
            "program": PROGRAM_BYTES, "projected_per_task": plan.footprint.projected(plan.layout.cells_per_block),
            "kept_per_process": plan.kept,
        },
        "result": str(plan.folder.target),
    }  # fmt: skip


def _read_rows(plan: Plan) -> Rows:
    rows: Rows = []
    for row in plan.collection.describe():
        files = f"{row['files']} files from {row['first_file']}" if row["files"] > 1 else str(row["first_file"])
        units = row["units"] or "no units"
        rows.append((str(row["role"]), f"{row['variable']} ({units}), found {row['match']}, in {files}"))
    sizes = " x ".join(f"{dim} {size}" for dim, size in plan.layout.sizes.items())
    rows.append(("grid", f"{plan.collection.kind}: {sizes or 'one cell'} = {plan.layout.cells:,} cells"))
    return rows


def _understood_rows(plan: Plan) -> Rows:
    return [(each.subject, f"{each.reading} ({each.because})") for each in plan.understanding.decisions]


def _computed_rows(plan: Plan) -> Rows:
    chosen = CONSTANTS[plan.recipe.chemistry.constants]
    keys = [entry.key for entry in plan.fields if entry.part != "status"]
    return [("constants", f"{chosen.key}: {chosen.title}"), ("fields", ", ".join(keys))]


def _cost_rows(plan: Plan) -> Rows:
    layout = plan.layout
    size = " x ".join(f"{dim} {length}" for dim, length in layout.block.items())
    projected = plan.footprint.projected(layout.cells_per_block)
    rows = [
        ("blocks", f"{len(layout)} of up to {size or 'one cell'}"),
        ("bytes in", f"{sized(plan.bytes_in)} uncompressed"),
        ("bytes out", f"{sized(plan.bytes_out)} uncompressed in each copy"),
        ("memory", f"{sized(projected)} a task, {plan.workers} at a time; {sized(plan.allowed)} a task are allowed; "
                   f"the program itself takes about {sized(PROGRAM_BYTES)}"),
    ]
    times = plan.reads_of_a_chunk()
    if times > 1:
        rows.append(("reading", f"a chunk of the source is read up to {times} times: blocks are smaller than its chunks; "
                     f"to keep these would take {sized(plan.memory_to_read_once())} of `memory` under `engine`"))
    elif plan.kept:
        rows.append(("reading", f"a chunk of the source is read once and kept for the {plan.blocks_of_a_chunk()} blocks "
                     f"that need it, in up to {sized(plan.kept)} of each process"))
    return rows


def _rehearsed_rows(rehearsal: Rehearsal) -> Rows:
    found, layout = rehearsal.costs, rehearsal.plan.layout
    beside = f", {rehearsal.neighbours} of them to share chunks with another" * bool(rehearsal.neighbours)
    machine = f"{found.cores} core{'s' * (found.cores != 1)}"
    rows = [
        ("measured", f"{rehearsal.cells:,} of {layout.cells:,} cells, {found.wet:.0%} of them water{beside}; it took "
                     f"{lasting(rehearsal.seconds)}"),
        ("speed of a core", _spanned(found.cells_per_second, lambda rate: f"{rate / 1e6:.3g}") + " million cells/s"),
        ("spent on", ", ".join(f"{leg} {share:.0%}" for leg, share in found.shares.items())
                     + f"; computing {found.busy:.0%} of the time, else waiting"),
        ("core-hours", _spanned(found.core_hours, _figures)),
        ("by the clock", f"{_spanned(found.block_hours, _hours)} on {machine}, if none waits for another"),
    ]
    if rehearsal.plan.recipe.output.netcdf:
        rows.append(("NetCDF copy", f"{_spanned(found.file_bytes, sized)}, {_spanned(found.export_hours, _hours)} more: "
                                    "one core writes it when all blocks are done"))
    bytes_in = "not known: a store behind an address" if rehearsal.bytes_in is None else sized(rehearsal.bytes_in)
    rows += [
        ("files in", f"{bytes_in} as they are stored"),
        ("store out", f"{_spanned(found.store_bytes, sized)}, compressed"),
        ("files out", f"{rehearsal.files:,}: {round(found.chunk_files):,} chunks, {len(layout):,} markers "
                      f"({sized(found.marker_bytes)}), {rehearsal.frame_files:,} of metadata and coordinates"),
        ("room", _room_words(rehearsal)),
    ]
    if not found.wet:
        rows.append(("caution", "all of these blocks were land: water takes longer and more room; rehearse more of them"))
    return rows


def _room_words(rehearsal: Rehearsal) -> str:
    (likely, most), free = rehearsal.needed, rehearsal.free
    fit = "it would not fit" if likely > free else "it might not fit" if most > free else "it fits"
    return f"{sized(likely)} while it is made, {sized(free)} free: {fit}"


def _cost_data(rehearsal: Rehearsal) -> dict[str, object]:
    found = rehearsal.costs
    return {
        "blocks": [number + 1 for number in rehearsal.blocks], "cells": rehearsal.cells, "seconds": rehearsal.seconds,
        "wet_share": found.wet, "cores": found.cores, "cells_per_second": found.cells_per_second.as_dict(),
        "shares": dict(found.shares), "busy_share": found.busy,
        "core_hours": found.core_hours.as_dict(), "block_hours": found.block_hours.as_dict(),
        "netcdf_hours": found.export_hours.as_dict(), "bytes_in": rehearsal.bytes_in,
        "store_bytes": found.store_bytes.as_dict(), "netcdf_bytes": found.file_bytes.as_dict(),
        "marker_bytes": found.marker_bytes, "files": rehearsal.files, "bytes_needed": rehearsal.needed[0],
        "bytes_free": rehearsal.free,
    }  # fmt: skip


def _spanned(span: Span, words: Callable[[float], str]) -> str:
    """The likely amount, and the ends of its span unless they read alike."""
    likely, low, high = (words(amount) for amount in (span.likely, span.lowest, span.highest))
    return likely if low == high else f"{likely} ({low} to {high})"


def _figures(amount: float) -> str:
    """Three figures, without an exponent where that can be helped: ``12,300``."""
    rounded = float(f"{amount:.3g}")
    return f"{rounded:,.0f}" if rounded >= 1000 else f"{rounded:g}"


def _hours(hours: float) -> str:
    return lasting(3600 * hours)


def lasting(seconds: float) -> str:
    """A time in words of two or three figures: ``12 min``, ``3.5 h``, ``6.2 days``."""
    for size, word, most in ((1, "s", 100), (60, "min", 100), (3600, "h", 72)):
        if seconds < most * size:
            return f"{seconds / size:.2g} {word}"
    return f"{_figures(seconds / 86_400)} days"


def _place_rows(plan: Plan) -> Rows:
    output = plan.recipe.output
    kept = [("Zarr store" + f" (format {output.zarr_format})") * output.zarr, _netcdf_words(output) * output.netcdf]
    figures = len(plan.recipe.figures)
    kept.append(f"{figures} figure{'s' * (figures != 1)}" * bool(figures))
    return [
        ("result", str(plan.folder.target)), ("holding", ", ".join([*filter(None, kept), "journal"])),
        ("room there", f"{sized(free_bytes(plan.folder.target))} free"),
    ]


def _netcdf_words(output: OutputSettings) -> str:
    return "NetCDF-4 file" if output.netcdf_files == "one" else f"NetCDF-4 files {output.netcdf_files}"


def _status_rows(outcome: Outcome) -> Rows:
    counts = outcome.status_counts
    total = sum(counts.values())
    rows = [("cells solved", f"{counts['solved'] + counts['outside_validity']:,} of {total:,}")]
    words = {
        "outside_validity": "solved, outside the range of the constants",
        "missing_input": "without input (land, sea floor, gaps)",
        "unphysical_input": "with unphysical input",
        "unsolved": "not solved",
    }
    rows += [(f"  {text}", f"{counts[word]:,}") for word, text in words.items() if counts.get(word)]
    return rows


def _range_rows(outcome: Outcome) -> Rows:
    rows: Rows = []
    for entry in outcome.plan.fields:
        found: dict[str, Any] = outcome.products["ranges"][entry.key]
        if entry.part == "status" or not found["values"]:
            continue
        low, high = (_number(found[end], entry.digits) for end in ("minimum", "maximum"))
        units = "" if entry.units == "1" else f" {entry.units}"
        strange = found["below_sane_range"] + found["above_sane_range"]
        note = f"; {strange:,} outside the usual range" if strange else ""
        rows.append((entry.key, f"{low} to {high}{units}{_mean_words(outcome, entry)}{note}"))
    return rows


def _mean_words(outcome: Outcome, entry: Field) -> str:
    """The mean by area at the top of the sea, where areas are known."""
    surface = outcome.products["means"]["surface"]
    mean = surface and surface["fields"][entry.key]["mean"]
    return "" if mean is None else f"; surface mean {_number(mean, entry.digits)}"


def _number(value: float, digits: int) -> str:
    return f"{value:.{digits}f}" if digits <= 6 else f"{value:.4g}"


def _first_looks(outcome: Outcome) -> Rows:
    rows: Rows = [("map", str(path)) for name, path in outcome.written.items() if name.startswith("figure")]
    if "NetCDF file" in outcome.written:
        rows.append(("in Python", f"xarray.open_dataset({str(outcome.written['NetCDF file'])!r})"))
    elif "Zarr store" in outcome.written:
        rows.append(("in Python", f"xarray.open_zarr({str(outcome.written['Zarr store'])!r})"))
    rows.append(("journal", "what was read, decided and computed, with every citation"))
    rows.append((
        "caution", "computed from gridded input, with the uncertainty of its constants (about 0.1 in aragonite "
        "saturation); for hatchery, water-quality or dosing decisions rely on local measurement, local rules and "
        "licensed practice",
    ))
    return rows
