"""How thick a cell is: by the files, else from the edges of its level and the sea floor. For sums and means over volumes.

A cell that the sea floor cuts is as thick as the water in it; its pressure is that of the nominal depth of its level,
which is where the coordinate says its numbers lie.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import gsw
import numpy as np
import xarray as xr

from gridcarb import units
from gridcarb.axes import Axes
from gridcarb.errors import Notice
from gridcarb.harmonise import parametric
from gridcarb.harmonise.decisions import Decided, Decision, Understanding
from gridcarb.harmonise.depth import Place, locate
from gridcarb.harmonise.masks import MaskReading, decoded, read_mask
from gridcarb.harmonise.parametric import ParametricReading
from gridcarb.harmonise.vertical import VerticalReading, down_of, downward

_THICKNESSES = frozenset({"thkcello", "cell_thickness", "thickness"})
_FLOORS = frozenset({"deptho", "bathymetry", "sea_floor_depth", "bathy"})
_FLOOR_NAMES = frozenset({
    "sea_floor_depth", "sea_floor_depth_below_geoid", "sea_floor_depth_below_mean_sea_level",
    "sea_floor_depth_below_sea_surface", "sea_floor_depth_below_geopotential_datum",
    "sea_floor_depth_below_reference_ellipsoid",
})
_AS_THEY_ARE = units.Linear(1.0)
_MEND = "give the files a variable of standard_name cell_thickness"


@dataclass(frozen=True)
class ThicknessReading:
    """How the thickness of a cell is found.

    kind : `given` by a variable; between `edges` of the levels in the files; `halfway` between the levels.
    levels : number of levels of a whole column.
    variable, to_metres : the variable that gives it, and its conversion.
    edges : for the coordinate, or for each formula term that varies by level, the variable with its edges.
    floor, floor_to_metres : depth of the sea floor that cuts the cells, where it is known.
    masks : mask readings of all these variables.
    """

    kind: Literal["given", "edges", "halfway"]
    levels: int
    variable: str = ""
    to_metres: units.Linear = _AS_THEY_ARE
    edges: tuple[tuple[str, str], ...] = ()
    floor: str = ""
    floor_to_metres: units.Linear = _AS_THEY_ARE
    masks: tuple[tuple[str, MaskReading], ...] = ()


def read_thickness(raw: xr.Dataset, axes: Axes, vertical: VerticalReading) -> Decided[ThicknessReading | None]:
    """Decide how thick cells are, from headers alone; None where it cannot be known, as at the surface.

    Raises UnitsError for a thickness or a sea floor without units of length.
    """
    levels = raw.sizes[axes.vertical] if axes.vertical else 1
    name = _find(raw, axes, frozenset({"cell_thickness"}), _THICKNESSES, {axes.vertical} - {None})
    if name is not None:
        reading = ThicknessReading("given", levels, name, _metres(raw, name), masks=_masks(raw, (name,)))
        nominal = ", the pressure of a cut cell that of its level" if {*raw[name].dims} & {*axes.horizontal} else ""
        return Decided(reading, (Decision("cell thickness", f"as the files give it{nominal}", f"'{name}'"),))
    coordinate = axes.vertical_coordinate
    if vertical.kind == "surface" or coordinate is None:
        return Decided(None)
    edges = _edges(raw, coordinate, vertical.parametric)
    if not edges and levels == 1:
        return Decided(None)
    floor = None
    if vertical.parametric is None:
        floor = _find(raw, axes, _FLOOR_NAMES, _FLOORS, set())
    names = [variable for _, variable in edges] + ([floor] if floor else [])
    reading = ThicknessReading(
        "edges" if edges else "halfway", levels, edges=edges, floor=floor or "",
        floor_to_metres=_metres(raw, floor) if floor else _AS_THEY_ARE, masks=_masks(raw, names),
    )
    return Decided(reading, *_told(reading, coordinate, vertical.parametric))


def thickness(raw: xr.Dataset, understanding: Understanding, place: Place | None = None) -> xr.DataArray | None:
    """Thickness (m) of the cells of a loaded block, in as few dims as it varies over.

    0 for a cell that lies below the sea floor, NaN where it is not known; None if nobody asked for it, it cannot be known,
    or the block lacks some of the levels. place : where the cells lie, if that was found out already.
    """
    reading, axes = understanding.thickness, understanding.axes
    if reading is None or (axes.vertical and raw.sizes[axes.vertical] != reading.levels):
        return None
    masks = {**understanding.masks, **dict(reading.masks)}
    found: xr.DataArray
    if reading.kind == "given":
        found = reading.to_metres(decoded(raw, reading.variable, masks))
    else:
        place = place or locate(raw, axes, understanding.masks, understanding.place)
        found = _between(raw, axes, masks, understanding.place.vertical, reading, place)
    ordered = found.transpose(*(dim for dim in axes.order if dim in found.dims))
    return ordered.assign_attrs(long_name="thickness of the cell", units="m", standard_name="cell_thickness")


def _find(
    raw: xr.Dataset, axes: Axes, standard_names: frozenset[str], names: frozenset[str], needed: set[str | None]
) -> str | None:
    """A coordinate on the grid by its standard name, else by its name if it has none."""
    fitting = [
        str(name) for name in raw.coords
        if needed <= set(raw[name].dims) <= set(axes.order) - ({axes.vertical} - needed) and raw[name].dtype.kind in "fiu"
    ]
    said = {name: str(raw[name].attrs.get("standard_name", "")) for name in fitting}
    named = [name for name in fitting if said[name] in standard_names]
    known = [name for name in fitting if name.lower() in names and not said[name]]
    return next(iter((*named, *known)), None)


def _metres(raw: xr.Dataset, name: str) -> units.Linear:
    said = raw[name].attrs.get("units")
    return units.conversion(said, "m", where=name, mend=f"give '{name}' units of length in the file")


def _masks(raw: xr.Dataset, names: list[str] | tuple[str, ...]) -> tuple[tuple[str, MaskReading], ...]:
    return tuple((name, read_mask(raw[name], name)) for name in dict.fromkeys(names))


def _edges(raw: xr.Dataset, coordinate: str, formula: ParametricReading | None) -> tuple[tuple[str, str], ...]:
    """The variables with two edges a level, for the coordinate or every term that varies by level; () if one is absent."""
    bounds = raw[coordinate].attrs.get("bounds")
    if formula is None:
        return ((coordinate, str(bounds)),) if _two_a_level(raw, coordinate, bounds) else ()
    said = raw[bounds].attrs.get("formula_terms", "") if bounds in raw.variables else ""
    named = parametric.named_terms(said)
    found: list[tuple[str, str]] = []
    for term in formula.terms:
        variable = term.variable
        if not set(raw[coordinate].dims) & set(raw[variable].dims):
            continue
        edges = named.get(term.name, raw[variable].attrs.get("bounds"))
        if not _two_a_level(raw, variable, edges):
            return ()
        found.append((term.name, str(edges)))
    return tuple(found)


def _two_a_level(raw: xr.Dataset, name: str, bounds: object) -> bool:
    """Whether `bounds` has the dims of a variable and one more, of two."""
    if not isinstance(bounds, str) or bounds not in raw.variables:
        return False
    more = [dim for dim in raw[bounds].dims if dim not in raw[name].dims]
    return len(more) == 1 and raw.sizes[more[0]] == 2 and raw[bounds].ndim == raw[name].ndim + 1


def _told(
    reading: ThicknessReading, coordinate: str, formula: ParametricReading | None
) -> tuple[tuple[Decision, ...], tuple[Notice, ...]]:
    """What is said of a thickness that no variable gives."""
    between = f"the edges of the levels ('{reading.edges[0][1]}')" if reading.edges else \
        f"edges halfway between the levels of '{coordinate}'"
    floor = f", cut by the sea floor ('{reading.floor}')" if reading.floor else ""
    floor = ", cut by the sea floor (formula term depth)" if formula else floor
    decision = Decision("cell thickness", f"from {between}{floor}", "the files give none")
    if reading.edges and formula:
        return (decision,), ()
    doubt = "" if floor else "; a cell that the sea floor cuts counts as whole"
    code = "thickness_from_edges" if reading.edges else "thickness_from_levels"
    return (decision,), (Notice(code, f"the thickness of cells is taken from {between}{floor}{doubt}; {_MEND} to have it "
                                "exactly"),)


def _between(
    raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], vertical: VerticalReading, reading: ThicknessReading,
    place: Place,
) -> xr.DataArray:
    """Lower less upper edge of the water in every cell."""
    floor = None
    if vertical.parametric is not None:
        floor = _water_depth(raw, masks, vertical.parametric)
    elif reading.floor:
        floor = reading.floor_to_metres(decoded(raw, reading.floor, masks))
    if reading.edges:
        upper, lower = _stated_edges(raw, axes, masks, vertical, reading, place)
    else:
        down = _metres_down(down_of(raw, axes, masks, vertical), vertical, place)
        follows = vertical.parametric is not None and vertical.parametric.kind != "ocean_sigma_z_coordinate"
        upper, lower = _halfway(down, axes.vertical, vertical.top == 0, floor if follows else None)
    if floor is not None:
        lower = xr.apply_ufunc(np.fmin, lower, floor)
    return (lower - upper).clip(min=0.0)


def _water_depth(raw: xr.Dataset, masks: Mapping[str, MaskReading], formula: ParametricReading) -> xr.DataArray:
    """From the sea surface of the moment to the floor (m)."""
    return parametric.term_of(raw, masks, formula, "depth") + parametric.term_of(raw, masks, formula, "eta")


def _stated_edges(
    raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], vertical: VerticalReading, reading: ThicknessReading,
    place: Place,
) -> tuple[xr.DataArray, xr.DataArray]:
    """Depths of the upper and the lower edge of every level (m)."""
    variables = {term: decoded(raw, name, masks) for term, name in reading.edges}
    (side,) = {str(dim) for edge in variables.values() for dim in edge.dims if dim not in axes.order}
    if vertical.parametric is None:
        (numbers,) = variables.values()
        down = _metres_down(downward(numbers, vertical), vertical, place)
    else:
        convert = {term.name: term.convert for term in vertical.parametric.terms}
        instead = {term: convert[term](edge) for term, edge in variables.items()}
        down = parametric.below_surface(raw, masks, vertical.parametric, instead)
    return down.min(side), down.max(side)


def _metres_down(down: xr.DataArray, vertical: VerticalReading, place: Place) -> xr.DataArray:
    """Depths in m of depths, or of sea pressures at their latitude."""
    if vertical.kind != "pressure":
        return down
    latitude = xr.DataArray(45.0) if place.latitude is None else place.latitude  # within 0.3 % anywhere
    height: xr.DataArray = xr.apply_ufunc(gsw.z_from_p, down, latitude)
    return -height


def _halfway(
    down: xr.DataArray, vertical: str | None, from_top: bool, floor: xr.DataArray | None
) -> tuple[xr.DataArray, xr.DataArray]:
    """Edges halfway between the levels of whole columns, the first at the surface.

    The last is the floor where that is told (levels that follow it), else as far below its level as the edge above.
    """
    assert vertical is not None
    order = slice(None) if from_top else slice(None, None, -1)
    ordered = down.isel({vertical: order})
    middles = 0.5 * (ordered.isel({vertical: slice(1, None)}) + ordered.isel({vertical: slice(None, -1)}))
    first, last = middles.isel({vertical: slice(0, 1)}), middles.isel({vertical: slice(-1, None)})
    end = 2.0 * ordered.isel({vertical: slice(-1, None)}) - last
    if floor is not None:
        end = 0.0 * end + floor
    upper = xr.concat([0.0 * first, middles], vertical)
    lower = xr.concat([middles, end], vertical)
    return upper.isel({vertical: order}), lower.isel({vertical: order})
