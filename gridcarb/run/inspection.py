"""What lies in the inputs, how it is understood, and all that is wrong with it: headers and small samples are read.

The one door of `gridcarb audit`, `plan` and `run`.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import xarray as xr

from gridcarb.errors import Faults, GridcarbError, Notice
from gridcarb.fields import FIELDS, REQUIRED_ROLES, ROLES
from gridcarb.harmonise import Understanding, weigh
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.harmonise.stage import Examination, examine
from gridcarb.run import findings
from gridcarb.run.budget import DEFAULT_KEPT_BYTES
from gridcarb.run.findings import Finding
from gridcarb.run.layout_in_files import chunk_findings
from gridcarb.sources import Collection, InputsSettings, chunks_kept, open_collection
from gridcarb.sources.dates import Units
from gridcarb.sources.survey import Survey, survey


@dataclass(frozen=True, eq=False)
class Inspection:
    """The inputs of a recipe, looked at.

    collection, understanding : None where a stop is in the way of a run.
    raw : all roles that fit together, lazy; None if there are none.
    faults : the errors behind the findings that are stops.
    """

    survey: Survey
    raw: xr.Dataset | None
    collection: Collection | None
    understanding: Understanding | None
    findings: tuple[Finding, ...]
    faults: tuple[GridcarbError, ...]
    notices: tuple[Notice, ...]


def inspect(inputs: InputsSettings, base: Path, reading: ReadingSettings) -> Inspection:
    """Look at all inputs as far as it goes; nothing is raised for what is wrong with them.

    Parameters
    ----------
    inputs, reading : the sections of a recipe.
    base : the folder its relative paths start from.
    """
    files, meaning = Faults(), Faults()
    looked = survey(inputs, base)
    for fault in looked.faults:
        files.put(fault)
    collection = looked.collection
    raw = meaning.attempt(open_collection, collection) if collection else None
    examined = Examination() if raw is None else _examine(raw, reading, meaning, collection)
    told = (*(collection.notices if collection else ()), *examined.notices)
    found = [
        *(_described(collection) if collection else []), *findings.readings(examined.decisions),
        *(_masked(examined.understanding) if examined.understanding else []), *_sampled(examined.medians),
        *(chunk_findings(collection) if collection else []), *findings.assumptions(told),
        *findings.stops("files", files.found), *findings.stops("meaning", meaning.found),
    ]
    whole = not files.found
    return Inspection(
        looked, raw, collection if whole else None, examined.understanding if whole else None, tuple(found),
        (*files.found, *meaning.found), told,
    )


def _examine(raw: xr.Dataset, reading: ReadingSettings, faults: Faults, collection: Collection | None) -> Examination:
    """The examination of all roles there are, with the weights of cells where it came to an understanding."""
    absent = [role for role in REQUIRED_ROLES if role not in raw.data_vars]
    with chunks_kept(DEFAULT_KEPT_BYTES):  # the samples lie close to each other
        found = examine(raw, reading, faults, absent=absent)
        if found.understanding is None:
            return found
        weighed = faults.attempt(weigh, raw, found.understanding, reading, collection.measures if collection else None)
    return replace(found, decisions=weighed.decisions, notices=weighed.notices, understanding=weighed) if weighed else found


def _masked(understanding: Understanding) -> Iterator[Finding]:
    """How missing values are marked, once for all roles that do it alike."""
    groups: dict[str, list[str]] = {}
    for role in ROLES:
        if mask := understanding.masks.get(role):
            marks = [f"{value:g} ({rule})" for rule, value in mask.fills] + ["NaN"]
            ends = (("below", mask.low), ("above", mask.high))
            edges = [f"{side} {end:g}" for side, end in ends if end is not None]
            plain = (mask.scale, mask.offset) == (1.0, 0.0)
            packing = "" if plain else f"; packed, scale {mask.scale:g} and offset {mask.offset:g}"
            groups.setdefault(", ".join(marks + edges) + packing, []).append(role)
    for told, roles in groups.items():
        yield Finding("fine", "missing", f"{', '.join(roles)}: {told}")


def _sampled(medians: Mapping[str, float]) -> Iterator[Finding]:
    if medians:
        told = ", ".join(f"{key} {value:.4g} {FIELDS[key].units}".removesuffix(" 1") for key, value in medians.items())
        yield Finding("fine", "sample", f"medians near the top at the first time: {told}")


def _described(collection: Collection) -> Iterator[Finding]:
    """Grid and time as the headers give them."""
    sizes = " x ".join(f"{dim} {size}" for dim, size in collection.sizes.items()) or "one cell"
    horizontal = ", ".join(f"'{name}'" for name in (collection.axes.latitude, collection.axes.longitude) if name)
    yield Finding("fine", "grid", f"{collection.kind}: {sizes}; positions from {horizontal or 'nothing'}")
    vertical = collection.axes.vertical_coordinate
    if vertical:
        attrs = collection.coordinates[vertical].attrs if vertical in collection.coordinates else {}
        sense = f", positive {attrs['positive']}" if "positive" in attrs else ", no attribute positive"
        yield Finding("fine", "vertical", f"'{vertical}' in {attrs.get('units') or 'no units'}{sense}")
    else:
        yield Finding("fine", "vertical", "no vertical coordinate")
    yield Finding("fine", "time", _time_words(collection))


def _time_words(collection: Collection) -> str:
    """Span, calendar, and whether the steps have bounds."""
    name = collection.axes.time_coordinate
    source = collection.coordinates.get(name) if name else None
    if source is None or source.values is None or not source.values.size:
        return f"{collection.sizes[collection.axes.time]} steps without dates" if collection.axes.time else "no time"
    units, values = Units.of(source.attrs), source.values.ravel()
    if collection.axes.time is None and values.size > 1:
        return f"{units.date(values.min())} to {units.date(values.max())}, a time for each place, calendar {units.calendar}"
    edges = _edges(source.attrs)
    spread = f"{units.date(values[0])} to {units.date(values[-1])}, {values.size} steps" if values.size > 1 else (
        units.date(values[0]))
    said = "no bounds, steps are told apart by their spacing"
    if edges in collection.coordinates:
        said = f"bounds '{edges}'" + (" of a climatology" if "climatology" in source.attrs else "")
    files = len({segment.path for role in collection.roles.values() for segment in role.array.segments})
    return f"{spread}, calendar {units.calendar}, {said}, in {files} file{'s' * (files != 1)}"


def _edges(attrs: Any) -> str:
    return str(attrs.get("bounds") or attrs.get("climatology") or "")
