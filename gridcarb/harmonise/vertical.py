"""How the vertical coordinate becomes depth below the surface or sea pressure; refused where the sense is unsure."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import xarray as xr

from gridcarb import units
from gridcarb.axes import Axes
from gridcarb.errors import InputError, Notice
from gridcarb.harmonise import parametric
from gridcarb.harmonise.decisions import Decided, Decision
from gridcarb.harmonise.masks import MaskReading, decoded
from gridcarb.harmonise.parametric import ParametricReading
from gridcarb.harmonise.plausibility import patches
from gridcarb.harmonise.settings import ReadingSettings

DEEPEST = 12000.0
"""No sea is deeper, in m or in dbar."""

_SURFACE_MEND = "write `reading: {depth: surface}` in the recipe if the data lie at the sea surface"
_UNITS_MEND = "write `reading: {units: {depth: m}}` in the recipe"
_AS_THEY_ARE = units.Linear(1.0)
_UPWARD = frozenset({"height", "altitude", "height_above_mean_sea_level", "height_above_geopotential_datum"})
_PRESSURES = frozenset({"sea_water_pressure", "sea_water_pressure_due_to_sea_water"})
_BY_LEVELS = "sea pressure from depth and latitude (TEOS-10)"
_STRIPE = 20_000


@dataclass(frozen=True)
class VerticalReading:
    """How the vertical coordinate becomes pressure.

    kind : what the numbers are; `surface` has no numbers and lies at 0 dbar.
    to_metres_or_dbar : conversion of the numbers.
    downward : whether they grow with depth.
    deepest, shallowest : in m or dbar, of the whole grid where the coordinate has one dimension, else of a sample.
    top : index of the shallowest level along the vertical dimension.
    parametric : how depths follow from formula terms, where the coordinate is of that kind.
    """

    kind: Literal["depth", "pressure", "surface"]
    to_metres_or_dbar: units.Linear = _AS_THEY_ARE
    downward: bool = True
    deepest: float = 0.0
    shallowest: float = 0.0
    top: int = 0
    parametric: ParametricReading | None = None


def read_vertical(
    raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], settings: ReadingSettings, standard_names: set[str]
) -> Decided[VerticalReading]:
    """Decide how depth or pressure is found; of a coordinate with several dimensions only a sample is read.

    Raises InputError or UnitsError for a coordinate that is missing, contradicts itself or lies above the sea.
    """
    name = axes.vertical_coordinate
    levels = raw.sizes[axes.vertical] if axes.vertical else 1
    if settings.depth == "surface":
        return _stated_surface(name, levels)
    if name is None:
        return _without_coordinate(axes.vertical, standard_names)
    if parametric.is_parametric(raw[name].attrs):
        return _read_parametric(raw, axes, name, masks, settings)
    return _read_numbers(raw, axes, name, masks, settings)


def down_of(raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], reading: VerticalReading) -> xr.DataArray:
    """Depth below the sea surface (m) or sea pressure (dbar) of a loaded block, in as few dims as it varies over."""
    if reading.parametric is not None:
        return parametric.below_surface(raw, masks, reading.parametric).clip(min=0.0) + 0.0
    if reading.kind == "surface" or axes.vertical_coordinate is None:
        return xr.DataArray(0.0)
    return downward(decoded(raw, axes.vertical_coordinate, masks), reading)


def downward(numbers: xr.DataArray, reading: VerticalReading) -> xr.DataArray:
    """Numbers of the vertical coordinate, or edges of its levels, as depths (m) or pressures (dbar)."""
    converted: xr.DataArray = reading.to_metres_or_dbar(numbers)
    return (converted if reading.downward else -converted) + 0.0  # + 0.0 turns -0.0 into 0.0


def _read_numbers(
    raw: xr.Dataset, axes: Axes, name: str, masks: Mapping[str, MaskReading], settings: ReadingSettings
) -> Decided[VerticalReading]:
    where, attrs = f"vertical coordinate '{name}'", raw[name].attrs
    said = settings.units.get("depth") or attrs.get("units")
    unit = units.read(said, where=where, mend=_UNITS_MEND, expected=("length", "pressure"))
    kind: Literal["depth", "pressure"] = "pressure" if unit.kind == "pressure" else "depth"
    factor = units.conversion(said, "dbar" if kind == "pressure" else "m", where=where)
    pieces = [decoded(piece, name, masks) for piece in _sample(raw, axes, (name,), masks, where)]
    converted = factor(_finite(pieces))
    grows, because = _direction(converted, attrs, where)
    down = converted if grows else -converted
    _check_range(down, kind, said, where)
    reading = VerticalReading(kind, factor, grows, float(down.max()), float(down.min()))
    reading = dataclasses.replace(reading, top=_top([downward(piece, reading) for piece in pieces], axes.vertical))
    how = "sea pressure as given" if kind == "pressure" else _BY_LEVELS
    decision = Decision("pressure", how, f"'{name}' in {said}, {because}")
    return Decided(reading, (decision,), _pressure_notice(kind, str(attrs.get("standard_name", "")), where))


def _read_parametric(
    raw: xr.Dataset, axes: Axes, name: str, masks: Mapping[str, MaskReading], settings: ReadingSettings
) -> Decided[VerticalReading]:
    where = f"vertical coordinate '{name}'"
    formula, notices = parametric.read_parametric(raw, axes, name, masks, settings)
    variables = [term.variable for term in formula.terms]
    pieces = _sample(raw, axes, variables, masks, where)
    formula, sense = parametric.settle_sense(pieces, masks, formula, raw[name].attrs, where)
    below = [parametric.below_surface(piece, masks, formula) for piece in pieces]
    numbers = _finite(below)
    if numbers.max() > DEEPEST:
        raise InputError(f"its formula gives a depth of {numbers.max():g} m, deeper than any sea", where=where,
                         mend="correct the values or units of its formula terms in the file")
    reading = VerticalReading("depth", deepest=float(numbers.max()), shallowest=max(float(numbers.min()), 0.0),
                              top=_top(below, axes.vertical), parametric=formula)
    moving = next((term.variable for term in formula.terms if term.name == "eta"), None)
    surface = "" if moving is None else f", below the sea surface '{moving}', not below the datum"
    names = ", ".join(f"{term.name}: {term.variable}" for term in formula.terms)
    decision = Decision("pressure", _BY_LEVELS, f"'{name}' is {formula.kind} with {names}{surface}")
    return Decided(reading, (decision,), (*notices, *sense))


def _finite(pieces: Iterable[xr.DataArray]) -> np.ndarray[Any, Any]:
    return np.concatenate([piece.values[np.isfinite(piece.values)] for piece in pieces])


def _top(pieces: list[xr.DataArray], vertical: str | None) -> int:
    """The level that is shallowest in the mean of a sample."""
    if vertical not in pieces[0].dims:
        return 0
    means = [piece.mean([dim for dim in piece.dims if dim != vertical]).values for piece in pieces]
    known = np.ma.masked_invalid(means).mean(axis=0)
    return int(known.filled(np.inf).argmin())


def _sample(
    raw: xr.Dataset, axes: Axes, names: Iterable[str], masks: Mapping[str, MaskReading], where: str
) -> list[xr.Dataset]:
    """Loaded patches of the first time step in which all of the variables have values somewhere; all levels of each.

    The whole of what has no horizontal dimension is read.
    """
    chosen = xr.Dataset({name: raw[name].variable for name in names})

    def load(window: Mapping[str, slice]) -> xr.Dataset:
        return chosen.isel({dim: part for dim, part in window.items() if dim in chosen.dims}).load()

    def filled(piece: xr.Dataset) -> bool:
        return all(bool(decoded(piece, name, masks).notnull().any()) for name in names)

    spread = [load(window) for window in _columns(axes, raw.sizes)]
    if any(filled(piece) for piece in spread):
        return spread
    for window in _stripes(axes, raw.sizes):
        piece = load(window)
        if filled(piece):
            return [piece]
    raise InputError("all its values are missing", where=where, mend="give the files a vertical coordinate with values")


def _columns(axes: Axes, sizes: Mapping[Any, int]) -> list[dict[str, slice]]:
    windows = patches(axes, sizes, 0)
    return [{dim: part for dim, part in window.items() if dim != axes.vertical} for window in windows]


def _stripes(axes: Axes, sizes: Mapping[Any, int]) -> Iterator[dict[str, slice]]:
    """The whole map of the first time step in contiguous slices."""
    if not axes.horizontal:
        return
    dim, *others = axes.horizontal
    rows = max(1, _STRIPE // int(np.prod([sizes[other] for other in others], dtype=np.int64)))
    first = {axes.time: slice(0, 1)} if axes.time else {}
    for start in range(0, sizes[dim], rows):
        yield first | {dim: slice(start, start + rows)}


def _pressure_notice(kind: str, standard_name: str, where: str) -> tuple[Notice, ...]:
    if kind == "pressure" and standard_name not in _PRESSURES - {"sea_water_pressure"}:
        return (Notice("sea_pressure", f"{where} is taken as sea pressure (0 at the surface), not absolute pressure"),)
    return ()


def _stated_surface(name: str | None, levels: int) -> Decided[VerticalReading]:
    if levels > 1:
        raise InputError(f"the recipe says the data lie at the surface, and they have {levels} levels", where="depth",
                         mend="take `depth: surface` out of the section `reading` of the recipe")
    decision = Decision("pressure", "0 dbar, sea surface", "stated in the recipe")
    notice = Notice("depth_overruled", f"the vertical coordinate '{name}' is passed over; the recipe says the data lie at "
                    "the surface", "reading: {depth: surface}")
    return Decided(VerticalReading("surface"), (decision,), (notice,) if name else ())


def _without_coordinate(dim: str | None, standard_names: set[str]) -> Decided[VerticalReading]:
    if dim is not None:
        raise InputError(f"the vertical dimension '{dim}' has no coordinate, so the depth of its levels is not known",
                         where=f"dimension '{dim}'", mend="give the files a coordinate of depth or pressure with units; "
                         f"{_SURFACE_MEND} and there is one level")
    surface = sorted(name for name in standard_names if name.startswith(("sea_surface_", "surface_")))
    if surface:
        return Decided(VerticalReading("surface"),
                       (Decision("pressure", "0 dbar, sea surface", f"standard_name {surface[0]}"),))
    decision = Decision("pressure", "0 dbar, sea surface", "the data have no vertical dimension or coordinate")
    notice = Notice("surface_assumed", "the data have no vertical dimension or coordinate: they are taken to lie at the "
                    "sea surface, 0 dbar", "reading: {depth: surface}")
    return Decided(VerticalReading("surface"), (decision,), (notice,))


def _direction(converted: np.ndarray[Any, Any], attrs: Mapping[Any, Any], where: str) -> tuple[bool, str]:
    """Whether the numbers grow downward, and why; refuse numbers that contradict what is said of them."""
    positive = str(attrs.get("positive", "")).lower()
    standard_name = str(attrs.get("standard_name", ""))
    below, above = bool(converted.min() < 0), bool(converted.max() > 0)
    if positive in ("down", "up"):
        downward, because = positive == "down", f"positive {positive}"
    elif standard_name in _UPWARD or standard_name == "depth" or standard_name in _PRESSURES:
        downward, because = standard_name not in _UPWARD, f"standard_name {standard_name}"
    elif below and above:
        raise InputError("its values lie on both sides of zero, and it does not say which way is down", where=where,
                         mend="give it the attribute positive = \"down\" (depths) or \"up\" (heights) in the file")
    else:
        downward, because = not below, "all its values are " + ("negative" if below else "positive")
    if (below and not above) if downward else (above and not below):
        way = "negative" if downward else "positive"
        raise InputError(f"{because} contradicts its values, which are all {way}: up and down cannot be told apart safely",
                         where=where, mend=f"set the attribute positive = \"{'up' if downward else 'down'}\" in the file, "
                         "or turn the sign of the values")
    return downward, because


def _check_range(down: np.ndarray[Any, Any], kind: str, said: object, where: str) -> None:
    if down.min() < -1e-6:
        raise InputError(f"its shallowest value lies {-down.min():g} above the sea surface", where=where,
                         mend="correct the sign of its values or its attribute positive in the file")
    if down.max() > DEEPEST:
        likely = "cm" if kind == "depth" else "Pa"
        raise InputError(f"its deepest value is {down.max():g} {'m' if kind == 'depth' else 'dbar'} if it is in '{said}', "
                         f"deeper than any sea; likely are {likely}", where=where,
                         mend=f"write `reading: {{units: {{depth: {likely}}}}}` in the recipe")
