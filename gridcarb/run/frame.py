"""The frame of a result's store: metadata and coordinates, the same bytes for the same plan and date."""

from __future__ import annotations

import os
from datetime import UTC, datetime
from pathlib import Path

import xarray as xr

from gridcarb.chemistry import CONSTANTS
from gridcarb.run.plan import Plan
from gridcarb.sources import open_collection
from gridcarb.write.attributes import global_attributes
from gridcarb.write.store import create


def make_store(plan: Plan, path: Path, dated: datetime) -> None:
    """Make the store of a plan at `path`, its fields still empty; its history tells the date `dated`."""
    raw = open_collection(plan.collection)
    output = plan.recipe.output
    create(
        path, template=raw, fields=plan.fields, axes=plan.collection.axes, chunks=plan.layout.chunks,
        attributes=_attributes(plan, raw, dated), zarr_format=output.zarr_format, precision=output.precision,
    )  # fmt: skip


def date_of_writing() -> datetime:
    """Now, or the date the environment asks for as SOURCE_DATE_EPOCH (seconds), which makes results comparable by byte."""
    asked = os.environ.get("SOURCE_DATE_EPOCH", "")
    return datetime.fromtimestamp(int(asked), UTC) if asked.isdecimal() else datetime.now(UTC)


def _attributes(plan: Plan, raw: xr.Dataset, dated: datetime) -> dict[str, object]:
    keys = dict.fromkeys(key for keys in CONSTANTS[plan.recipe.chemistry.constants].citations().values() for key in keys)
    notes = [f"Constants: {plan.recipe.chemistry.constants}."]
    notes += [f"{str(decision)[:1].upper()}{str(decision)[1:]}." for decision in plan.understanding.decisions]
    notes += [f"Notice: {notice.text}." for notice in plan.notices]
    return global_attributes(
        title=plan.recipe.title, template=raw, axes=plan.collection.axes, fields=plan.fields, now=dated, citations=keys,
        notes=notes, own={**plan.recipe.output.attributes, "constants": plan.recipe.chemistry.constants},
    )
