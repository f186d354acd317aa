"""The parametric vertical coordinates of the ocean (CF 1.11, section 4.3.3 and appendix D): heights from formula terms.

One pure function a coordinate; every height z is in m above the datum, positive upwards. `read_parametric` finds the
terms once, `below_surface` evaluates them on a block, from the terms of that block alone.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import xarray as xr

from gridcarb import units
from gridcarb.axes import Axes
from gridcarb.errors import InputError, Notice
from gridcarb.harmonise.masks import MaskReading, decoded
from gridcarb.harmonise.settings import ReadingSettings

Numbers = xr.DataArray

_TOLERANCE = 0.1
"""m; terms in single precision leave some room."""


def ocean_sigma(sigma: Numbers, eta: Numbers, depth: Numbers) -> Numbers:
    """z = eta + sigma (depth + eta)."""
    return eta + sigma * (depth + eta)


def ocean_s(s: Numbers, eta: Numbers, depth: Numbers, a: Numbers, b: Numbers, depth_c: Numbers) -> Numbers:
    """z = eta (1 + s) + depth_c s + (depth - depth_c) C.

    C = (1 - b) sinh(a s) / sinh(a) + b (tanh(a (s + 0.5)) / (2 tanh(0.5 a)) - 0.5).
    """
    floorward = np.tanh(a * (s + 0.5)) / (2.0 * np.tanh(0.5 * a)) - 0.5
    curve = (1.0 - b) * np.sinh(a * s) / np.sinh(a) + b * floorward
    return eta * (1.0 + s) + depth_c * s + (depth - depth_c) * curve


def ocean_s_g1(s: Numbers, c: Numbers, eta: Numbers, depth: Numbers, depth_c: Numbers) -> Numbers:
    """z = S + eta (1 + S / depth), S = depth_c s + (depth - depth_c) C."""
    still = depth_c * s + (depth - depth_c) * c
    return still + eta * (1.0 + still / depth)


def ocean_s_g2(s: Numbers, c: Numbers, eta: Numbers, depth: Numbers, depth_c: Numbers) -> Numbers:
    """z = eta + (eta + depth) S, S = (depth_c s + depth C) / (depth_c + depth)."""
    share = (depth_c * s + depth * c) / (depth_c + depth)
    return eta + (eta + depth) * share


def ocean_sigma_z(
    sigma: Numbers, eta: Numbers, depth: Numbers, depth_c: Numbers, zlev: Numbers, lower: Numbers
) -> Numbers:
    """z = eta + sigma (min(depth_c, depth) + eta) in the sigma layers, z = zlev in the `lower` ones."""
    upper = eta + sigma * (np.minimum(depth_c, depth) + eta)
    return upper.where(~lower, zlev)


def ocean_double_sigma(
    sigma: Numbers, depth: Numbers, z1: Numbers, z2: Numbers, a: Numbers, href: Numbers, lower: Numbers
) -> Numbers:
    """z = sigma f in the first k_c levels, z = f + (sigma - 1) (depth - f) in the `lower` ones.

    f = (z1 + z2) / 2 + (z1 - z2) / 2 tanh(2 a / (z1 - z2) (depth - href)). The two parts meet only
    if sigma and the lengths have one sign, so files mean depths by it as often as heights.
    """
    parting = 0.5 * (z1 + z2) + 0.5 * (z1 - z2) * np.tanh(2.0 * a / (z1 - z2) * (depth - href))
    return (sigma * parting).where(~lower, parting + (sigma - 1.0) * (depth - parting))


@dataclass(frozen=True)
class Formula:
    """One coordinate: its function, the terms it takes in m and as pure numbers, and those that are zero if not named."""

    height: Callable[..., Numbers]
    lengths: tuple[str, ...]
    numbers: tuple[str, ...]
    zero: tuple[str, ...] = ()
    count: str = ""
    """The term that counts the upper levels, where there are two kinds."""
    level: str = ""
    """The term that has one value a level and by it tells the two kinds apart."""


FORMULAS = {
    "ocean_sigma_coordinate": Formula(ocean_sigma, ("eta", "depth"), ("sigma",), zero=("eta",)),
    "ocean_s_coordinate": Formula(ocean_s, ("eta", "depth", "depth_c"), ("s", "a", "b"), zero=("eta", "b", "depth_c")),
    "ocean_s_coordinate_g1": Formula(ocean_s_g1, ("eta", "depth", "depth_c"), ("s", "c"), zero=("eta", "depth_c")),
    "ocean_s_coordinate_g2": Formula(ocean_s_g2, ("eta", "depth", "depth_c"), ("s", "c"), zero=("eta", "depth_c")),
    "ocean_sigma_z_coordinate": Formula(ocean_sigma_z, ("eta", "depth", "depth_c", "zlev"), ("sigma",), zero=("eta",),
                                        count="nsigma", level="zlev"),
    "ocean_double_sigma_coordinate": Formula(ocean_double_sigma, ("depth", "z1", "z2", "a", "href"), ("sigma",),
                                             count="k_c", level="sigma"),
}
"""Coordinate by standard_name. Terms are compared in lower case."""


@dataclass(frozen=True)
class Term:
    """A formula term: the variable that has it, and its conversion to m (or none)."""

    name: str
    variable: str
    convert: units.Linear


@dataclass(frozen=True)
class ParametricReading:
    """How heights follow from the terms.

    kind : the standard_name.
    terms : those found; the others of the formula are zero.
    lower : values of the formula's level term in the levels of the second kind, where there are two.
    downward : whether the formula gives depths (some double sigma coordinates).
    """

    kind: str
    terms: tuple[Term, ...]
    lower: tuple[float, ...] = ()
    downward: bool = False


def is_parametric(attrs: Mapping[Any, Any]) -> bool:
    """Whether a vertical coordinate says that it is one of these, or another with formula terms."""
    return "formula_terms" in attrs or str(attrs.get("standard_name", "")) in FORMULAS


def named_terms(text: object) -> dict[str, str]:
    """Term (lower case) -> variable name, of an attribute formula_terms."""
    return {term.lower(): name for term, name in re.findall(r"(\w+)\s*:\s+([^\s:]+)(?=\s|$)", str(text))}


def term_variables(raw: xr.Dataset, coordinate: str | None) -> tuple[str, ...]:
    """The variables of the data a parametric coordinate points at, numbers all of them; none if it is no such."""
    attrs = {} if coordinate is None else raw[coordinate].attrs
    names = named_terms(attrs.get("formula_terms", "")).values() if is_parametric(attrs) else ()
    return tuple(name for name in dict.fromkeys(names) if name in raw.variables)


def read_parametric(
    raw: xr.Dataset, axes: Axes, coordinate: str, masks: Mapping[str, MaskReading], settings: ReadingSettings
) -> tuple[ParametricReading, tuple[Notice, ...]]:
    """Find the terms of the formula; refuse what is missing by its name."""
    where, attrs = f"vertical coordinate '{coordinate}'", raw[coordinate].attrs
    kind = str(attrs.get("standard_name", ""))
    if kind not in FORMULAS:
        raise InputError(f"it has formula_terms, and its standard_name '{kind}' is no parametric coordinate of the ocean",
                         where=where, mend=f"give it one of the standard names {', '.join(FORMULAS)} in the file")
    formula, named = FORMULAS[kind], named_terms(attrs.get("formula_terms", ""))
    wanted = (*formula.numbers, *formula.lengths)
    absent = [term for term in wanted if term not in named and term not in formula.zero]
    if absent:
        raise InputError(f"its formula_terms do not name the term '{absent[0]}' of {kind}", where=where,
                         mend=f"give it the attribute formula_terms with all of {', '.join(wanted)}, and the files the "
                         "variables these name")
    terms = tuple(_term(raw, axes, term, named[term], formula, settings, where) for term in wanted if term in named)
    left_out = [term for term in wanted if term not in named]
    notices = () if not left_out else (Notice(
        "formula_term_zero", f"the formula_terms of {where} do not name {', '.join(left_out)}: taken as zero, as the CF "
        "conventions have it"),)
    lower = _lower_levels(raw, axes, formula, named, masks, where) if formula.level else ()
    return ParametricReading(kind, terms, lower), notices


def _term(
    raw: xr.Dataset, axes: Axes, term: str, name: str, formula: Formula, settings: ReadingSettings, where: str
) -> Term:
    _refuse_absent(raw, term, name, where)
    variable = raw[name]
    strange = [str(dim) for dim in variable.dims if dim not in axes.order]
    if strange:
        raise InputError(f"its formula term '{term}' ('{name}') has a dimension '{strange[0]}' that the data have not",
                         where=where, mend=f"give '{name}' on the grid of the data")
    if term in formula.numbers:
        return Term(term, name, units.Linear(1.0))
    said = variable.attrs.get("units") or settings.units.get("depth")
    convert = units.conversion(said, "m", where=f"formula term '{term}' ('{name}')",
                               mend="write `reading: {units: {depth: m}}` in the recipe")
    turned = term == "zlev" and str(variable.attrs.get("positive", "")).lower() == "down"
    return Term(term, name, units.Linear(-convert.scale, -convert.offset) if turned else convert)


def _refuse_absent(raw: xr.Dataset, term: str, name: str, where: str) -> None:
    if name not in raw.variables:
        raise InputError(f"its formula term '{term}' is the variable '{name}', which the files do not have", where=where,
                         mend=f"add '{name}' to the files, on the grid of the data")


def _lower_levels(
    raw: xr.Dataset, axes: Axes, formula: Formula, named: Mapping[str, str], masks: Mapping[str, MaskReading], where: str
) -> tuple[float, ...]:
    """Which levels are of the second kind, as values of the level term, so that they are known in any slice.

    Heights and sigma layers exclude each other where either is missing (CF 1.9 and later); else the levels are counted,
    from 1, by the term for it.
    """
    levels = decoded(raw, named[formula.level], masks)
    if levels.dims != (axes.vertical,):
        raise InputError(f"its formula term '{formula.level}' has not one value a level", where=where,
                         mend=f"give '{named[formula.level]}' the vertical dimension alone")
    sigma = decoded(raw, named["sigma"], masks)
    if formula.level != "sigma" and bool(sigma.isnull().any() | levels.isnull().any()):
        return tuple(levels.values[np.isfinite(levels.values)].tolist())
    if formula.count not in named:
        raise InputError(f"its formula_terms do not name the term '{formula.count}', the number of upper levels",
                         where=where, mend="name it in formula_terms, and give the files that variable")
    _refuse_absent(raw, formula.count, named[formula.count], where)
    count = int(decoded(raw, named[formula.count], masks).values)
    upper, lower = set(levels.values[:count].tolist()), set(levels.values[count:].tolist())
    if upper & lower:
        raise InputError(f"its formula term '{formula.level}' has the same value in upper and lower levels", where=where,
                         mend="correct the values of its formula terms in the file")
    return tuple(sorted(lower))


def term_of(raw: xr.Dataset, masks: Mapping[str, MaskReading], reading: ParametricReading, name: str) -> Numbers:
    """A term of a loaded block in m (or as a number); 0 if it was left out."""
    for term in reading.terms:
        if term.name == name:
            found: Numbers = term.convert(decoded(raw, term.variable, masks))
            return found
    return xr.DataArray(0.0)


def height(
    raw: xr.Dataset, masks: Mapping[str, MaskReading], reading: ParametricReading,
    instead: Mapping[str, Numbers] | None = None,
) -> tuple[Numbers, Numbers]:
    """Heights as the formula gives them, and the height of the sea surface (0 where there is no such term), in m.

    raw : a loaded block. instead : numbers to take for some terms, such as the edges of the levels. NaN where a term is
    missing or the formula has no value.
    """
    formula = FORMULAS[reading.kind]
    wanted = (*formula.numbers, *formula.lengths)
    values = {name: term_of(raw, masks, reading, name) for name in wanted} | dict(instead or {})
    if formula.level:
        by_level = next(term for term in reading.terms if term.name == formula.level)
        values["lower"] = decoded(raw, by_level.variable, masks).isin(reading.lower)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        z = formula.height(**values)
    return z.where(np.isfinite(z)), values.get("eta", xr.DataArray(0.0))


def below_surface(
    raw: xr.Dataset, masks: Mapping[str, MaskReading], reading: ParametricReading,
    instead: Mapping[str, Numbers] | None = None,
) -> Numbers:
    """Depth below the sea surface of that moment, eta - z, in m; less than zero where a fixed level has fallen dry.

    raw, instead : as in `height`.
    """
    z, eta = height(raw, masks, reading, instead)
    return z if reading.downward else eta - z


def settle_sense(
    pieces: Sequence[xr.Dataset], masks: Mapping[str, MaskReading], reading: ParametricReading, attrs: Mapping[Any, Any],
    where: str,
) -> tuple[ParametricReading, tuple[Notice, ...]]:
    """Hold the formula against the water of loaded samples: refuse cells above the sea or below its floor.

    A double sigma coordinate whose formula gives positive numbers is taken to tell depths.
    """
    notices: tuple[Notice, ...] = ()
    if reading.kind == "ocean_double_sigma_coordinate":
        z = np.concatenate([height(piece, masks, reading)[0].values.ravel() for piece in pieces])
        if np.nanmin(z) >= 0.0 and np.nanmax(z) > 0.0:
            reading = replace(reading, downward=True)
            if str(attrs.get("positive", "")).lower() != "down":
                notices = (Notice("double_sigma_depths", f"the formula of {where} gives positive numbers only: they are "
                                  "taken as depths, not heights"),)
    found = [_misplaced(piece, masks, reading) for piece in pieces]
    if not any(wet for wet, _, _ in found):
        raise InputError("its formula term 'depth' is positive nowhere in a sample", where=where,
                         mend="give the depth of the sea floor as a positive distance in the file")
    above, below = (max(distances) for distances in list(zip(*found, strict=True))[1:])
    if max(above, below) > _TOLERANCE:
        side = "above the sea surface" if above > _TOLERANCE else "below the sea floor"
        raise InputError(f"its formula puts cells {max(above, below):g} m {side}", where=where,
                         mend="correct the values, signs or units of its formula terms in the file")
    return reading, notices


def _misplaced(
    raw: xr.Dataset, masks: Mapping[str, MaskReading], reading: ParametricReading
) -> tuple[bool, float, float]:
    """Whether there is any water, and how far (m) a cell of it lies above the surface or the datum, and below the floor.

    Fixed heights may lie below the floor: there is nothing in such cells.
    """
    z, eta = height(raw, masks, reading)
    z = -z if reading.downward else z
    floor = term_of(raw, masks, reading, "depth")
    wet = floor + eta > 0.0
    above = (z - eta.clip(min=0.0)).where(wet)
    below = (-z - floor).where(wet & (reading.kind != "ocean_sigma_z_coordinate"))
    return bool(wet.any()), _most(above), _most(below)


def _most(distances: Numbers) -> float:
    return float(np.fmax.reduce(distances.values, axis=None, initial=0.0))
