"""The two steps of harmonising: `understand` a collection once, then `clothe` its blocks.

After `clothe` every number is in the catalogue's units: in-situ temperature, practical salinity, sea pressure, amounts
per kilogram of sea water.
"""

from __future__ import annotations

import dataclasses
import itertools
from collections.abc import Collection, Mapping
from typing import Any

import numpy as np
import xarray as xr

from gridcarb.axes import Axes, find_axes
from gridcarb.errors import Faults, InputError, Notice
from gridcarb.fields import FIELDS, REQUIRED_ROLES, ROLES
from gridcarb.harmonise import amounts, depth, masks, nutrients, plausibility, salinity, temperature, thickness
from gridcarb.harmonise.decisions import Decided, Decision, Understanding
from gridcarb.harmonise.settings import ReadingSettings

_MOST_SLABS = 12
"""Slabs of the first time step that are searched for water, a million cells each: some seconds, whatever the size."""


def understand(
    raw: xr.Dataset, settings: ReadingSettings, *, file_attributes: Mapping[Any, Any] | None = None
) -> Understanding:
    """Decide how a collection is read, from its headers, its coordinates and a small sample.

    Parameters
    ----------
    raw : variables named by role, numbers and attributes as in the files (lazy or loaded), coordinates loaded.
    settings : the section `reading` of the recipe.
    file_attributes : global attributes of the files; those of `raw` if left out.

    Raises
    ------
    InputError, UnitsError : for whatever cannot be read safely; the message says which recipe line settles it, and
        `others` hold whatever else is wrong.
    """
    faults = Faults()
    found = examine(raw, settings, faults, file_attributes=file_attributes)
    faults.tell()
    assert found.understanding is not None  # or there would have been a fault
    return found.understanding


@dataclasses.dataclass(frozen=True)
class Examination:
    """How far the input is understood; `understanding` is None where a fault was in the way.

    medians : key -> median of a small sample of the first time step in the catalogue's units, of what has values.
    """

    decisions: tuple[Decision, ...] = ()
    notices: tuple[Notice, ...] = ()
    medians: Mapping[str, float] = dataclasses.field(default_factory=dict)
    understanding: Understanding | None = None


def examine(
    raw: xr.Dataset, settings: ReadingSettings, faults: Faults, *, file_attributes: Mapping[Any, Any] | None = None,
    absent: Collection[str] = (),
) -> Examination:
    """As `understand`, topic by topic, with every error put by in `faults`.

    `absent` : roles that are known to be missing, and told already.
    """
    own = Faults()
    attributes = raw.attrs if file_attributes is None else file_attributes
    found = own.attempt(_examine, raw, settings, attributes, own, absent) or Examination()
    for error in own.found:
        error.where = _with_file(error.where, raw)
        faults.put(error)
    return found


def _examine(
    raw: xr.Dataset, settings: ReadingSettings, attributes: Mapping[Any, Any], faults: Faults, absent: Collection[str]
) -> Examination:
    axes = find_axes(raw)
    present = tuple(role for role in ROLES if role in raw.data_vars)
    _refuse_missing([role for role in REQUIRED_ROLES if role not in present and role not in absent])
    for role in present:
        faults.attempt(_refuse_strange_dims, role, raw, axes)
    draft, decided = _read_headers(raw, axes, present, settings, attributes, faults)
    decisions = tuple(decision for part in decided for decision in part.decisions)
    notices = tuple(notice for part in decided for notice in part.notices)
    if draft is None or faults.found or absent:
        return Examination(decisions, notices)
    told, medians = faults.attempt(_check_sample, raw, draft, settings, faults) or ((), {})
    notices += told
    whole = None if faults.found else dataclasses.replace(draft, decisions=decisions, notices=notices)
    return Examination(decisions, notices, medians, whole)


def _with_file(where: str, raw: xr.Dataset) -> str:
    """The place of an error with the file (and the name in it) of the role it speaks of, as far as the data know it.

    The density lies in no variable: its place is the key of the recipe that states it.
    """
    if where == "density":
        return "reading.density"
    speaker = raw.data_vars.get(where.partition(",")[0], raw.data_vars.get("temperature"))
    origin = {} if speaker is None else speaker.encoding
    if "source" not in origin or where.startswith("reading."):
        return where
    name = origin.get("original_name", where)
    return f"{origin['source']}: " + (f"{name} ({where})" if where in raw.data_vars and name != where else where)


