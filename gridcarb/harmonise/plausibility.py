"""Whether a small sample looks like sea water once it is read as decided; refused with the likely cure if not."""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from gridcarb import units
from gridcarb.axes import Axes
from gridcarb.errors import InputError, Notice
from gridcarb.fields import FIELDS, NUTRIENTS
from gridcarb.harmonise.amounts import USUAL_DENSITY, AmountReading
from gridcarb.harmonise.masks import Flags
from gridcarb.harmonise.settings import ReadingSettings

CARBON_RANGE = (1500.0, 3000.0)
"""Median DIC and alkalinity of sea water (umol/kg)."""
SALINITY_RANGE = (2.0, 45.0)
MOST_DIC_PER_ALKALINITY = 1.08
"""Near the surface the median ratio is about 0.88 in warm and 0.96 in polar water; the other way round 1.13 and 1.05."""

_NEAR_SURFACE = 200.0
_VALUES = 20_000
_SLAB = 1_000_000
_AMOUNTS = ("mol m-3", "mmol m-3", "umol kg-1", "mol kg-1")
_MASSES = {"dic": ("g m-3", "C", 12.011), "alkalinity": ("mg L-1", "CaCO3", 50.0435)}
"""Units that a file may have meant; masses with substance and g per mole (of CaCO3 the half, as it counts double)."""

_ACCEPT = "or `reading: {unusual_values: accept}` if this water is meant"


