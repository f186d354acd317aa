"""Choosing the level a figure shows, from the vertical coordinate of a dataset."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.errors import InputError

_METRES = {"m": 1.0, "meter": 1.0, "meters": 1.0, "metre": 1.0, "metres": 1.0, "cm": 0.01, "km": 1000.0}
PRESSURE = "sea_pressure"
"""The field (dbar) that tells the depth of every cell where levels follow the sea floor."""

_DECIBARS = {"dbar": 1.0, "decibar": 1.0, "decibars": 1.0, "pa": 1e-4, "hpa": 1e-2, "bar": 10.0}


@dataclass(frozen=True)
class Level:
    """One level: its index (None: the data have no vertical dimension), its depth below the surface, "m" or "dbar",
    and the indices of the levels below it.

    within : the variable that tells the depth of every cell, where the level differs from column to column.
    """

    index: int | None = None
    depth: float | None = None
    unit: str = "m"
    below: tuple[int, ...] = ()
    within: str | None = None
    top: bool = False

    @property
    def label(self) -> str:
        """Words for a reader: "5 m depth"; empty where nothing is known of the depth."""
        if self.top:
            return "top level"
        if self.depth is None:
            return ""
        near = "level nearest to " if self.within else ""
        return near + (f"{_rounded(self.depth):,.6g} m depth" if self.unit == "m" else f"{_rounded(self.depth):,.6g} dbar")

    @property
    def slug(self) -> str:
        """The same for a file name."""
        return "top" if self.top else "" if self.depth is None else f"{_rounded(self.depth):.6g}{self.unit}"


def _rounded(depth: float) -> float:
    """To four digits: 4.99994 m, as single precision has it, is 5 m to a reader."""
    return float(f"{depth:.4g}")


def choose_level(header: xr.Dataset, axes: Axes, wanted: float, fields: Collection[str] = ()) -> Level:
    """The level nearest to `wanted` (m below the surface; compared with dbar one to one on a pressure axis).

    Where levels have no one depth (they follow the sea floor, or the depth is a field) the surface is the top level; any
    other depth is sought in each column, by the coordinate if it is itself a depth, else by the field `sea_pressure`.

    fields : what the result holds, or will hold, besides `header`.

    Raises
    ------
    InputError : the depth lies below the grid, or the levels have no depth of their own.
    """
    name = axes.vertical_coordinate
    if name is None or header[name].ndim == 0:
        if axes.vertical is not None:
            raise _depthless(axes.vertical)
        depth, unit = depths_of(header[name]) if name else (None, "m")
        return Level(None, None if depth is None else float(depth), unit)
    if axes.vertical is not None and (header[name].ndim > 1 or _follows_the_floor(header[name])):
        return _in_each_column(header, name, axes.vertical, wanted, fields)
    depths, unit = depths_of(header[name])
    deepest = _deepest(depths)
    if not 0 <= wanted <= deepest:
        shown = ", ".join(f"{depth:.6g}" for depth in depths[:40]) + (" ..." if depths.size > 40 else "")
        raise InputError(
            f"a map at {wanted:g} m: the grid ends at {deepest:.6g} {unit}", where=f"figures: depth, coordinate '{name}'",
            mend=f"write a depth near one of these levels in the recipe ({unit}): {shown}",
        )
    index = int(np.argmin(np.abs(depths - wanted)))
    below = tuple(int(i) for i in np.flatnonzero(depths > depths[index]))
    return Level(index, float(depths[index]), unit, below)


def _follows_the_floor(coordinate: xr.DataArray) -> bool:
    attrs = coordinate.attrs
    return "formula_terms" in attrs or str(attrs.get("standard_name", "")).startswith("ocean_")


def _in_each_column(header: xr.Dataset, name: str, vertical: str, wanted: float, fields: Collection[str]) -> Level:
    coordinate = header[name]
    is_depth = coordinate.ndim > 1 and _unit(coordinate) in (*_METRES, *_DECIBARS)
    if wanted == 0:
        order = np.argsort(_downward(coordinate, vertical))
        return Level(int(order[0]), None, below=tuple(int(index) for index in order[1:]), top=True)
    if is_depth or PRESSURE in fields:
        return Level(None, wanted, within=name if is_depth else PRESSURE)
    raise InputError(
        f"a map at {wanted:g} m: the levels of '{name}' follow the sea floor and have no one depth",
        where=f"figures: depth, coordinate '{name}'",
        mend=f"add `{PRESSURE}` to `chemistry: {{fields: [...]}}` in the recipe, so that each column tells its depths, or "
        "leave `depth` out for a map of the top level",
    )


def _downward(coordinate: xr.DataArray, vertical: str) -> npt.NDArray[np.float64]:
    """Numbers that grow downward, one a level; CF counts its parametric coordinates of the ocean upward."""
    rest = {dim: 0 for dim in coordinate.dims if dim not in (vertical, *coordinate.dims[-2:])}
    values = coordinate.isel(rest)
    means: npt.NDArray[np.float64] = values.mean([dim for dim in values.dims if dim != vertical]).values.astype(np.float64)
    positive = str(coordinate.attrs.get("positive", "")).lower()
    upward = positive == "up" or (positive != "down" and (_follows_the_floor(coordinate) or bool(np.all(means <= 0))))
    return -means if upward else means


def _unit(coordinate: xr.DataArray) -> str:
    return str(coordinate.attrs.get("units", "m")).strip().lower()


def depths_of(coordinate: xr.DataArray) -> tuple[npt.NDArray[np.float64], str]:
    """Depths below the surface, positive down, and their unit, "m" or "dbar"."""
    units = _unit(coordinate)
    values: npt.NDArray[np.float64] = np.asarray(coordinate.values, dtype=np.float64)
    if units in _DECIBARS:
        return values * _DECIBARS[units], "dbar"
    if units not in _METRES:
        raise _depthless(str(coordinate.name))
    values = values * _METRES[units]
    positive = str(coordinate.attrs.get("positive", "")).lower()
    upward = positive == "up" if positive in ("up", "down") else bool(np.all(values <= 0))
    return (0.0 - values if upward else values), "m"


def _deepest(depths: npt.NDArray[np.float64]) -> float:
    """The lower edge of the deepest level, as far below its centre as half the step above it."""
    ordered = np.sort(depths)
    step: Any = ordered[-1] - ordered[-2] if ordered.size > 1 else 2 * abs(ordered[-1])
    return float(ordered[-1] + step / 2)


def _depthless(name: str) -> InputError:
    return InputError(
        "a map needs levels of one depth each (metres or pressure), which this vertical axis does not give",
        where=f"figures: depth, vertical axis '{name}'", mend="leave this map out of `figures` in the recipe",
    )
