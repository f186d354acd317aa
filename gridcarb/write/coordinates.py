"""The coordinates of a grid as they go into a result: numbers untouched, the encoding of the source left behind."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.write.pointers import helpers, names_in

_FILLS = ("_FillValue", "missing_value")
_OF_THE_SOURCE = (*_FILLS, "coordinates", "_ARRAY_DIMENSIONS", "_NCProperties")
"""Attributes that belong to the file a coordinate came from, not to the coordinate."""

_MEASURES = frozenset({
    "cell_area", "cell_thickness", "ocean_volume", "sea_area_fraction", "sea_floor_depth", "sea_floor_depth_below_geoid",
    "sea_floor_depth_below_mean_sea_level", "sea_floor_depth_below_sea_surface",
})
"""Standard names of what is told about cells and places no cell anywhere: variables in their own right."""


def clean_coordinates(template: xr.Dataset, axes: Axes) -> dict[str, xr.Variable]:
    """Every coordinate, bound, measure, term and topology among the coords of `template`, ready to be stored.

    What is lazy stays so: take the numbers, whole or in pieces, with `numbers`. Values and dimensions are kept as they
    are, in their own type and native byte order; character arrays become strings. Floating-point ones carry no fill
    value: where they hold that of their source (latitudes on land), NaN stands instead, which is missing to every reader.
    Integers have no NaN: auxiliary ones keep their fill (the connectivity of a mesh, the codes of basins), coordinate
    variables and bounds have none (CF 1.11, sections 2.5.1 and 7.1). Attributes that point to a variable which is not
    there are dropped, and what `axes` knows is stated where the source was silent (`standard_name` of latitude,
    longitude and time; `axis` of one-dimensional coordinates; that nothing is known of leap seconds).
    """
    parents = _parents(template)
    found = {
        str(name): _clean(coord.variable, axes, template.coords.get(parents.get(str(name))), str(name))
        for name, coord in template.coords.items()
    }
    stated = _stated(found, axes)
    for name, variable in found.items():
        kept = {key: value for key, value in variable.attrs.items() if all(word in found for word in names_in(key, value))}
        variable.attrs = kept | {key: value for key, value in stated.get(name, {}).items() if key not in kept}
    return found


def auxiliary(dims: Sequence[str], coordinates: Mapping[str, xr.Variable]) -> list[str]:
    """The names a field with these `dims` lists in its CF attribute `coordinates`."""
    hidden = helpers(variable.attrs for variable in coordinates.values())
    return [
        name for name, variable in coordinates.items()
        if name not in variable.dims and name not in hidden and set(variable.dims) <= set(dims)
        and "grid_mapping_name" not in variable.attrs and not _is_topology(variable)
        and variable.attrs.get("standard_name") not in _MEASURES
    ]


def numbers(variable: xr.Variable) -> np.ndarray:
    """The values of a cleaned coordinate or of a piece of it, as they are stored: NaN for what was a fill of the source."""
    values = np.asarray(variable.values)
    if values.dtype.kind == "b":
        return values.astype("i1")
    if values.dtype.kind == "O":
        return values
    values = values.astype(values.dtype.newbyteorder("="))
    if values.dtype.kind == "f":
        values[_is_fill(values, variable.encoding.get("fills", ()))] = np.nan
    return values


def plain_numbers(variable: xr.Variable) -> np.ndarray:
    """The values of a raw coordinate or of a piece of it as float64: unpacked, NaN for a fill of the source."""
    values = np.asarray(variable.values)
    found = values.astype(np.float64)
    found[_is_fill(values, _fills(variable))] = np.nan
    return found * float(variable.attrs.get("scale_factor", 1.0)) + float(variable.attrs.get("add_offset", 0.0))


def _parents(template: xr.Dataset) -> dict[str, str]:
    """Bounds variable -> the coordinate whose bounds they are."""
    return {
        word: str(name) for name, coord in template.coords.items() for key in ("bounds", "climatology")
        if key in coord.attrs for word in names_in(key, coord.attrs[key])
    }


def _is_topology(variable: xr.Variable) -> bool:
    role = str(variable.attrs.get("cf_role", ""))
    return role.endswith("_connectivity") or role in ("mesh_topology", "location_index_set")


def _fills(variable: xr.Variable) -> list[Any]:
    return [value for key in _FILLS if key in variable.attrs for value in np.ravel(variable.attrs[key])]


def _is_fill(values: np.ndarray, fills: Sequence[Any]) -> np.ndarray:
    """Compared in the precision of the values: a fill may be told in another."""
    told = [fill for fill in fills if values.dtype.kind == "f" or np.isfinite(fill)]
    return np.isin(values, np.asarray(told, dtype=values.dtype))


def _clean(variable: xr.Variable, axes: Axes, parent: xr.DataArray | None, name: str) -> xr.Variable:
    kind = variable.dtype.kind
    if kind in "mM":
        raise TypeError("coordinates are stored as the raw numbers of the source, not as decoded times")
    attrs = {key: value for key, value in variable.attrs.items() if key not in _OF_THE_SOURCE}
    if kind in "SUO":
        return _texts(variable, axes, attrs)
    if kind in "iu" and parent is None and variable.dims != (name,):
        attrs |= {key: variable.attrs[key] for key in _FILLS if key in variable.attrs}
    cleaned = variable.copy(deep=False)
    if parent is not None and set(parent.dims) <= set(variable.dims):
        cleaned = cleaned.transpose(*parent.dims, ...)  # CF wants the corners last
    cleaned.attrs, cleaned.encoding = attrs, {"fills": _fills(variable)}
    return cleaned


def _texts(variable: xr.Variable, axes: Axes, attrs: dict[str, Any]) -> xr.Variable:
    """Strings; an array of single characters loses the dimension along which the characters run."""
    values, dims = np.asarray(variable.values), variable.dims
    if values.dtype.kind == "S":
        if values.dtype.itemsize == 1 and values.ndim and dims[-1] not in axes.order:
            values, dims = np.ascontiguousarray(values).view(f"S{values.shape[-1]}")[..., 0], dims[:-1]
        values = np.char.decode(values, "utf-8", errors="replace")
    return xr.Variable(dims, values.astype(object), attrs)


def _has_leap_seconds(time: xr.Variable) -> bool:
    """Calendars of the real world may count them; CF 1.11, section 4.4, wants said whether."""
    return str(time.attrs.get("calendar", "standard")).lower() in ("standard", "gregorian", "proleptic_gregorian", "julian")


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
            if axis == "T" and "since" in str(found[name].attrs.get("units")) and _has_leap_seconds(found[name]):
                entry["units_metadata"] = "leap_seconds: unknown"
    return stated
