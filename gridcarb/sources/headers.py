"""What the header of one file says, as plain data, with the coordinate values needed to compare grids."""

from __future__ import annotations

import functools
import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.axes import Axes, find_axes
from gridcarb.errors import InputError
from gridcarb.sources.collection import FileRecord
from gridcarb.sources.handles import opened
from gridcarb.sources.places import join, split
from gridcarb.sources.storage import Kind, fingerprint, stamp, storage_kind, unreadable
from gridcarb.sources.stored import POINTERS, Head, Stored, words

_SMALL = 20_000
_LINE = 1_000_000
"""Coordinates up to so many values are read whole (_LINE: of one dimension, or with two bounds); larger ones are sampled,
and left unread where one slab is larger still."""

@dataclass(frozen=True, eq=False)
class Header:
    """One file: its variables, global attributes, and the values (whole or sampled) of its small coordinates."""

    path: str
    heads: Mapping[str, Head]
    attrs: Mapping[str, Any]
    values: Mapping[str, npt.NDArray[Any]]
    record: FileRecord
    kind: Kind = "netcdf"

    @functools.cached_property
    def pointed(self) -> frozenset[str]:
        """Variables that others name as their coordinates or bounds."""
        return frozenset(word for head in self.heads.values() for key in POINTERS for word in words(head.attrs.get(key)))

    @functools.cached_property
    def edges(self) -> frozenset[str]:
        """Variables that others name as their bounds."""
        heads = self.heads.values()
        return frozenset(word for head in heads for key in POINTERS[1:] for word in words(head.attrs.get(key)))

    def place(self, variable: str) -> str:
        """File and variable, for errors; a dataset in memory has no path."""
        return f"{self.path}: {variable}" if self.path else variable

    def whole(self, name: str) -> npt.NDArray[Any] | None:
        """The values of a coordinate, if all of them were read."""
        found = self.values.get(name)
        return found if found is not None and found.shape == self.heads[name].shape else None

    def coordinates_of(self, variable: str) -> list[str]:
        """Variables that may be coordinates (or bounds) of `variable`: pointed at, or small enough in dimensions."""
        own = self.heads[variable]
        pointed = {*words(own.attrs.get("coordinates")), *own.dims}
        found = [
            name for name, head in self.heads.items()
            if name != variable and set(head.dims) <= set(own.dims) and (name in pointed or len(head.dims) <= 2)
        ]
        bounds = [words(self.heads[name].attrs.get(key)) for name in found for key in POINTERS[1:]]
        return list(dict.fromkeys([*found, *(name for names in bounds for name in names if name in self.heads)]))

    def skeleton(self, variable: str) -> xr.Dataset:
        """`variable` and its possible coordinates, without values and without room for them."""
        names = self.coordinates_of(variable)
        hollow = {name: _hollow(self.heads[name], keep_pointers=name == variable) for name in (variable, *names)}
        return xr.Dataset({variable: hollow.pop(variable)}).assign_coords(_without_indexes(hollow))

    def axes_of(self, variable: str) -> Axes:
        """The axes of one variable; errors name the file too."""
        try:
            return find_axes(self.skeleton(variable))
        except InputError as error:
            raise InputError(error.what, where=self.place(variable), mend=error.mend) from None


def read_header(path: str) -> Header:
    """Open a file, note what its header says and the values of its coordinates, close it.

    The path of the header names the group that was found to hold the fields, where it is not the top level.

    Raises
    ------
    InputError : missing, not NetCDF or Zarr, damaged or cut short, or its fields lie in several groups.
    """
    kind, (size, changed) = storage_kind(path), stamp(path)
    with opened(path) as stored:
        here = join(split(path)[0], stored.group)
        try:
            heads = stored.heads()
            values = {name: _values(stored, heads[name]) for name in _coordinate_names(heads)}
        except (OSError, RuntimeError, ValueError, UnicodeError) as error:
            raise unreadable(path, error) from error
        return Header(here, heads, dict(stored.attrs), values, FileRecord(here, size, changed, fingerprint(path)), kind)


def _coordinate_names(heads: Mapping[str, Head]) -> list[str]:
    """Variables whose values tell one grid or time axis from another."""
    pointed = {word for head in heads.values() for key in POINTERS for word in words(head.attrs.get(key))}
    spherical = {name for name, head in heads.items() if head.attrs.get("standard_name") in ("latitude", "longitude")}
    return [
        name for name, head in heads.items()
        if head.dtype.kind in "iufb" and (len(head.dims) <= 1 or name in pointed | spherical)
        and math.prod(head.shape[1:]) <= _LINE
    ]


def _values(stored: Stored, head: Head) -> npt.NDArray[Any]:
    """All values, or three slabs of a large coordinate: first, middle, last."""
    line = len(head.dims) == 1 or (len(head.dims) == 2 and head.shape[-1] == 2)
    if math.prod(head.shape) <= (_LINE if line else _SMALL):
        return stored.read(head.name, (slice(None),) * len(head.dims))
    length, thick = head.shape[0], 1000 if len(head.dims) == 1 else 1
    starts, rest = (0, (length - thick) // 2, length - thick), (slice(None),) * (len(head.dims) - 1)
    return np.concatenate([stored.read(head.name, (slice(start, start + thick), *rest)) for start in starts])


def _hollow(head: Head, keep_pointers: bool) -> xr.Variable:
    """A variable of the right shape and attributes that takes no memory."""
    attrs = {key: value for key, value in head.attrs.items() if keep_pointers or key != "coordinates"}
    return xr.Variable(head.dims, np.broadcast_to(np.zeros((), head.dtype), head.shape), attrs)


def _without_indexes(variables: Mapping[str, xr.Variable]) -> xr.Coordinates:
    return xr.Coordinates(variables, indexes={})
