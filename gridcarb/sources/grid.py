"""Whether two files lie on the same grid: positions within 1e-4 degrees, levels within 1e-3 of their depth."""

from __future__ import annotations

import functools
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.axes import Axes
from gridcarb.errors import InputError
from gridcarb.sources.headers import Header
from gridcarb.sources.stored import POINTERS

_DEGREES = 1e-4
_DEPTH = 1e-3
_MISSING = 1e10
"""Positions beyond this are fill values, whatever the attributes say."""

_MEANING = ("units", "positive", "scale_factor", "add_offset", "_FillValue", "missing_value")

_METRES = frozenset({"m", "meter", "meters", "metre", "metres"})


@dataclass(frozen=True)
class Grid:
    """One variable on the grid of one file."""

    header: Header
    variable: str
    axes: Axes

    @classmethod
    def of(cls, header: Header, variable: str, sibling: Grid | None = None) -> Grid:
        """The grid a variable lies on, from the header of its file; a file laid out like a sibling has its axes."""
        if sibling and _layout(header, variable) == _layout(sibling.header, variable):
            return cls(header, variable, sibling.axes)
        return cls(header, variable, header.axes_of(variable))

    def size(self, dim: str | None) -> int:
        """Number of steps along a dimension of the variable; 0 if there is none."""
        head = self.header.heads[self.variable]
        return head.shape[head.dims.index(dim)] if dim in head.dims else 0

    def values(self, name: str | None) -> npt.NDArray[Any] | None:
        """Values of a coordinate (whole or sampled), unpacked, as float64; NaN where they are missing."""
        found = self.header.values.get(name) if name else None
        return None if found is None or name is None else _unpacked(found, self.header.heads[name].attrs)

    def in_radians(self, name: str | None) -> bool:
        """Whether an angle is given in radians."""
        return self.attribute(name, "units").lower().startswith("rad")

    def attribute(self, name: str | None, key: str) -> str:
        """An attribute of a coordinate, '' where absent."""
        return str(self.header.heads[name].attrs.get(key, "")).strip() if name else ""


@functools.lru_cache(maxsize=64)
def _layout(header: Header, variable: str) -> dict[str, tuple[Any, ...]]:
    """All that tells the axes of a variable, save the sizes."""
    names = (variable, *header.coordinates_of(variable))
    keys = ("standard_name", "axis", "units", "positive", *POINTERS)
    return {name: (header.heads[name].dims, *(header.heads[name].attrs.get(key) for key in keys)) for name in names}


def refuse_difference(role: str, grid: Grid, reference_name: str, reference: Grid) -> None:
    """Refuse `grid` unless it agrees with `reference` in everything both of them say.

    A file without positions of its own is taken to lie on the reference grid when the sizes agree.

    Raises
    ------
    InputError : other dimensions, sizes, positions, levels, or units of the levels.
    """
    if _identical(grid, reference):
        return
    what = _other_shape(grid, reference) or _other_positions(grid, reference) or _other_levels(grid, reference)
    _refuse(what, role, grid, reference_name, reference)


def _identical(grid: Grid, reference: Grid) -> bool:
    """Whether all is the same as it is stored: the usual case in thousands of files, and quickly seen."""
    axes = grid.axes
    if axes != reference.axes or any(grid.size(dim) != reference.size(dim) for dim in (*axes.horizontal, axes.vertical)):
        return False
    names = [name for name in (axes.latitude, axes.longitude, axes.vertical_coordinate) if name]
    for name in names:
        ours, theirs = grid.header.values.get(name), reference.header.values.get(name)
        packing = [
            [str(header.heads[name].attrs.get(key)) for key in _MEANING] for header in (grid.header, reference.header)
        ]
        if ours is None or theirs is None or packing[0] != packing[1] or not np.array_equal(ours, theirs):
            return False
    return True


def refuse_other_place(role: str, grid: Grid, reference_name: str, reference: Grid) -> None:
    """Refuse `grid` unless it has the horizontal places of `reference`, whatever its levels."""
    _refuse(_other_cells(grid, reference) or _other_positions(grid, reference), role, grid, reference_name, reference)


def refuse_other_levels(role: str, grid: Grid, reference_name: str, reference: Grid) -> None:
    """Refuse `grid` unless it has the levels of `reference`."""
    ours, theirs = grid.size(grid.axes.vertical), reference.size(reference.axes.vertical)
    what = f"{ours} levels, not {theirs}" if ours != theirs else _other_levels(grid, reference)
    _refuse(what, role, grid, reference_name, reference)


