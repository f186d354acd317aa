"""Cells that a grid holds more than once: fold rows and halo columns, found by where their centres lie."""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import xarray as xr

Numbers = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

_DEGREES = 1e-4
"""Centres closer than about half of this are one place: single precision places a longitude to 3e-5."""

_WHOLE = 0.45
"""Of the sea of a fold row or halo column at least such a share is repeated (half, where a row lies on the fold)."""


@dataclass(frozen=True, eq=False)
class PackedFlags:
    """A flag for every cell of the horizontal grid, eight to a byte."""

    dims: tuple[str, ...]
    shape: tuple[int, ...]
    bits: npt.NDArray[np.uint8]

    @classmethod
    def of(cls, flags: Flags, dims: tuple[str, ...]) -> PackedFlags:
        """Pack flags on `dims`."""
        return cls(dims, flags.shape, np.packbits(flags.ravel()))

    def within(self, region: Mapping[str, slice]) -> xr.DataArray:
        """The flags of a part of the grid; a dimension not named is whole."""
        flags = np.unpackbits(self.bits, count=int(np.prod(self.shape))).view(bool).reshape(self.shape)
        return xr.DataArray(flags[tuple(region.get(dim, slice(None)) for dim in self.dims)], dims=self.dims)


def repeated(longitude: Numbers, latitude: Numbers, usable: Flags) -> Flags:
    """True for every cell whose centre lies where another counts already.

    Of the cells at one place the first that is `usable` (sea, with an area) counts, else the first. Cells without a
    place repeat nothing. All arguments have the shape of the horizontal grid, degrees on any turn.
    """
    lon, lat = longitude.ravel() % 360.0, latitude.ravel()
    placed = np.isfinite(lon) & np.isfinite(lat)
    order = np.concatenate([np.flatnonzero(usable.ravel() & placed), np.flatnonzero(~usable.ravel() & placed)])
    step = _step(lon[placed], lat[placed])
    turn = int(np.ceil(360.0 / step)) + 2
    found = np.zeros(lon.size, dtype=bool)
    # Two centres a hair apart may fall into neighbouring bins, but hardly so when the bins are moved by half.
    for east, north in itertools.product((0.0, 0.5), repeat=2):
        columns = np.floor((lon[order] + step / 4) % 360.0 / step + east).astype(np.int64)
        rows = np.floor((lat[order] + 90.0 + step / 4) / step + north).astype(np.int64)
        first = np.unique(rows * turn + columns, return_index=True)[1]
        again = np.ones(order.size, dtype=bool)
        again[first] = False
        found[order[again]] = True
    return found.reshape(longitude.shape)


def _step(lon: Numbers, lat: Numbers) -> float:
    """Width of a bin in degrees: never more than a twentieth of the usual way from one cell to the next."""
    away = np.abs((np.diff(lon) + 180.0) % 360.0 - 180.0) + np.abs(np.diff(lat))
    away = away[away > 0]
    return min(_DEGREES, float(np.median(away)) / 20.0) if away.size else _DEGREES


def where_repeated(again: Flags, sea: Flags, dims: tuple[str, ...]) -> str:
    """Words for the rows and columns whose sea cells are repeated ones."""
    if again.ndim != 2:
        return ""
    places = []
    for axis, dim in enumerate(dims):
        wet, both = sea.sum(axis=1 - axis), (again & sea).sum(axis=1 - axis)
        lines = np.flatnonzero((both > 0) & (both >= _WHOLE * wet))
        if 0 < lines.size <= 6:
            places.append(f"{dim} = {', '.join(str(line) for line in lines)}")
    return f" (at {' and '.join(places)}, counted from 0)" if places else ""
