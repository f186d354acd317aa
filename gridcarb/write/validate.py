"""Whether a grid can be written as it stands: asked before anything is computed."""

from __future__ import annotations

from collections.abc import Iterator
from typing import NoReturn

import numpy as np
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.errors import Notice, OutputError
from gridcarb.write.attributes import inherited_attributes
from gridcarb.write.coordinates import plain_numbers
from gridcarb.write.encoding import pieces, split_chunks
from gridcarb.write.pointers import names_in

_POLE = 90.0 + 1e-3
"""The latitude of a pole, with what float32 makes of it."""

Numbers = np.ndarray


def check_grid(template: xr.Dataset, axes: Axes) -> tuple[Notice, ...]:
    """Hold what describes the grid (the coords of `template`, raw, lazy or loaded) against itself.

    Returns notices: what had to be left behind because it points at variables which are not there, and what is odd and
    kept. Large coordinates are read in pieces.

    Raises
    ------
    OutputError : a latitude beyond the poles, a coordinate variable with missing numbers, bounds that do not fit their
        coordinate, a mesh whose connectivity points at nodes that do not exist.
    """
    _check_latitudes(template, axes)
    for name, coord in template.coords.items():
        if coord.dims == (name,) and coord.dtype.kind in "iuf":
            _check_axis(str(name), coord.variable)
        for key in ("bounds", "climatology"):
            if coord.attrs.get(key) in template.coords:
                _check_bounds(coord, template[coord.attrs[key]])
        if coord.attrs.get("cf_role") == "mesh_topology":
            _check_mesh(template, str(name))
    return (*_left_behind(template), *_beyond_the_poles(template, axes))


def _check_latitudes(template: xr.Dataset, axes: Axes) -> None:
    if axes.latitude in template.coords:
        worst = _greatest_latitude(template[axes.latitude], template[axes.latitude].variable)
        if worst > _POLE:
            _refuse(f"a latitude of {worst:.6g} degrees lies beyond the pole", f"coordinate '{axes.latitude}'",
                    "mend the latitudes in the input files, or their units or `scale_factor`")


def _greatest_latitude(coordinate: xr.DataArray, variable: xr.Variable) -> float:
    worst = max((float(np.abs(values).max()) for values in _finite(variable)), default=0.0)
    return float(np.degrees(worst)) if str(coordinate.attrs.get("units", "")).startswith("rad") else worst


def _check_axis(name: str, variable: xr.Variable) -> None:
    missing = variable.size - sum(values.size for values in _finite(variable))
    if missing:
        _refuse(f"{missing} of its {variable.size} numbers are missing, which no coordinate variable may have",
                f"coordinate '{name}'", f"give '{name}' a number at every step in the input files")


def _check_bounds(coord: xr.DataArray, bounds: xr.DataArray) -> None:
    corners = [dim for dim in bounds.dims if dim not in coord.dims]
    fits = set(coord.dims) <= set(bounds.dims) and len(corners) == 1 and bounds.ndim == coord.ndim + 1
    if not fits or bounds.sizes[corners[0]] < (2 if coord.ndim < 2 else 3):
        _refuse(
            f"bounds of shape {dict(bounds.sizes)} do not fit their coordinate of shape {dict(coord.sizes)}: they have its "
            "dimensions and one more, of two ends or of the corners of a cell",
            f"'{bounds.name}', bounds of '{coord.name}'",
            f"mend the bounds in the input files, or take the attribute `bounds` away from '{coord.name}'",
        )


def _check_mesh(template: xr.Dataset, mesh: str) -> None:
    """Every index of a connectivity is that of a node (or face, or edge) which exists."""
    for key, value in template[mesh].attrs.items():
        if not str(key).endswith("_connectivity") or value not in template.coords:
            continue
        connectivity, last = template[value], _count(template, mesh, str(key).split("_")[-2])
        start = int(connectivity.attrs.get("start_index", 0))
        for values in _finite(connectivity.variable):
            if last is not None and (values.min() < start or values.max() >= start + last):
                _refuse(
                    f"indices run from {values.min():.0f} to {values.max():.0f}, but there are {last} of what they count "
                    f"and the first is number {start}", f"'{value}', {key} of the mesh '{mesh}'",
                    "mend the attribute `start_index` or the `_FillValue` of the connectivity in the input files",
                )


def _count(template: xr.Dataset, mesh: str, place: str) -> int | None:
    """How many nodes, edges or faces the mesh has, from their coordinates; None where there are none."""
    names = names_in(f"{place}_coordinates", template[mesh].attrs.get(f"{place}_coordinates", ""))
    return next((template[name].size for name in names if name in template.coords), None)


def _finite(variable: xr.Variable) -> Iterator[Numbers]:
    """The numbers that are not missing, piece by piece; pieces without any are passed over."""
    for piece in pieces(variable.shape, split_chunks(variable.shape, 8)):
        values = plain_numbers(variable[piece])
        values = values[np.isfinite(values)]
        if values.size:
            yield values


def _left_behind(template: xr.Dataset) -> Iterator[Notice]:
    """Attributes that go because they name variables which are not there."""
    for name, coord in template.coords.items():
        for key, value in coord.attrs.items():
            gone = [word for word in names_in(str(key), value) if word not in template.coords]
            if gone:
                yield Notice(
                    "grid.attribute_dropped",
                    f"the attribute {key} of '{name}' names {', '.join(gone)}, which the input does not hold; dropped",
                )
    mapping = inherited_attributes(template).get("grid_mapping", "")
    gone = [word for word in names_in("grid_mapping", mapping) if word not in template.coords]
    if gone:
        yield Notice("grid.attribute_dropped",
                     f"the grid mapping {', '.join(gone)} is named but not held by the input; it is left out")


def _beyond_the_poles(template: xr.Dataset, axes: Axes) -> Iterator[Notice]:
    bounds = template[axes.latitude].attrs.get("bounds") if axes.latitude in template.coords else None
    if bounds in template.coords:
        worst = _greatest_latitude(template[axes.latitude], template[bounds].variable)
        if worst > _POLE:
            yield Notice("grid.bounds_beyond_pole",
                         f"the bounds '{bounds}' reach {worst:.6g} degrees, beyond the pole; they are written as they are")


def _refuse(what: str, where: str, mend: str) -> NoReturn:
    raise OutputError(f"the grid cannot be written: {what}", where=where, mend=mend)
