"""The true outlines of the cells of a grid, ready to be drawn about any central meridian.

Corners come from the bounds where the dataset has them and are derived from the centres otherwise. Nothing here knows
a projection: longitudes are degrees east of the central meridian, cut at -180 and 180.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import shapely
import xarray as xr

from gridcarb.axes import Axes, grid_kind
from gridcarb.errors import InputError

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

_FINEST = 1.0
"""No side of a drawn piece is longer (degrees), so that it bends as parallels and meridians do."""

_TOUCHING = 1e-3
"""Edges this close (degrees) are one edge: coordinates are often kept as float32."""


@dataclass(frozen=True)
class Mesh:
    """Pieces of the cells of a 1-D latitude/longitude grid.

    x_edges, y_edges : degrees, ascending, (nx + 1,) and (ny + 1,).
    x_cells, y_cells : the column and row each piece belongs to, -1 in a gap between cells.
    """

    x_edges: Floats
    y_edges: Floats
    x_cells: Indices
    y_cells: Indices

    def spread(self, cells: npt.NDArray[Any], fill: float | bool) -> npt.NDArray[Any]:
        """(y, x, ...) values of cells laid out on the pieces, `fill` in gaps."""
        pieces = cells[np.ix_(self.y_cells, self.x_cells)]
        pieces[self.y_cells < 0] = fill
        pieces[:, self.x_cells < 0] = fill
        return pieces


@dataclass(frozen=True)
class Outlines:
    """Polygons of the cells of any other grid.

    rings : one (corners, 2) array of degrees a piece; a cell cut by the outer meridian has several.
    cells : the cell (flat index) each ring belongs to.
    """

    rings: tuple[Floats, ...]
    cells: Indices


@dataclass(frozen=True)
class Grid:
    """Corners in degrees, any turn of longitude: rectilinear (n, 2) of rows and columns, else (cells, corners)."""

    longitudes: Floats
    latitudes: Floats
    rectilinear: bool

    def extent(self) -> tuple[float, float, float, float]:
        """West, east, south, north; the whole turn is -180..180, a region is west < east <= west + 360."""
        turns = np.sort(np.unique(np.round(self.longitudes[np.isfinite(self.longitudes)] % 360, 6)))
        south, north = float(np.nanmin(self.latitudes)), float(np.nanmax(self.latitudes))
        gaps = np.diff(np.append(turns, turns[0] + 360))
        widest = int(np.argmax(gaps))
        if gaps[widest] < max(30.0, 1.5 * float(np.median(gaps))):
            return -180.0, 180.0, south, north
        west = float(turns[(widest + 1) % turns.size])
        west -= 360.0 * (west >= 180)
        return west, west + 360.0 - float(gaps[widest]), south, north


    def middles(self, shape: tuple[int, ...]) -> tuple[Floats, Floats]:
        """Longitude and latitude of the middle of each cell, (y, x) or (cell,) as `shape` says."""
        lon, lat = self._unwrapped().mean(axis=1), self.latitudes.mean(axis=1)
        if self.rectilinear:
            lon, lat = np.meshgrid(lon, lat)
        return lon.reshape(shape), lat.reshape(shape)

    def holds(self, west: float, east: float, south: float, north: float) -> bool:
        """Whether a cell lies, in part, within the window."""
        lon, turn = self._unwrapped(), (east - west) % 360.0 or 360.0
        apart = np.abs((lon.mean(axis=1) - west - turn / 2 + 180) % 360 - 180)
        columns = apart < (np.ptp(lon, axis=1) + turn) / 2
        rows = (self.latitudes.max(axis=1) > south) & (self.latitudes.min(axis=1) < north)
        return bool(rows.any() and columns.any()) if self.rectilinear else bool((rows & columns).any())

    def _unwrapped(self) -> Floats:
        """Longitudes with the corners of each cell on the same turn."""
        first = self.longitudes[:, :1]
        return np.asarray(first + (self.longitudes - first + 180) % 360 - 180)


def grid_of(ds: xr.Dataset, axes: Axes) -> Grid:
    """The corners of every cell.

    Raises
    ------
    InputError : there is no latitude or longitude, or no cells beside each other to make a map of.
    """
    if not axes.horizontal or axes.latitude is None or axes.longitude is None:
        raise InputError(
            "there is no map of a single column or of data without latitude and longitude", where="figures: map",
            mend="leave the maps out of `figures` in the recipe",
        )
    kind = grid_kind(ds, axes)
    longitude, latitude = ds[axes.longitude], ds[axes.latitude]
    if kind == "rectilinear":
        columns = _pairs(longitude, _bounds(ds, longitude), whole_turn=True)
        rows = np.clip(_pairs(latitude, _bounds(ds, latitude), whole_turn=False), -90, 90)
        return Grid(columns, rows, rectilinear=True)
    corners = _bounds(ds, longitude), _bounds(ds, latitude)
    if corners[0] is not None and corners[1] is not None:
        lon, lat = (np.reshape(side, (-1, side.shape[-1])) for side in corners if side is not None)
    elif kind == "curvilinear":
        lon, lat = _corners_between(_degrees(longitude), _degrees(latitude))
    else:
        raise InputError(
            "cells of an unstructured grid can only be drawn from their corners", where=f"coordinate '{longitude.name}'",
            mend="give the coordinates a `bounds` variable with the corners of every cell, or leave the map out",
        )
    return Grid(lon, lat, rectilinear=False)


def mesh(grid: Grid, centre: float) -> Mesh:
    """A rectilinear grid cut at the meridian opposite to `centre` (degrees east), in pieces of at most one degree."""
    west, east = np.sort(grid.longitudes, axis=1).T
    west = (west - centre + 180) % 360 - 180
    east = west + np.ptp(grid.longitudes, axis=1)
    columns = np.arange(west.size)
    beyond = east > 180 + _TOUCHING
    lows = np.concatenate([west, np.full(beyond.sum(), -180.0)])
    highs = np.concatenate([np.minimum(east, 180.0), east[beyond] - 360])
    x_edges, x_cells = _pieces(lows, highs, np.concatenate([columns, columns[beyond]]))
    south, north = np.sort(grid.latitudes, axis=1).T
    y_edges, y_cells = _pieces(south, north, np.arange(south.size))
    return Mesh(x_edges, y_edges, x_cells, y_cells)


def outlines(grid: Grid, centre: float, uncut: bool) -> Outlines:
    """The cells of any grid as rings, (corners, 2) degrees.

    Those that meet the outer meridian or hold a pole are cut there, unless `uncut` (a view of a pole has no such meridian).
    """
    start = (grid.longitudes[:, :1] - centre + 180) % 360 - 180
    steps = (np.diff(grid.longitudes, axis=1, append=grid.longitudes[:, :1]) + 180) % 360 - 180
    lon = np.concatenate([start, start + np.cumsum(steps, axis=1)], axis=1)
    lat = np.concatenate([grid.latitudes, grid.latitudes[:, :1]], axis=1)
    valid = np.isfinite(lon).all(axis=1) & np.isfinite(lat).all(axis=1)
    rings = np.stack([lon, lat], axis=-1)
    if uncut:
        rings[..., 0] = (rings[..., 0] + 180) % 360 - 180
        return Outlines(tuple(rings[valid]), np.flatnonzero(valid))
    around = valid & (np.abs(lon[:, -1] - lon[:, 0]) > 180)
    split = around | (valid & ((lon.min(axis=1) < -180) | (lon.max(axis=1) > 180)))
    whole = np.flatnonzero(valid & ~split)
    pieces, cells = list(rings[whole]), [int(cell) for cell in whole]
    for cell in np.flatnonzero(split):
        ring = rings[cell]
        if around[cell]:
            pole = float(np.copysign(90.0, ring[:, 1].mean()))
            ring = np.concatenate([ring, [[ring[-1, 0], pole], [ring[0, 0], pole]]])
        parts = _cut(ring)
        pieces += parts
        cells += [int(cell)] * len(parts)
    return Outlines(tuple(pieces), np.asarray(cells, dtype=np.intp))


def _cut(ring: Floats) -> list[Floats]:
    """The parts of a ring within -180..180 after any number of turns."""
    window = shapely.box(-180, -90, 180, 90)
    parts: list[Floats] = []
    for turn in (-360.0, 0.0, 360.0):
        shape = shapely.make_valid(shapely.Polygon(ring + np.array([turn, 0.0])))
        for part in shapely.get_parts(shapely.intersection(shape, window)):
            if part.geom_type == "Polygon" and part.area > 0:
                parts.append(shapely.get_coordinates(shapely.segmentize(part.exterior, _FINEST)))
    return parts


def _pieces(lows: Floats, highs: Floats, cells: Indices) -> tuple[Floats, Indices]:
    """Ascending edges and the cell between each two; overlaps go to the first cell, gaps get -1."""
    edges: list[float] = []
    owners: list[int] = []
    for place in np.lexsort((cells, lows)):
        low, high = float(lows[place]), float(highs[place])
        if edges:
            if low - edges[-1] > _TOUCHING:
                edges.append(low)
                owners.append(-1)
            low = edges[-1]
        if high - low <= _TOUCHING:
            continue
        edges = edges or [low]
        parts = int(np.ceil((high - low) / _FINEST - _TOUCHING))
        edges += [float(edge) for edge in np.linspace(low, high, parts + 1)[1:]]
        owners += [int(cells[place])] * parts
    return np.asarray(edges), np.asarray(owners, dtype=np.intp)


def _pairs(coordinate: xr.DataArray, bounds: Floats | None, whole_turn: bool) -> Floats:
    """(n, 2) edges of the cells along one axis, degrees."""
    centres = np.atleast_1d(_degrees(coordinate))
    if whole_turn:
        centres = np.unwrap(centres, period=360)
    if bounds is not None and bounds.shape == (centres.size, 2):
        if not whole_turn or centres.size == 1:
            return bounds
        return np.asarray(centres[:, None] + (bounds - centres[:, None] + 180) % 360 - 180)
    if centres.size == 1:
        return np.stack([centres - 0.5, centres + 0.5], axis=1)
    middles = (centres[:-1] + centres[1:]) / 2
    edges = np.concatenate([[2 * centres[0] - middles[0]], middles, [2 * centres[-1] - middles[-1]]])
    return np.stack([edges[:-1], edges[1:]], axis=1)


def _bounds(ds: xr.Dataset, coordinate: xr.DataArray) -> Floats | None:
    name = {**coordinate.encoding, **coordinate.attrs}.get("bounds")
    if name is None or name not in ds.variables:
        return None
    bounds = ds[name].transpose(*coordinate.dims, ...)
    return _degrees(bounds.assign_attrs({"units": coordinate.attrs.get("units", ""), **bounds.attrs}))


def _degrees(coordinate: xr.DataArray) -> Floats:
    values: Floats = np.asarray(coordinate.values, dtype=np.float64)
    turns: Floats = np.degrees(values) if str(coordinate.attrs.get("units", "")).startswith("rad") else values
    return turns


def _corners_between(longitude: Floats, latitude: Floats) -> tuple[Floats, Floats]:
    """Corners halfway between the centres of a 2-D grid, averaged as points on the sphere; rims are extrapolated."""
    lon, lat = np.radians(longitude), np.radians(latitude)
    points = np.stack([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)], axis=-1)
    for axis in (0, 1):
        first, last = np.take(points, [0], axis), np.take(points, [-1], axis)
        inner = (1, -2) if points.shape[axis] > 1 else (0, 0)
        second, before = (np.take(points, [place], axis) for place in inner)
        wide = np.concatenate([2 * first - second, points, 2 * last - before], axis)
        points = (np.take(wide, range(wide.shape[axis] - 1), axis) + np.take(wide, range(1, wide.shape[axis]), axis)) / 2
    node_lon = np.degrees(np.arctan2(points[..., 1], points[..., 0]))
    node_lat = np.degrees(np.arctan2(points[..., 2], np.hypot(points[..., 0], points[..., 1])))
    lon_out, lat_out = (
        np.stack([node[:-1, :-1], node[:-1, 1:], node[1:, 1:], node[1:, :-1]], axis=-1).reshape(-1, 4)
        for node in (node_lon, node_lat)
    )
    return lon_out, lat_out
