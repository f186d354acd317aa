"""The true outlines of the cells of a grid, ready to be drawn about any central meridian.

Nothing here knows a projection: longitudes are degrees east of the central meridian, cut at -180 and 180.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt
import shapely
import xarray as xr

from gridcarb.axes import Axes, edges_between, grid_kind, on_one_turn
from gridcarb.errors import InputError
from gridcarb.figures.corners import bounds_of, degrees, patches_of, places

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]
Mask = npt.NDArray[np.bool_]

_FINEST = 1.0
"""No side of a piece cut at the outer meridian is longer (degrees), so that it bends as parallels and meridians do."""

_FLAT = 1e-10
"""Pieces of less (square degrees) have collapsed and are not drawn."""

_MARGIN = 2.5
"""Degrees kept free around points, which have no outline of their own."""


@dataclass(frozen=True)
class Outlines:
    """Pieces of cells.

    quads : (pieces, 4, 2) degrees; owners : the cell (flat index) each belongs to.
    rings : one (corners, 2) array a piece of a cell that was cut; ring_owners : their cells.
    """

    quads: Floats
    owners: Indices
    rings: tuple[Floats, ...] = ()
    ring_owners: Indices = field(default_factory=lambda: np.empty(0, dtype=np.intp))


@dataclass(frozen=True)
class Grid:
    """Corners in degrees, any turn of longitude: rectilinear (n, 2) of columns and rows, else (pieces, corners).

    cells : the cell (flat index) each piece belongs to; a piece with a single corner is a point.
    centres : longitude and latitude (cells,) where the grid is not rectilinear.
    """

    longitudes: Floats
    latitudes: Floats
    rectilinear: bool
    cells: Indices = field(default_factory=lambda: np.empty(0, dtype=np.intp))
    centres: tuple[Floats, Floats] = field(default_factory=lambda: (np.empty(0), np.empty(0)))

    @property
    def of_points(self) -> bool:
        """Whether nothing is known of the cells but their centres."""
        return bool(self.longitudes.shape[-1] == 1)

    def extent(self) -> tuple[float, float, float, float]:
        """West, east, south, north; the whole turn is -180..180, a region is west < east <= west + 360."""
        turns = np.unique(np.round(self.longitudes[np.isfinite(self.longitudes)] % 360, 6))
        south, north = float(np.nanmin(self.latitudes)), float(np.nanmax(self.latitudes))
        gaps = np.diff(np.append(turns, turns[0] + 360))
        widest = int(np.argmax(gaps))
        if gaps[widest] < max(30.0, 1.5 * float(np.median(gaps))):
            return -180.0, 180.0, south, north
        west = float(turns[(widest + 1) % turns.size])
        west -= 360.0 * (west >= 180)
        east = west + 360.0 - float(gaps[widest])
        if self.of_points:
            side = max(_MARGIN, 0.05 * max(east - west, north - south))
            return west - side, east + side, max(south - side, -90.0), min(north + side, 90.0)
        return west, east, south, north

    def middles(self, shape: tuple[int, ...]) -> tuple[Floats, Floats]:
        """Longitude and latitude of the middle of each cell, (y, x) or (cell,) as `shape` says; NaN where unknown."""
        lon, lat = self.centres
        if self.rectilinear:
            lon, lat = np.meshgrid(self._unwrapped().mean(axis=1), self.latitudes.mean(axis=1))
        return lon.reshape(shape), lat.reshape(shape)

    def covered(self, empty: Mask) -> Mask:
        """The cells that another one lies upon (fold, halo), one that is not `empty` if there is any; also those nowhere.

        empty : cells without a value, any shape of as many cells.
        """
        hidden = np.zeros(empty.size, dtype=bool)
        if not self.rectilinear and not self.of_points:
            numbers = places(*self.centres)
            order = np.lexsort((empty.ravel(), numbers))
            hidden[order[1:]] = numbers[order[1:]] == numbers[order[:-1]]
            hidden[numbers < 0] = True
        return hidden.reshape(empty.shape)

    def holds(self, west: float, east: float, south: float, north: float) -> bool:
        """Whether a cell lies, in part, within the window."""
        lon, turn = self._unwrapped(), (east - west) % 360.0 or 360.0
        apart = np.abs((lon.mean(axis=1) - west - turn / 2 + 180) % 360 - 180)
        columns = apart <= (np.ptp(lon, axis=1) + turn) / 2
        rows = (self.latitudes.max(axis=1) > south) & (self.latitudes.min(axis=1) < north)
        return bool(rows.any() and columns.any()) if self.rectilinear else bool((rows & columns).any())

    def _unwrapped(self) -> Floats:
        """Longitudes with the corners of each cell on the same turn."""
        first = self.longitudes[:, :1]
        return np.asarray(first + (self.longitudes - first + 180) % 360 - 180)


def grid_of(ds: xr.Dataset, axes: Axes) -> Grid:
    """The corners of every cell; its centre, where nothing tells its outline.

    Raises
    ------
    InputError : there is no latitude or longitude, or no cells beside each other to make a map of.
    """
    if not axes.horizontal or axes.latitude is None or axes.longitude is None:
        raise _no_map("there is no map of a single column or of data without latitude and longitude")
    longitude, latitude = ds[axes.longitude], ds[axes.latitude]
    if grid_kind(ds, axes) == "rectilinear":
        columns = _pairs(longitude, bounds_of(ds, longitude), whole_turn=True)
        rows = np.clip(_pairs(latitude, bounds_of(ds, latitude), whole_turn=False), -90, 90)
        return Grid(columns, rows, rectilinear=True)
    longitude, latitude = xr.broadcast(longitude.reset_coords(drop=True), latitude.reset_coords(drop=True))
    lon, lat = (degrees(part.transpose(*axes.horizontal)).ravel() for part in (longitude, latitude))
    known = places(lon, lat) >= 0
    found = patches_of(ds, axes, ds[axes.longitude], ds[axes.latitude], known)
    if not (np.isfinite(lon) & np.isfinite(lat)).any():
        raise _no_map("no cell of the grid has a position")
    if found is None:
        return Grid(lon[:, None], lat[:, None], False, np.arange(lon.size), (lon, lat))
    lon, lat = np.where(known, lon, np.nan), np.where(known, lat, np.nan)
    return Grid(found.longitudes, found.latitudes, False, found.cells, (lon, lat))


def _no_map(why: str) -> InputError:
    return InputError(why, where="figures: map", mend="leave the maps out of `figures` in the recipe")


def outlines(grid: Grid, centre: float, *, uncut: bool, reach: tuple[float, float] = (-90.0, 90.0)) -> Outlines:
    """The cells of a grid that is not rectilinear, as far as they meet the latitudes of `reach`.

    Those that meet the outer meridian or hold a pole are cut there, unless `uncut` (a view of a pole has no such meridian).
    """
    start = (grid.longitudes[:, :1] - centre + 180) % 360 - 180
    steps = (np.diff(grid.longitudes, axis=1, append=grid.longitudes[:, :1]) + 180) % 360 - 180
    lon = np.concatenate([start, start + np.cumsum(steps, axis=1)], axis=1)
    lat = np.concatenate([grid.latitudes, grid.latitudes[:, :1]], axis=1)
    around = np.abs(lon[:, -1] - lon[:, 0]) > 180
    area = np.abs((lon[:, :-1] * lat[:, 1:] - lon[:, 1:] * lat[:, :-1]).sum(axis=1)) / 2
    valid = np.isfinite(area) & (around | (area > _FLAT))
    valid &= (lat.max(axis=1) >= reach[0]) & (lat.min(axis=1) <= reach[1])
    split = valid & (around | (lon.min(axis=1) < -180) | (lon.max(axis=1) > 180)) & (not uncut)
    whole = np.flatnonzero(valid & ~split)
    rings = np.stack([lon[whole, :-1], lat[whole, :-1]], axis=-1)
    if uncut:
        rings[..., 0] = (rings[..., 0] + 180) % 360 - 180
    quads, places_of = _four_sided(rings)
    pieces: list[Floats] = []
    owners: list[int] = []
    for cell in np.flatnonzero(split):
        ring = np.stack([lon[cell], lat[cell]], axis=-1)
        parts = _cut(_over_the_pole(ring) if around[cell] else ring)
        pieces += parts
        owners += [int(grid.cells[cell])] * len(parts)
    return Outlines(quads, grid.cells[whole[places_of]], tuple(pieces), np.asarray(owners, dtype=np.intp))


def _four_sided(rings: Floats) -> tuple[Floats, Indices]:
    """Convex rings (pieces, corners, 2) as a fan of pieces with four corners, and the ring of each."""
    count, corners, _ = rings.shape
    if corners == 4:
        return rings, np.arange(count)
    found, owners = [], []
    for first in range(1, max(corners - 1, 2), 2):
        chosen = [0, first, min(first + 1, corners - 1), min(first + 2, corners - 1)]
        found.append(rings[:, chosen])
        owners.append(np.arange(count))
    quads = np.concatenate(found)
    x, y = quads[..., 0], quads[..., 1]
    drawn = np.abs((x * np.roll(y, -1, axis=1) - np.roll(x, -1, axis=1) * y).sum(axis=1)) / 2 > _FLAT
    return quads[drawn], np.concatenate(owners)[drawn]


def _over_the_pole(ring: Floats) -> Floats:
    """A ring that goes once around a pole, with the pole as its other side."""
    pole = float(np.copysign(90.0, ring[:, 1].mean()))
    return np.concatenate([ring, [[ring[-1, 0], pole], [ring[0, 0], pole]]])


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


def _pairs(coordinate: xr.DataArray, bounds: Floats | None, whole_turn: bool) -> Floats:
    """(n, 2) edges of the cells along one axis, degrees."""
    centres = np.atleast_1d(degrees(coordinate))
    if whole_turn:
        centres = on_one_turn(centres)
    if bounds is not None and bounds.shape == (centres.size, 2):
        if not whole_turn or centres.size == 1:
            return bounds
        return np.asarray(centres[:, None] + (bounds - centres[:, None] + 180) % 360 - 180)
    if centres.size == 1:
        return np.stack([centres - 0.5, centres + 0.5], axis=1)
    return edges_between(centres)