def clothe(raw: xr.Dataset, understanding: Understanding) -> xr.Dataset:
    """A loaded block, or any slice of the grid, as float64 numbers in canonical units.

    Gives the keys temperature (degC, in situ), salinity (practical), sea_pressure (dbar), dic, alkalinity, phosphate,
    silicate (umol/kg), density (kg m-3) where amounts per volume were met or a density was stated, and cell_thickness (m)
    where the understanding knows it; NaN where masked; dims in the order time, vertical, horizontal. Pressure, a constant
    density and an assumed nutrient have no more dims than they vary over, down to none.
    `attrs["masked_cells"]` counts the masked cells by rule. A cell's numbers do not depend on the slice it comes in.
    """
    clean, counts = masks.unmask_roles(raw, understanding.masks, _roles_read(understanding))
    place = depth.locate(raw, understanding.axes, understanding.masks, understanding.place)
    fields = _fields(clean, place, understanding)
    order = [dim for dim in understanding.axes.order if dim in raw.dims]
    variables = {
        key: values.transpose(*(dim for dim in order if dim in values.dims)).assign_attrs(_attributes(key))
        for key, values in fields.items()
    }
    thick = thickness.thickness(raw, understanding, place)
    if thick is not None:
        variables["cell_thickness"] = thick
    coords = raw.coords.to_dataset().drop_vars([name for name in variables if name in raw.coords]).coords
    return xr.Dataset(variables, coords=coords, attrs={"masked_cells": counts})


def _fields(clean: Mapping[str, xr.DataArray], place: depth.Place, understanding: Understanding) -> dict[str, xr.DataArray]:
    kind_s, kind_t, rho = understanding.salinity.kind, understanding.temperature.kind, understanding.density
    salt = understanding.salinity.to_grams_or_practical(clean["salinity"])
    absolute = None
    if kind_t != "in situ" or rho.kind == "in situ":
        absolute = salinity.absolute_salinity(salt, kind_s, place)
    celsius = understanding.temperature.to_celsius(clean["temperature"])
    warm = temperature.in_situ(celsius, kind_t, absolute, place.pressure)
    of_water = amounts.density(rho, absolute, warm, place.pressure)
    fields = {
        "temperature": warm,
        "salinity": salinity.practical_salinity(salt, kind_s, place),
        "sea_pressure": place.pressure,
    }
    for role, reading in understanding.amounts.items():
        fields[role] = amounts.per_kilogram(clean[role], reading, of_water)
    for role, assumed in understanding.nutrients.items():
        fields[role] = nutrients.constant(assumed, of_water)
    if of_water is not None:
        # A variable may bear the name of an axis only if it has several, or just that one.
        fields["density"] = of_water.broadcast_like(warm) if "density" in warm.dims else of_water
    return fields


def _attributes(key: str) -> dict[str, object]:
    if key == "density":
        return {"long_name": "density between amounts per volume and per mass", "units": "kg m-3"}
    return FIELDS[key].attributes()


def _refuse_missing(absent: list[str]) -> None:
    if absent:
        raise InputError(f"the data give no {' and no '.join(absent)}", where=", ".join(absent),
                         mend=f"name the variable by `inputs: {{{absent[0]}: ...}}` in the recipe")


def _refuse_strange_dims(role: str, raw: xr.Dataset, axes: Axes) -> None:
    strange = [str(dim) for dim in raw[role].dims if dim not in axes.order]
    if strange:
        raise InputError(f"its dimension '{strange[0]}' is neither time nor vertical nor horizontal", where=role,
                         mend="select one place along it, or give it a coordinate with CF attributes")


def _read_headers(
    raw: xr.Dataset, axes: Axes, present: tuple[str, ...], settings: ReadingSettings, attributes: Mapping[Any, Any],
    faults: Faults,
) -> tuple[Understanding | None, list[Decided[Any]]]:
    """The understanding as far as headers and coordinates go (None: not far enough), and what was decided, in order."""
    marks = {role: mark for role in present if (mark := faults.attempt(masks.read_mask, raw[role], role))}
    names = {str(raw[role].attrs.get("standard_name", "")) for role in present}
    place = faults.attempt(_read_place, raw, axes, marks, settings, names)
    # Without a place the depth is unknown, and nothing that was assumed because of it would be worth telling.
    deepest = place.reading.vertical.deepest if place else np.nan
    heads = {role: raw[role].attrs for role in present}
    warm = faults.attempt(
        temperature.read_temperature, heads["temperature"], settings, deepest, attributes
    ) if "temperature" in heads else None
    salt = faults.attempt(salinity.read_salinity, heads["salinity"], settings) if "salinity" in heads else None
    assumed = faults.attempt(nutrients.read_nutrients, present, settings, deepest)
    rest = [role for role in present if role not in ("temperature", "salinity")]
    given = [role for role in rest if not (assumed and role in assumed.reading)]
    amount = {role: faults.attempt(amounts.read_amount, role, heads[role], settings) for role in given}
    tracers = {role: part for role, part in amount.items() if part}
    per_volume = {role: heads[role] for role, part in tracers.items() if part.reading.per_volume}
    stated = assumed.reading if assumed else {}
    per_volume |= {role: {} for role, reading in stated.items() if reading.amount.per_volume}
    rho = faults.attempt(amounts.read_density, per_volume, settings, attributes)
    decided = [part for part in (place and warm, salt, place, *tracers.values(), rho, place and assumed) if part]
    if not (place and warm and salt and rho and assumed) or faults.found:
        return None, decided
    draft = Understanding(
        axes=axes, masks=marks, place=place.reading, temperature=warm.reading, salinity=salt.reading,
        amounts={role: part.reading for role, part in tracers.items()}, density=rho.reading, nutrients=assumed.reading,
    )
    return draft, decided


