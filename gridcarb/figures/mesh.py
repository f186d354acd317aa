"""Rectilinear grids as a net of pieces small enough to bend as parallels and meridians do."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.figures.cells import Floats, Grid, Indices

_FINEST = 1.0
"""No side of a drawn piece is longer (degrees)."""

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
