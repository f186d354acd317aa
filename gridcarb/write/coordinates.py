"""The coordinates of a grid as they go into a result: numbers untouched, the encoding of the source left behind."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence

import numpy as np
import xarray as xr

from gridcarb.axes import Axes

_OF_THE_SOURCE = ("_FillValue", "missing_value", "coordinates", "_ARRAY_DIMENSIONS", "_NCProperties")
"""Attributes that belong to the file a coordinate came from, not to the coordinate."""


def clean_coordinates(template: xr.Dataset, axes: Axes) -> dict[str, xr.Variable]:
    """Every coordinate, bound and helper variable among the coords of `template`, ready to be stored.

    Numbers and dimensions are kept as they are, in native byte order; character arrays become strings. A coordinate
    never carries a fill value: where an auxiliary one holds its source's fill (latitudes on land), NaN stands instead.
    Attributes that point to a variable which is not there are dropped, and what `axes` knows is stated where the
    source was silent (`standard_name` of latitude, longitude and time; `axis` of one-dimensional coordinates).
    """
    found = {str(name): _clean(coord.variable) for name, coord in template.coords.items()}
    stated = _stated(found, axes)
    for name, variable in found.items():
        kept = {
            key: value for key, value in variable.attrs.items()
            if key not in _POINTERS or all(word in found for word in _POINTERS[key](value))
        }
        variable.attrs = kept | {key: value for key, value in stated.get(name, {}).items() if key not in kept}
    return found


def auxiliary(dims: Sequence[str], coordinates: Mapping[str, xr.Variable]) -> list[str]:
    """The names a field with these `dims` lists in its CF attribute `coordinates`."""
    hidden = pointed_at(variable.attrs for variable in coordinates.values())
    return [
        name for name, variable in coordinates.items()
        if name not in variable.dims and name not in hidden and set(variable.dims) <= set(dims)
        and not {"grid_mapping_name", "cf_role"} & variable.attrs.keys()
    ]


def pointed_at(attributes: Iterable[Mapping[str, object]]) -> set[str]:
    """The variables that attributes such as `bounds` and `formula_terms` point to."""
    return {
        word for attrs in attributes for key, names in _POINTERS.items() if key in attrs for word in names(attrs[key])
    }


def unfilled(variable: xr.Variable) -> np.ndarray:
    """The numbers of a coordinate in native byte order; in floating-point ones, NaN stands for a fill of the source."""
    values = variable.values.astype(variable.dtype.newbyteorder("="))
    if values.dtype.kind != "f":
        return values
    fills = [variable.attrs[key] for key in ("_FillValue", "missing_value") if key in variable.attrs]
    values[np.isin(values, np.asarray(fills, dtype=values.dtype).ravel())] = np.nan
    return values


def _one(value: object) -> list[str]:
    return [str(value)]


def _words_after_colons(value: object) -> list[str]:
    return re.findall(r":\s*(\S+)", str(value))


_POINTERS = {
    "bounds": _one, "climatology": _one, "formula_terms": _words_after_colons, "cell_measures": _words_after_colons,
}
"""Attributes that name other variables, and how to read the names."""


def _clean(variable: xr.Variable) -> xr.Variable:
    values = np.asarray(variable.values)
    dims = tuple(str(dim) for dim in variable.dims)
    if values.dtype.kind in "mM":
        raise TypeError("coordinates are stored as the raw numbers of the source, not as decoded times")
    if values.dtype.kind == "S":
        values, dims = _strings(values, dims)
    elif values.dtype.kind in "UO":
        values = values.astype(object)
    elif values.dtype.kind == "b":
        values = values.astype("i1")
    else:
        values = unfilled(variable)
    attrs = {key: value for key, value in variable.attrs.items() if key not in _OF_THE_SOURCE}
    return xr.Variable(dims, values, attrs)


def _strings(values: np.ndarray, dims: tuple[str, ...]) -> tuple[np.ndarray, tuple[str, ...]]:
    """Bytes as strings; an array of single characters loses the dimension along which the characters run."""
    if values.dtype.itemsize == 1 and values.ndim:
        values = np.ascontiguousarray(values).view(f"S{values.shape[-1]}")[..., 0]
        dims = dims[:-1]
    return np.char.decode(values, "utf-8", errors="replace").astype(object), dims


def _stated(found: Mapping[str, xr.Variable], axes: Axes) -> dict[str, dict[str, str]]:
    roles = ((axes.time_coordinate, "T", "time"), (axes.vertical_coordinate, "Z", None),
             (axes.latitude, "Y", "latitude"), (axes.longitude, "X", "longitude"))
    stated: dict[str, dict[str, str]] = {}
    for name, axis, standard_name in roles:
        if name and name in found:
            entry = stated.setdefault(name, {})
            if standard_name and (axis != "T" or " since " in str(found[name].attrs.get("units"))):
                entry["standard_name"] = standard_name
            if found[name].dims == (name,):
                entry["axis"] = axis
    return stated
