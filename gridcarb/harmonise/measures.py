"""How large a cell is: horizontal area from a variable of the files, from corners on the sphere, or not known.

On a grid with two-dimensional coordinates an area from the cosine of the latitude would be wrong, and corners guessed from
centres are wrong at folds and poles: without areas or bounds such a grid has no areas and nothing is integrated.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb import units
from gridcarb.axes import Axes, edges_between, grid_kind, on_one_turn
from gridcarb.errors import UnitsError
from gridcarb.harmonise import sphere
from gridcarb.harmonise.corners import bounds_of, corner_names, corners, degrees
from gridcarb.harmonise.decisions import Understanding
from gridcarb.harmonise.duplicates import PackedFlags
from gridcarb.harmonise.masks import MaskReading, read_mask, unmask

Numbers = npt.NDArray[np.float64]

_AREAS = frozenset({"areacello", "area_t", "areat", "tarea", "cell_area", "area"})
_FRACTIONS = frozenset({"sftof", "sea_area_fraction"})


@dataclass(frozen=True)
class MeasureVariable:
    """A variable of the files that measures cells, and the factor to m2 or to 1."""

    name: str
    factor: float
    mask: MaskReading


@dataclass(frozen=True, eq=False)
class MeasuresReading:
    """How the horizontal area of a cell is found.

    kind : `given` by `area`; `boxes` of `heights` (difference of sines) times `widths` (radians); `polygons` of `corners`;
        `unknown`.
    horizontal : dims of an area.
    fraction : the sea-covered part of a cell, where the files tell it.
    excluded : cells that repeat others; they have no area.
    time : dimension of `time_shares`, the part that each step is of the whole time (adding up to 1); None: one step.
    """

    kind: Literal["given", "boxes", "polygons", "unknown"]
    horizontal: tuple[str, ...] = ()
    radius: float = sphere.RADIUS
    area: MeasureVariable | None = None
    fraction: MeasureVariable | None = None
    heights: Numbers = field(default_factory=lambda: np.empty(0))
    widths: Numbers = field(default_factory=lambda: np.empty(0))
    excluded: PackedFlags | None = None
    time: str | None = None
    time_shares: Numbers = field(default_factory=lambda: np.ones(1))


def find_areas(raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading]) -> tuple[MeasuresReading, str]:
    """How areas can be found, without a look at fields, and because of what; duplicates are not excluded yet."""
    fraction = _variable(raw, axes, "", "sea_area_fraction", _FRACTIONS, "1")
    more: dict[str, Any] = {"horizontal": axes.horizontal, "radius": _radius(raw), "fraction": fraction}
    area = _variable(raw, axes, "area", "cell_area", _AREAS, "m2")
    if area is not None:
        return MeasuresReading("given", area=area, **more), f"given as '{area.name}'"
    if not axes.horizontal or axes.latitude is None or axes.longitude is None:
        return MeasuresReading("unknown"), "a place without a map has no area"
    if grid_kind(raw, axes) == "rectilinear":
        return _boxes(raw, axes, masks, more)
    names = corner_names(raw, axes)
    if names:
        return MeasuresReading("polygons", **more), f"from the corners of every cell ('{names}')"
    return MeasuresReading("unknown"), "the files give neither areas nor corners of the cells"


def cell_areas(raw: xr.Dataset, axes: Axes, reading: MeasuresReading, region: Mapping[str, slice]) -> xr.DataArray:
    """Areas (m2) of the cells of a loaded slice, 0 for cells that do not count.

    region : where the slice lies in the grid; a dimension not named is whole.
    """
    dims = reading.horizontal
    shape = tuple(raw.sizes[dim] for dim in dims)
    if reading.kind == "given" and reading.area is not None:
        found = _numbers(raw, reading.area, dims)
    elif reading.kind == "boxes":
        rows, columns = (region.get(dim, slice(None)) for dim in dims)
        found = reading.radius**2 * (reading.widths[None, columns] * reading.heights[rows, None])
    else:
        lon, lat = corners(raw, axes)
        found = reading.radius**2 * sphere.polygon_angles(lon, lat).reshape(shape)
    if reading.fraction is not None:
        found = found * _numbers(raw, reading.fraction, dims)
    found = np.where(found > 0, found, 0.0)  # neither missing nor negative
    areas = xr.DataArray(found, dims=dims, attrs={"long_name": "horizontal area of the cell", "units": "m2"})
    return areas if reading.excluded is None else areas.where(~reading.excluded.within(region), 0.0)


def weights(
    raw: xr.Dataset, clothed: xr.Dataset, understanding: Understanding, region: Mapping[str, slice]
) -> dict[str, xr.Variable]:
    """What a summary needs to weigh the cells of a loaded slice: raw, and as `clothe` made it.

    region : where the slice lies in the grid; a dimension not named is whole.

    Gives
    -----
    cell_area : m2, 0 where a cell does not count.
    sea : whether a cell is water, by temperature and salinity.
    top_level : index of the uppermost sea cell of every column, -1 where there is none.
    time_share : the part that each step is of the whole time.
    cell_thickness : m, where it is known.

    Nothing where areas are not known.
    """
    axes, reading = understanding.axes, understanding.measures
    if reading is None or reading.kind == "unknown":
        return {}
    # Variables without coordinates: nothing has to be aligned, which would cost more than the arithmetic.
    dims = {dim: raw.sizes[dim] for dim in axes.order if dim in raw.dims}
    told = clothed.variables
    sea = (told["temperature"].notnull() & told["salinity"].notnull()).set_dims(dims)
    found = {
        "cell_area": cell_areas(raw, axes, reading, region).variable, "sea": sea,
        "top_level": _top_level(sea, told["sea_pressure"], axes.vertical),
    }
    if reading.time is not None:
        shares = reading.time_shares[region.get(reading.time, slice(None))]
        found["time_share"] = xr.Variable(reading.time, shares)
    if "cell_thickness" in told:
        found["cell_thickness"] = told["cell_thickness"]
    return found


def _top_level(sea: xr.Variable, pressure: xr.Variable, vertical: str | None) -> xr.Variable:
    if vertical is None or vertical not in sea.dims:
        return sea.astype(np.int64) - 1
    downward = True
    if vertical in pressure.dims and pressure.sizes[vertical] > 1:
        first, last = pressure.isel({vertical: 0}), pressure.isel({vertical: -1})
        downward = bool((last > first).any())
    ordered = sea if downward else sea.isel({vertical: slice(None, None, -1)})
    axis = sea.get_axis_num(vertical)
    first = ordered.values.argmax(axis)
    there = np.take_along_axis(ordered.values, np.expand_dims(first, axis), axis).squeeze(axis)
    top = first if downward else sea.sizes[vertical] - 1 - first
    return xr.Variable([dim for dim in sea.dims if dim != vertical], np.where(there, top, -1))


def _boxes(
    raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], more: Mapping[str, Any]
) -> tuple[MeasuresReading, str]:
    """Rows and columns of a grid with one-dimensional coordinates, by bounds or halfway between centres."""
    found: list[Numbers] = []
    how = []
    for name in (str(axes.latitude), str(axes.longitude)):
        centres = degrees(raw, name, raw[name], masks.get(name))
        edges = bounds_of(raw, name)
        if edges is not None and edges.shape == (centres.size, 2) and _hold(edges, centres):
            how.append(f"bounds of '{name}'")
        elif centres.size > 1:
            edges = edges_between(on_one_turn(centres) if name == axes.longitude else centres)
            how.append(f"'{name}' halfway between its centres")
        else:
            return MeasuresReading("unknown"), f"one '{name}' without bounds has no extent"
        found.append(sphere.heights(edges) if name == axes.latitude else sphere.widths(edges, centres))
    reading = MeasuresReading("boxes", heights=found[0], widths=found[1], **more)
    return reading, "from " + " and ".join(dict.fromkeys(how))


def _hold(edges: Numbers, centres: Numbers) -> bool:
    """Whether every centre lies within its edges, on any turn, and no edge is missing."""
    apart = (edges - centres[:, None] + 180.0) % 360.0 - 180.0
    holds = (apart.min(axis=1) <= 1e-6) & ((apart.max(axis=1) >= -1e-6) | (np.ptp(edges, axis=1) >= 359.0))
    return bool(np.isfinite(edges).all() and holds.all())


def _variable(
    raw: xr.Dataset, axes: Axes, measure: str, standard_name: str, names: frozenset[str], target: str
) -> MeasureVariable | None:
    """The variable of a measure on the horizontal dims: named by cell_measures, by its standard name, by its name."""
    words = str(raw["temperature"].attrs.get("cell_measures", "")).split() if measure else []
    told = [name for noun, name in zip(words[::2], words[1::2], strict=False) if noun == f"{measure}:"]
    fitting = [str(name) for name in raw.coords
               if axes.horizontal and set(raw[name].dims) == set(axes.horizontal) and raw[name].dtype.kind in "fiu"]
    named = [name for name in fitting if raw[name].attrs.get("standard_name") == standard_name]
    known = [name for name in fitting if name.lower() in names and not raw[name].attrs.get("standard_name")]
    for name in (*(name for name in told if name in fitting), *named, *known):
        return MeasureVariable(name, _factor(raw[name].attrs, target, name), read_mask(raw[name], name))
    return None


def _factor(attrs: Mapping[Any, Any], target: str, name: str) -> float:
    """Of numbers in the units of a variable, to m2 or to 1."""
    text = str(attrs.get("units", "")).strip()
    if target == "m2":
        return units.conversion(text, target, where=name).scale
    if text in ("", "1"):
        return 1.0
    unit = units.read(text, where=name)
    if unit.kind != "number":
        raise UnitsError(f"the units '{text}' are not those of a fraction", where=name, mend="write '1' or '%' in the file")
    return float(unit.size)


def _numbers(raw: xr.Dataset, variable: MeasureVariable, dims: tuple[str, ...]) -> Numbers:
    values = raw[variable.name].transpose(*dims).values
    return np.asarray(unmask(np.asarray(values), variable.mask)[0] * variable.factor)


def _radius(raw: xr.Dataset) -> float:
    """That of the grid mapping, where one is told; else that of the Earth."""
    name = str(raw["temperature"].attrs.get("grid_mapping", "")).strip()
    told = raw[name].attrs.get("earth_radius") if name in raw.variables else None
    radius = float(np.asarray(told).ravel()[0]) if told is not None else sphere.RADIUS
    return radius if 6e6 < radius < 6.6e6 else sphere.RADIUS
