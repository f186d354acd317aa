"""Meshes with two-dimensional coordinates: tripolar with its fold, bipolar, and about a rotated pole.

Both curvilinear families are one conformal map of the sphere. Seen from the north pole in stereographic projection, with
the parallel `CAP` as unit circle, two grid poles lie on that circle at opposite longitudes. A point with grid colatitude
t (0 at one pole, 180 degrees at the other) and grid longitude p lies at the complex place

    w = (cos(t/2) + sin(t/2) exp(i p)) / (cos(t/2) - sin(t/2) exp(i p)),

which is the circle itself for p = 90 degrees and the straight line between the poles (the fold) for p = 180 degrees.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Literal

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from synthetic_grids.landmarks import LATITUDES, LONGITUDES, STEP, eastward, settled
from synthetic_grids.plain_meshes import LATITUDE, LONGITUDE
from synthetic_grids.scene import Mesh
from synthetic_grids.sphere import Numbers, point

CAP = 60.0
"""Latitude of both grid poles, and of the edge of the tripolar cap."""

CAP_ROWS = 4
FOLD_LONGITUDE = 352.5
"""Degrees east of the grid pole from which the columns of the tripolar mesh are counted; a cell edge of the raster."""

SOUTHERN_FOLD_LONGITUDE = 262.5
"""The same for a fold in the south: this pole lies on Yskerra, the other at sea, and so does most of the fold."""

BIPOLE_LONGITUDE = 356.25
"""Degrees east of the first pole of the bipolar mesh: the meridians of the landmarks lie midway between its poles."""

ROTATED_POLE = (86.25, 60.0)
"""Degrees east and north of the pole of the rotated mesh; its central meridian is that of the landmarks."""


def between_poles(colatitude: Numbers, longitude: Numbers, origin: float) -> tuple[Numbers, Numbers]:
    """Degrees east and north of grid colatitudes and grid longitudes in degrees (see the module)."""
    t, p = np.broadcast_arrays(np.radians(colatitude), np.radians(longitude))
    first, second = np.cos(t / 2.0), np.sin(t / 2.0) * np.exp(1j * p)
    upper, lower = np.abs(first + second), np.abs(first - second)
    scale = np.tan(np.radians(90.0 - CAP) / 2.0)
    lat = 90.0 - 2.0 * np.degrees(np.arctan2(scale * upper, lower))
    lon = np.degrees(np.angle((first + second) * np.conj(first - second))) + origin
    return eastward(np.asarray(lon)), settled(np.asarray(lat))


def _corners(lon: Numbers, lat: Numbers) -> tuple[Numbers, Numbers]:
    """Corners (y, x, 4) of the cells between nodes (y + 1, x + 1), in the order of the node grid."""
    def four(nodes: Numbers) -> Numbers:
        return np.stack([nodes[:-1, :-1], nodes[:-1, 1:], nodes[1:, 1:], nodes[1:, :-1]], axis=-1)
    return four(lon), four(lat)


def _tripolar_at(columns: Numbers, rows: Numbers, origin: float) -> tuple[Numbers, Numbers]:
    """Degrees east and north at columns (degrees east of the fold's pole) and rows.

    Rows count cells: up to the edge of the cap a row is 7.5 degrees of latitude from the south pole on; above, it is
    grid longitude, of which 180 degrees is at the row `top`.
    """
    plain = round((90.0 + CAP) / STEP)
    around = np.mod(columns, 360.0)
    lon, lat = np.broadcast_arrays(around[None, :] + origin, (-90.0 + STEP * rows)[:, None])
    # The far half of the circle is the near half seen in the mirror of the line between the poles.
    far = around > 180.0
    capped = 90.0 * (1.0 + (rows - plain) / CAP_ROWS)
    cap_lon, cap_lat = between_poles(np.where(far, 360.0 - around, around)[None, :], capped[:, None], 0.0)
    cap_lon = np.where(far, -cap_lon, cap_lon) + origin
    in_cap = rows[:, None] > plain
    return eastward(np.where(in_cap, cap_lon, lon)), settled(np.where(in_cap, cap_lat, lat))


def tripolar(
    *, fold: Literal["edge", "centre"] = "edge", halo: bool = True, west: float = -280.0, south: bool = False,
    dims: tuple[str, str] = ("j", "i"), names: tuple[str, str] = ("latitude", "longitude"),
) -> Mesh:
    """A global tripolar mesh: the raster south of 60 degrees north, a cap with two poles above.

    fold : with "edge" the last row but one ends at the fold, and the last row is its mirror image; with "centre" a row
        lies on the fold, so that its right half repeats its left half, and the last row mirrors the row before it.
    halo : one more column on either side, copies of the column at the other end.
    west : longitudes in the file run from here over 360 degrees; -280 puts them on neither usual convention.
    south : the whole mesh upside down, the fold at the south pole and in the first rows. The northern fold lies on land
        from end to end, as the pole does; the southern one crosses water.
    """
    plain = round((90.0 + CAP) / STEP)
    count = LONGITUDES.size
    # A row centred on the fold makes the rows of the cap a little taller: half a row lies beyond it.
    tall = 1.0 if fold == "edge" else CAP_ROWS / (CAP_ROWS - 0.5)
    edges = np.concatenate([np.arange(float(plain)), plain + tall * np.arange(CAP_ROWS + 1.0)])
    row_middles = (edges[1:] + edges[:-1]) / 2.0
    columns = STEP * np.arange(count + 1.0)
    origin = SOUTHERN_FOLD_LONGITUDE if south else FOLD_LONGITUDE
    lon, lat = _tripolar_at(columns[:-1] + STEP / 2.0, row_middles, origin)
    corner_lon, corner_lat = _corners(*_tripolar_at(columns, edges, origin))
    mirrored = slice(-1, None) if fold == "edge" else slice(-2, -1)

    def with_fold(values: Numbers) -> Numbers:
        image = values[mirrored, ::-1]
        return np.concatenate([values, image if values.ndim == 2 else np.roll(image, 2, axis=-1)])

    repeats = np.zeros((edges.size, count), dtype=bool)
    repeats[-1] = True
    repeats[-2, count // 2:] = fold == "centre"
    arrays = [with_fold(values) for values in (lon, lat, corner_lon, corner_lat)]
    if halo:
        arrays = [np.concatenate([values[:, -1:], values, values[:, :1]], axis=1) for values in arrays]
        repeats = np.pad(repeats, ((0, 0), (1, 1)), constant_values=True)
    if south:
        # Upside down, corners would run clockwise: they are taken in the other order.
        arrays = [turned if turned.ndim == 2 else turned[..., ::-1] for turned in (values[::-1] for values in arrays)]
        arrays[1::2] = [-latitudes for latitudes in arrays[1::2]]
        repeats = repeats[::-1]
    return plane(*arrays, dims=dims, names=names, west=west, repeats=repeats)


def bipolar() -> Mesh:
    """A global mesh with two poles, both on land at 60 degrees north, as a mesh of 25 rows from pole to pole.

    Its grid longitudes are spaced so that cells of the middle row meet the raster along the landmarks' meridians.
    """
    scale = np.tan(np.radians(90.0 - CAP) / 2.0)

    def turned(latitudes: Numbers) -> Numbers:
        return np.asarray(np.degrees(2.0 * np.arctan2(scale, np.tan(np.radians(90.0 - latitudes) / 2.0))))

    near, near_edges = turned(LATITUDES), turned(np.linspace(-90.0, 90.0, LATITUDES.size + 1))
    longitude = np.concatenate([near, 360.0 - near[::-1]])
    edges = np.concatenate([near_edges, 360.0 - near_edges[-2::-1]])
    colatitude_edges = np.linspace(180.0, 0.0, 26)
    colatitude = (colatitude_edges[1:] + colatitude_edges[:-1]) / 2.0
    lon, lat = between_poles(colatitude[:, None], longitude[None, :], BIPOLE_LONGITUDE)
    nodes = between_poles(colatitude_edges[:, None], edges[None, :], BIPOLE_LONGITUDE)
    return plane(lon, lat, *_corners(*nodes), dims=("y", "x"), names=("lat", "lon"), west=-180.0)


def _unrotated(grid_longitude: Numbers, grid_latitude: Numbers) -> tuple[Numbers, Numbers]:
    """Degrees east and north of rotated coordinates."""
    pole_lon, pole_lat = ROTATED_POLE
    where = point(grid_longitude, grid_latitude)
    tilt = np.radians(90.0 - pole_lat)
    x = np.cos(tilt) * where.x - np.sin(tilt) * where.z
    z = np.sin(tilt) * where.x + np.cos(tilt) * where.z
    lat = np.degrees(np.arctan2(z, np.hypot(x, where.y)))
    return eastward(np.asarray(np.degrees(np.arctan2(where.y, x)) + pole_lon + 180.0)), settled(np.asarray(lat))


def rotated() -> Mesh:
    """A global mesh of equal steps about a rotated pole, with 1-D grid coordinates, a grid mapping and 2-D coordinates."""
    x, y = LONGITUDES + STEP / 2.0 - 180.0, LATITUDES
    lon, lat = _unrotated(x[None, :], y[:, None])
    node_x, node_y = np.append(x, x[-1] + STEP) - STEP / 2.0, np.linspace(-90.0, 90.0, y.size + 1)
    corners = _corners(*_unrotated(node_x[None, :], node_y[:, None]))
    mesh = plane(lon, lat, *corners, dims=("rlat", "rlon"), names=("lat", "lon"), west=0.0)
    grid_mapping = {"grid_mapping_name": "rotated_latitude_longitude", "grid_north_pole_longitude": ROTATED_POLE[0],
                    "grid_north_pole_latitude": ROTATED_POLE[1]}
    variables = {
        **mesh.variables,
        "rlat": xr.Variable("rlat", y, {"standard_name": "grid_latitude", "units": "degrees", "axis": "Y"}),
        "rlon": xr.Variable("rlon", x, {"standard_name": "grid_longitude", "units": "degrees", "axis": "X"}),
        "rotated_pole": xr.Variable((), np.int32(0), grid_mapping),
    }
    says = {**mesh.says, "grid_mapping": "rotated_pole"}
    return Mesh(mesh.dims, mesh.longitude, mesh.latitude, variables, says, mesh.corners)


def plane(
    lon: Numbers, lat: Numbers, corner_lon: Numbers, corner_lat: Numbers, *, dims: tuple[str, str], names: tuple[str, str],
    west: float, repeats: NDArray[np.bool_] | None = None,
) -> Mesh:
    """A mesh of 2-D coordinates with bounds; longitudes are written from `west` over 360 degrees."""
    y_name, x_name = names
    written = np.mod(lon - west, 360.0) + west
    # Corners are written on the side of their centre, as an exact multiple of 360 away.
    beside = corner_lon + 360.0 * np.round((written[..., None] - corner_lon) / 360.0)
    variables = {
        y_name: xr.Variable(dims, lat, {**LATITUDE, "bounds": f"{y_name}_vertices"}),
        x_name: xr.Variable(dims, written, {**LONGITUDE, "bounds": f"{x_name}_vertices"}),
        f"{y_name}_vertices": xr.Variable((*dims, "vertices"), corner_lat),
        f"{x_name}_vertices": xr.Variable((*dims, "vertices"), beside),
    }
    return Mesh(dims, lon, lat, variables, {"coordinates": f"{y_name} {x_name}"}, (corner_lon, corner_lat), repeats)


def without_land_coordinates(mesh: Mesh, land: NDArray[np.bool_], how: Literal["masked", "zero"]) -> Mesh:
    """The mesh with centres and corners of land cells missing (fill value 1e20) or zero in the file."""
    blank: Callable[[xr.Variable], xr.Variable] = _masked if how == "masked" else _zeroed
    variables = dict(mesh.variables)
    for name, variable in mesh.variables.items():
        if variable.dims[: len(mesh.dims)] == mesh.dims:
            away = land if variable.ndim == land.ndim else land[..., None]
            variables[name] = blank(variable.copy(data=np.where(away, np.nan, variable.values)))
    return Mesh(mesh.dims, mesh.longitude, mesh.latitude, variables, mesh.says, mesh.corners, mesh.repeats)


def _masked(variable: xr.Variable) -> xr.Variable:
    filled = variable.copy(data=np.nan_to_num(variable.values, nan=1e20))
    filled.attrs["_FillValue"] = 1e20
    return filled


def _zeroed(variable: xr.Variable) -> xr.Variable:
    return variable.copy(data=np.nan_to_num(variable.values, nan=0.0))
