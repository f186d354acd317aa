"""Meshes with one horizontal dim: triangles with the ocean at their nodes, polygons with the ocean in their middles.

The places are those of the raster that lie at sea, in an order that no map has. Triangles join three nodes at sea, so
the coast is ragged. Polygons are the cells of the raster, of which two are merged into one beyond 60 degrees and four
beyond 75; where a wide cell meets narrow ones it has the corners of these as well, so that the mesh has no gap.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from synthetic_grids.geography import sea_floor_depth
from synthetic_grids.landmarks import LATITUDES, LONGITUDES, STEP, eastward
from synthetic_grids.plain_meshes import LATITUDE, LONGITUDE
from synthetic_grids.scene import Mesh
from synthetic_grids.sphere import Numbers

Integers = NDArray[np.int64]

STRIDE = 331
"""A prime: places are listed by every 331st of the raster, turning round."""


def _shuffled(count: int) -> Integers:
    """Each number below `count` once, in no order of a map; `count` is no multiple of the stride."""
    return (np.arange(count, dtype=np.int64) * STRIDE) % count


@dataclass(frozen=True)
class Web:
    """The bare geometry of a mesh of faces.

    lon, lat : degrees east and north of the nodes.
    faces : numbers of the nodes of each face from 0, anticlockwise; -1 where a face has fewer.
    face_lon, face_lat : degrees east and north of the middles of the faces.
    """

    lon: Numbers
    lat: Numbers
    faces: Integers
    face_lon: Numbers
    face_lat: Numbers

    def corners(self) -> tuple[Numbers, Numbers]:
        """Degrees east and north (face, corner); a face with fewer corners repeats its last."""
        padded = self.faces.copy()
        for corner in range(1, padded.shape[1]):
            padded[:, corner] = np.where(padded[:, corner] < 0, padded[:, corner - 1], padded[:, corner])
        return self.lon[padded], self.lat[padded]


def triangle_web() -> Web:
    """The places of the raster at sea as nodes, joined to triangles across the quarters of the raster."""
    columns, rows = LONGITUDES.size, LATITUDES.size
    lon, lat = (part.ravel() for part in np.meshgrid(LONGITUDES, LATITUDES))
    number = np.arange(lon.size).reshape(rows, columns)
    a, b = number[:-1].ravel(), np.roll(number, -1, axis=1)[:-1].ravel()
    c, d = np.roll(number, -1, axis=1)[1:].ravel(), number[1:].ravel()
    faces = np.concatenate([np.stack([a, b, c], axis=-1), np.stack([a, c, d], axis=-1)])
    order = _shuffled(lon.size)
    order = order[sea_floor_depth(lon[order], lat[order]) > 0.0]
    new = np.full(lon.size, -1, dtype=np.int64)
    new[order] = np.arange(order.size)
    faces = new[faces]
    faces = faces[np.all(faces >= 0, axis=1)]
    lon, lat = lon[order], lat[order]
    turned = lon[faces] + 360.0 * np.round((lon[faces[:, :1]] - lon[faces]) / 360.0)
    return Web(lon, lat, faces, eastward(turned.mean(axis=1)), lat[faces].mean(axis=1))


def _merged(latitude: float) -> int:
    """How many cells of the raster are one polygon at a latitude."""
    if abs(latitude) > 75.0:
        return 4
    return 2 if abs(latitude) > 60.0 else 1


def polygon_web() -> Web:
    """The polygons at sea; their nodes are the crossings of meridians and parallels that a polygon uses."""
    columns = LONGITUDES.size
    faces: list[list[int]] = []
    middles: list[tuple[float, float]] = []
    widths = [_merged(float(lat)) for lat in LATITUDES]
    for row, lat in enumerate(LATITUDES):
        width = widths[row]
        south = min(width, widths[max(row - 1, 0)])
        north = min(width, widths[min(row + 1, LATITUDES.size - 1)])
        for west in range(0, columns, width):
            lower = [row * columns + column % columns for column in range(west, west + width + 1, south)]
            upper = [(row + 1) * columns + column % columns for column in range(west + width, west - 1, -north)]
            faces.append([*lower, *upper])
            middles.append((STEP * (west + width / 2.0), float(lat)))
    return _sea_only(faces, np.array(middles))


def _sea_only(faces: list[list[int]], middles: Numbers) -> Web:
    """The faces whose middle lies at sea, shuffled, on the nodes they use."""
    columns = LONGITUDES.size
    order = _shuffled(len(faces))
    order = order[sea_floor_depth(middles[order, 0], middles[order, 1]) > 0.0]
    most = max(len(face) for face in faces)
    table = np.array([faces[one] + [-1] * (most - len(faces[one])) for one in order], dtype=np.int64)
    used = np.unique(table[table >= 0])
    table = np.where(table < 0, -1, np.searchsorted(used, table))
    lon, lat = STEP * (used % columns), -90.0 + STEP * (used // columns)
    return Web(lon.astype(np.float64), lat.astype(np.float64), table, eastward(middles[order, 0]), middles[order, 1])


def _topology(web: Web, start: Literal[0, 1], places: dict[str, str]) -> dict[str, xr.Variable]:
    """The UGRID variables of a web: topology, connectivity from `start`, and nodes."""
    gaps = bool(np.any(web.faces < 0))
    says: dict[str, object] = {"cf_role": "face_node_connectivity", "start_index": np.int32(start)}
    if gaps:
        says["_FillValue"] = np.int32(-999)
    numbers = np.where(web.faces < 0, -999, web.faces + start).astype(np.int32)
    mesh = {"cf_role": "mesh_topology", "long_name": "topology of the mesh", "topology_dimension": np.int32(2),
            "node_coordinates": "node_lon node_lat", "face_node_connectivity": "face_nodes", **places}
    return {
        "mesh": xr.Variable((), np.int32(0), mesh),
        "face_nodes": xr.Variable(("face", "face_corner"), numbers, says),
        "node_lon": xr.Variable("node", web.lon, LONGITUDE),
        "node_lat": xr.Variable("node", web.lat, LATITUDE),
    }


def triangles(start: Literal[0, 1] = 0) -> Mesh:
    """The ocean at the nodes of triangles, with UGRID topology counted from `start`."""
    web = triangle_web()
    says = {"mesh": "mesh", "location": "node", "coordinates": "node_lat node_lon"}
    return Mesh(("node",), eastward(web.lon), web.lat, _topology(web, start, {}), says)


def polygons(start: Literal[0, 1] = 1) -> Mesh:
    """The ocean in the middles of polygons of four to eight corners, with UGRID topology counted from `start`."""
    web = polygon_web()
    middles = {
        "face_lon": xr.Variable("face", web.face_lon, LONGITUDE), "face_lat": xr.Variable("face", web.face_lat, LATITUDE),
    }
    variables = {**_topology(web, start, {"face_coordinates": "face_lon face_lat"}), **middles}
    says = {"mesh": "mesh", "location": "face", "coordinates": "face_lat face_lon"}
    return Mesh(("face",), web.face_lon, web.face_lat, variables, says, web.corners())


def bounded_cells(units: Literal["degrees", "radians"] = "degrees") -> Mesh:
    """The same polygons in plain CF: centres and corners of each cell as coordinates with bounds, no topology."""
    web = polygon_web()
    lon, lat = web.corners()
    beside = lon + 360.0 * np.round((web.face_lon[:, None] - lon) / 360.0)
    turn = np.radians if units == "radians" else np.asarray
    plain = {"lon": {**LONGITUDE, "bounds": "lon_vertices"}, "lat": {**LATITUDE, "bounds": "lat_vertices"}}
    if units == "radians":
        for attributes in plain.values():
            attributes["units"] = "radian"
    variables = {
        "lon": xr.Variable("cell", turn(web.face_lon), plain["lon"]),
        "lat": xr.Variable("cell", turn(web.face_lat), plain["lat"]),
        "lon_vertices": xr.Variable(("cell", "vertices"), turn(beside)),
        "lat_vertices": xr.Variable(("cell", "vertices"), turn(lat)),
    }
    return Mesh(("cell",), web.face_lon, web.face_lat, variables, {"coordinates": "lat lon"}, (lon, lat))