def patches(axes: Axes, sizes: Mapping[Any, int], top: int) -> list[dict[str, slice]]:
    """Slices of the first time step at level `top`: the whole map if it is small, else nine patches spread over it.

    Every patch is contiguous; together they hold at most about 20,000 values of one role.
    """
    here = _at(axes.time, 0) | _at(axes.vertical, top)
    dims = axes.horizontal
    if not dims or np.prod([sizes[dim] for dim in dims], dtype=np.int64) <= _VALUES:
        return [here]
    side = max(1, int((_VALUES / 3 ** len(dims)) ** (1 / len(dims))))
    starts = [[place * max(0, sizes[dim] - side) // 2 for place in range(3)] for dim in dims]
    return [
        here | {dim: slice(start, start + side) for dim, start in zip(dims, corner, strict=True)}
        for corner in itertools.product(*starts)
    ]


def slabs(axes: Axes, sizes: Mapping[Any, int], top: int) -> Iterator[dict[str, slice]]:
    """The whole first time step, level by level, in contiguous slices of about a million values of one role.

    The level `top` comes first: where it is dry, all below is.
    """
    first = _at(axes.time, 0)
    order = sorted(range(sizes[axes.vertical]), key=lambda index: index != top) if axes.vertical else []
    levels = [_at(axes.vertical, index) for index in order] or [{}]
    for level in levels:
        if not axes.horizontal:
            yield first | level
            continue
        dim, *others = axes.horizontal
        rows = max(1, _SLAB // int(np.prod([sizes[other] for other in others], dtype=np.int64)))
        for start in range(0, sizes[dim], rows):
            yield first | level | {dim: slice(start, start + rows)}


def _at(dim: str | None, index: int) -> dict[str, slice]:
    return {dim: slice(index, index + 1)} if dim else {}


def check_masks(missing: Mapping[str, Flags], settings: ReadingSettings) -> tuple[Notice, ...]:
    """Compare where the roles are missing in a sample; the arrays have one value for every cell of it.

    Raises InputError where a role and salinity differ in more than `mask_difference` of the cells in which any role has a
    value; smaller differences give a notice.
    """
    cells = int((~np.logical_and.reduce(list(missing.values()))).sum())
    notices: list[Notice] = []
    for role, mask in missing.items():
        share = int((mask != missing["salinity"]).sum()) / max(cells, 1)
        if share > settings.mask_difference:
            raise InputError(
                f"{role} and salinity are missing in different places: {share:.1%} of the wet cells of a sample differ",
                where=role, mend="check that both are on one grid; to accept it write "
                f"`reading: {{mask_difference: {np.ceil(share * 100) / 100:g}}}` in the recipe",
            )
        if share > 0:
            notices.append(Notice("masks_differ", f"{role} and salinity are missing in different places ({share:.2%} of "
                                  "the wet cells of a sample); such cells get no result"))
    return tuple(notices)


def check_depths(lost: int, wet: int, settings: ReadingSettings) -> tuple[Notice, ...]:
    """Compare how many cells of a sample have salinity and no depth, with all that have salinity; as `check_masks`."""
    share = lost / max(wet, 1)
    if share > settings.mask_difference:
        raise InputError(
            f"the depth is missing in {share:.1%} of the wet cells of a sample", where="depth",
            mend="check the masks of the vertical coordinate and its formula terms; to accept it write "
            f"`reading: {{mask_difference: {np.ceil(share * 100) / 100:g}}}` in the recipe",
        )
    if not lost:
        return ()
    return (Notice("depths_missing", f"the depth is missing in {share:.2%} of the wet cells of a sample; such cells get no "
                   "result"),)


def check_values(
    medians: Mapping[str, float], shallowest: float, amounts: Mapping[str, AmountReading], settings: ReadingSettings
) -> None:
    """Compare the medians of a clothed sample with sea water; InputError with the likely cause if they are far off.

    `medians` by role in canonical units; `shallowest` is the least pressure of the sample (dbar).
    """
    _check_temperature(medians["temperature"])
    if settings.unusual_values == "accept":
        return
    _check_salinity(medians["salinity"])
    for role in ("dic", "alkalinity"):
        if not _plausible(medians[role]):
            raise _unlike_sea_water(role, medians[role], amounts[role])
    for role in NUTRIENTS:
        if medians.get(role, 0.0) > FIELDS[role].sane_range[1]:
            raise InputError(f"the median {role} of a sample is {medians[role]:.4g} umol/kg, more than sea water holds",
                             where=role, mend=f"write `reading: {{units: {{{role}: ...}}}}` in the recipe, {_ACCEPT}")
    ratio = medians["dic"] / medians["alkalinity"]
    if ratio > MOST_DIC_PER_ALKALINITY and shallowest <= _NEAR_SURFACE:
        raise InputError(
            f"DIC and alkalinity look swapped: their median ratio near the surface is {ratio:.3f}", where="dic, alkalinity",
            mend="exchange the two variables: write `inputs: {dic: NOW_ALKALINITY, alkalinity: NOW_DIC}` in the recipe, "
            f"with their names, {_ACCEPT}",
        )


def _check_temperature(median: float) -> None:
    if median > 100:
        raise InputError(f"the median temperature of a sample is {median:.4g} degC; the numbers look like kelvin",
                         where="temperature", mend="write `reading: {units: {temperature: K}}` in the recipe")
    if median < -100:
        raise InputError(f"the median temperature of a sample is {median:.4g} degC; the numbers look like degC, not kelvin",
                         where="temperature", mend="write `reading: {units: {temperature: degC}}` in the recipe")


def _check_salinity(median: float) -> None:
    low, high = SALINITY_RANGE
    if not low <= median <= high:
        fraction = 0.002 <= median <= 0.045
        likely = "; the numbers look like kg of salt per kg of water" if fraction else ""
        units_text = "kg kg-1" if fraction else "..."
        mend = f"write `reading: {{units: {{salinity: {units_text}}}}}` in the recipe, {_ACCEPT}"
        raise InputError(f"the median salinity of a sample is {median:.4g}, not that of sea water{likely}",
                         where="salinity", mend=mend)


def _unlike_sea_water(role: str, median: float, reading: AmountReading) -> InputError:
    """The refusal of a carbon median (umol/kg), with every unit that would make it sea water."""
    number = median / reading.to_micromoles.scale * (USUAL_DENSITY if reading.per_volume else 1.0)
    likely: dict[str, str] = {}
    for text in _AMOUNTS:
        if _plausible(number * _micromoles(text)):
            likely[text] = text
    mass, substance, molar_mass = _MASSES[role]
    if _plausible(number * _micromoles(mass, molar_mass)):
        likely[f"{mass} of {substance}"] = f"{1 / molar_mass:.6g} mol m-3"
    what = f"the median {role} of a sample is {median:.4g} umol/kg, far from sea water"
    if likely:
        lines = " or ".join(f"`reading: {{units: {{{role}: {text}}}}}`" for text in likely.values())
        choice = ", whichever is true (by volume and by mass differ by 2.5 %)," if len(likely) > 1 else ""
        return InputError(f"{what}; the numbers (about {number:.4g}) look like {' or '.join(likely)}", where=role,
                          mend=f"write {lines} in the recipe{choice or ','} {_ACCEPT}")
    return InputError(f"{what}, and no unit of the trade would bring it there", where=role,
                      mend=f"check which variable is read as {role}, {_ACCEPT}")


def _plausible(carbon: float) -> bool:
    return CARBON_RANGE[0] <= carbon <= CARBON_RANGE[1]


def _micromoles(text: str, molar_mass: float | None = None) -> float:
    """How many umol/kg one of these units is, at the usual density."""
    if units.read(text).kind == "amount per mass":
        return units.conversion(text, "umol kg-1").scale
    return units.conversion(text, "umol m-3", molar_mass=molar_mass).scale / USUAL_DENSITY