def _read_place(
    raw: xr.Dataset, axes: Axes, marks: dict[str, masks.MaskReading], settings: ReadingSettings, names: set[str]
) -> Decided[depth.PlaceReading]:
    marks.update(depth.coordinate_masks(raw, axes))
    return depth.read_place(raw, axes, marks, settings, names)


def _check_sample(
    raw: xr.Dataset, draft: Understanding, settings: ReadingSettings, faults: Faults
) -> tuple[tuple[Notice, ...], dict[str, float]]:
    """Look at small samples of the first time step, and refuse what is not plausible; notices, and median of every role."""
    roles = _roles_read(draft)
    samples = _wet_samples(raw[list(roles)], draft)
    pieces = [masks.unmask_roles(sample, draft.masks, roles) for sample in samples]
    missing = [xr.broadcast(*(clean[role].isnull() for role in roles)) for clean, _ in pieces]
    flat = {role: np.concatenate([part[n].values.ravel() for part in missing]) for n, role in enumerate(roles)}
    notices = faults.attempt(plausibility.check_masks, flat, settings) or ()
    clothed = [clothe(sample, draft) for sample in samples]
    wet = [part["salinity"].notnull() for part in clothed]
    lost = sum(int((water & part["sea_pressure"].isnull()).sum()) for water, part in zip(wet, clothed, strict=True))
    notices += faults.attempt(plausibility.check_depths, lost, sum(int(water.sum()) for water in wet), settings) or ()
    medians: dict[str, float] = {}
    for role in roles:
        values = np.concatenate([part[role].values.ravel() for part in clothed])
        if not np.isnan(values).all():
            medians[role] = float(np.nanmedian(values))
    shallowest = min(float(part["sea_pressure"].min()) for part in clothed)
    faults.attempt(plausibility.check_values, medians, shallowest, draft.amounts, settings)
    return (*notices, *_mask_notices([counts for _, counts in pieces])), medians


def _mask_notices(counts: list[dict[str, int]]) -> tuple[Notice, ...]:
    """What was taken as missing although no attribute says so."""
    notices: list[Notice] = []
    if any(count["usual_fill"] for count in counts):
        notices.append(Notice("usual_fill", "values of exactly -999 or -9999 are taken as missing; no attribute says so"))
    if any(count["land"] for count in counts):
        notices.append(Notice("land_by_physics", "cells with neither salinity nor alkalinity (both zero or less) are taken "
                              "as land; no attribute says so"))
    return tuple(notices)


def _wet_samples(raw: xr.Dataset, draft: Understanding) -> list[xr.Dataset]:
    """Loaded patches if any has water in it, else the first slab that has; InputError if none is found."""
    axes, top = draft.axes, draft.place.vertical.top
    spread = [_load(raw, window) for window in plausibility.patches(axes, raw.sizes, top)]
    if any(_wet(piece, draft) for piece in spread):
        return spread
    slabs = plausibility.slabs(axes, raw.sizes, top)
    for window in itertools.islice(slabs, _MOST_SLABS):
        piece = _load(raw, window)
        if _wet(piece, draft):
            return [piece]
    part = f"no cell in the first {_MOST_SLABS} million of" if any(slabs) else "no cell of"
    raise InputError(f"{part} the first time step has temperature, salinity, DIC and alkalinity: all is missing",
                     where=", ".join(REQUIRED_ROLES), mend="check the variables, their fill values and their land masks")


def _load(raw: xr.Dataset, window: Mapping[str, slice]) -> xr.Dataset:
    return raw.isel({dim: part for dim, part in window.items() if dim in raw.dims}).load()


def _wet(piece: xr.Dataset, draft: Understanding) -> bool:
    """Whether any cell of a loaded slice has all required roles."""
    clean, _ = masks.unmask_roles(piece, draft.masks, REQUIRED_ROLES)
    wet = xr.DataArray(True)
    for values in clean.values():
        wet = wet & values.notnull()
    return bool(wet.any())


def _roles_read(understanding: Understanding) -> tuple[str, ...]:
    """The roles whose numbers come from the files."""
    return tuple(role for role in ROLES if role in ("temperature", "salinity") or role in understanding.amounts)