def _refuse(what: str, role: str, grid: Grid, reference_name: str, reference: Grid) -> None:
    if what:
        raise InputError(
            f"the grid differs from that of {reference_name} in {reference.header.path}: {what}",
            where=f"{grid.header.path}: {grid.variable} ({role})",
            mend=f"give {role} on the grid of {reference_name}; gridcarb does not interpolate",
        )


def _other_shape(grid: Grid, reference: Grid) -> str:
    ours, theirs = grid.axes, reference.axes
    if bool(ours.vertical) != bool(theirs.vertical):
        bare, full = (grid, reference) if theirs.vertical else (reference, grid)
        return f"'{bare.variable}' has no levels, '{full.variable}' has {full.size(full.axes.vertical)}"
    if grid.size(ours.vertical) != reference.size(theirs.vertical):
        return f"{grid.size(ours.vertical)} levels, not {reference.size(theirs.vertical)}"
    return _other_cells(grid, reference)


def _other_cells(grid: Grid, reference: Grid) -> str:
    ours, theirs = grid.axes.horizontal, reference.axes.horizontal
    if len(ours) != len(theirs):
        return f"horizontal dimensions are {ours or 'none'}, not {theirs or 'none'}"
    for own, other in zip(ours, theirs, strict=True):
        if grid.size(own) != reference.size(other):
            return f"{grid.size(own)} cells along {other}, not {reference.size(other)}"
    return ""


def _other_positions(grid: Grid, reference: Grid) -> str:
    for noun, own, other in (
        ("latitudes", grid.axes.latitude, reference.axes.latitude),
        ("longitudes", grid.axes.longitude, reference.axes.longitude),
    ):
        ours, theirs = grid.values(own), reference.values(other)
        if ours is None or theirs is None:
            continue
        if ours.shape != theirs.shape:
            return f"{noun} have the shape {ours.shape}, not {theirs.shape}"
        if grid.in_radians(own) != reference.in_radians(other):
            return f"{noun} are in radians on one side and in degrees on the other"
        both = _present(ours) & _present(theirs)
        off = np.abs(ours - theirs)[both] * (np.degrees(1.0) if grid.in_radians(own) else 1.0)
        if off.size and float(off.max()) > _DEGREES:
            return f"{noun} are up to {float(off.max()):.6g} degrees off{_likely_reason(ours, theirs)}"
    return ""


def _likely_reason(ours: npt.NDArray[Any], theirs: npt.NDArray[Any]) -> str:
    """Words for the usual ways in which the same positions stand in another order."""
    if np.allclose(ours[::-1], theirs, rtol=0, atol=_DEGREES):
        return " (they run the other way)"
    if np.allclose(ours % 360.0, theirs % 360.0, rtol=0, atol=_DEGREES):
        return " (they are counted from another meridian)"
    if np.allclose(np.sort(ours % 360.0, axis=None), np.sort(theirs % 360.0, axis=None), rtol=0, atol=_DEGREES):
        return " (they begin at another meridian)"
    return ""


def _other_levels(grid: Grid, reference: Grid) -> str:
    own, other = grid.axes.vertical_coordinate, reference.axes.vertical_coordinate
    ours, theirs = grid.values(own), reference.values(other)
    if ours is None or theirs is None:
        return ""
    if ours.shape != theirs.shape:
        return f"levels have the shape {ours.shape}, not {theirs.shape}"
    for key in ("units", "positive"):
        one, two = grid.attribute(own, key).lower(), reference.attribute(other, key).lower()
        if one and two and one != two and not {one, two} <= _METRES:
            return f"levels have {key} '{one}', not '{two}'"
    both = _present(ours) & _present(theirs)
    off = np.abs(ours - theirs)[both] > _DEPTH * np.maximum(np.abs(theirs[both]), 1.0)
    if not np.any(off):
        return ""
    level = int(np.argmax(off))
    return f"level {level + 1} is {ours[both][level]:.6g}, not {theirs[both][level]:.6g}"


def _unpacked(stored: npt.NDArray[Any], attrs: Mapping[str, Any]) -> npt.NDArray[Any]:
    values = stored.astype(np.float64)
    for key in ("_FillValue", "missing_value"):
        for fill in np.ravel(attrs.get(key, ())):
            values[stored == fill] = np.nan
    return values * float(attrs.get("scale_factor", 1.0)) + float(attrs.get("add_offset", 0.0))


def _present(values: npt.NDArray[Any]) -> npt.NDArray[np.bool_]:
    return np.asarray(np.isfinite(values) & (np.abs(values) < _MISSING))
