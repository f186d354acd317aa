"""Choosing the level a figure shows, from the vertical coordinate of a dataset."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.errors import InputError

_METRES = {"m": 1.0, "meter": 1.0, "meters": 1.0, "metre": 1.0, "metres": 1.0, "cm": 0.01, "km": 1000.0}
_DECIBARS = {"dbar": 1.0, "decibar": 1.0, "decibars": 1.0, "pa": 1e-4, "hpa": 1e-2, "bar": 10.0}


@dataclass(frozen=True)
class Level:
    """One level: its index (None: the data have no vertical dimension), its depth below the surface, "m" or "dbar",
    and the indices of the levels below it."""

    index: int | None = None
    depth: float | None = None
    unit: str = "m"
    below: tuple[int, ...] = ()

    @property
    def label(self) -> str:
        """Words for a reader: "5 m depth"; empty where nothing is known of the depth."""
        if self.depth is None:
            return ""
        return f"{self.depth:,.6g} m depth" if self.unit == "m" else f"{self.depth:,.6g} dbar"

    @property
    def slug(self) -> str:
        """The same for a file name."""
        return "" if self.depth is None else f"{self.depth:.6g}{self.unit}"


def choose_level(header: xr.Dataset, axes: Axes, wanted: float) -> Level:
    """The level nearest to `wanted` (m below the surface; compared with dbar one to one on a pressure axis).

    Raises
    ------
    InputError : the depth lies below the grid, or the levels have no depth of their own.
    """
    name = axes.vertical_coordinate
    if name is None or header[name].ndim == 0:
        if axes.vertical is not None:
            raise _depthless(axes.vertical)
        depth, unit = _depths(header[name]) if name else (None, "m")
        return Level(None, None if depth is None else float(depth), unit)
    if header[name].ndim > 1:
        raise _depthless(name)
    depths, unit = _depths(header[name])
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


def _depths(coordinate: xr.DataArray) -> tuple[npt.NDArray[np.float64], str]:
    """Depths below the surface, positive down, and their unit, "m" or "dbar"."""
    units = str(coordinate.attrs.get("units", "m")).strip().lower()
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
