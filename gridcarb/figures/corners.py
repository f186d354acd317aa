"""Corners of cells: from bounds, from the topology of a mesh, or halfway between the centres. Degrees throughout."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.axes import Axes

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]
Mask = npt.NDArray[np.bool_]

_NOWHERE = 1e10
"""Positions beyond this are fill values, whatever the attributes say."""

_PLACES = 3_600_000
"""Steps of a full turn within which two centres are one place: 1e-4 degrees."""

_MANY = 4
"""No grid repeats a cell more often (fold and halo together): a place told more often stands for cells without one."""


@dataclass(frozen=True)
class Patches:
    """Pieces of cells, with their corners in order around them.

    longitudes, latitudes : (pieces, corners), NaN for a piece without a place; spare corners repeat the first.
    cells : the cell (flat index) each piece belongs to.
    """

    longitudes: Floats
    latitudes: Floats
    cells: Indices


def degrees(coordinate: xr.DataArray) -> Floats:
    """Positions in degrees, decoded or raw; NaN where there is none."""
    attrs = coordinate.attrs
    values: Floats = np.array(coordinate.values, dtype=np.float64)
    for key in ("_FillValue", "missing_value"):
        if key in attrs:
            values[np.isin(values, np.asarray(attrs[key], dtype=coordinate.dtype).astype(np.float64))] = np.nan
    values = values * float(attrs.get("scale_factor", 1.0)) + float(attrs.get("add_offset", 0.0))
    values[~(np.abs(values) < _NOWHERE)] = np.nan
    return np.degrees(values) if str(attrs.get("units", "")).startswith("rad") else values


def bounds_of(ds: xr.Dataset, coordinate: xr.DataArray) -> Floats | None:
    """(..., corners) of a coordinate, None where it has no bounds."""
    name = {**coordinate.encoding, **coordinate.attrs}.get("bounds")
    if name is None or name not in ds.variables:
        return None
    bounds = ds[name].transpose(*coordinate.dims, ...)
    inherited = {key: coordinate.attrs[key] for key in ("units",) if key in coordinate.attrs}
    return degrees(bounds.assign_attrs({**inherited, **bounds.attrs}))


def places(longitude: Floats, latitude: Floats) -> npt.NDArray[np.int64]:
    """A number for each place of centres (cells,): equal where two cells lie on one another; -1 where there is none.

    A place that is told for more cells than a grid can repeat, or zero north and east for several, is none.
    """
    known = np.isfinite(longitude) & np.isfinite(latitude)
    east = np.round(np.where(known, longitude, 0.0) % 360 * (_PLACES / 360)).astype(np.int64) % _PLACES
    north = np.round((np.where(known, latitude, 0.0) + 90) * (_PLACES / 360)).astype(np.int64)
    found = np.where(known, north * _PLACES + east, -1)
    numbers, inverse, counts = np.unique(found, return_inverse=True, return_counts=True)
    origin = np.round(90 * (_PLACES / 360)) * _PLACES
    stand_in = (counts > _MANY) | ((numbers == origin) & (counts > 1))
    found[stand_in[inverse]] = -1
    return found


def patches_of(ds: xr.Dataset, axes: Axes, longitude: xr.DataArray, latitude: xr.DataArray, known: Mask) -> Patches | None:
    """The cells of a grid that is not rectilinear; None where nothing tells their outlines.

    known : (cells,) which centres are places; the others are left out where corners are derived from centres.
    """
    east, north = bounds_of(ds, longitude), bounds_of(ds, latitude)
    if east is not None and north is not None and east.shape == north.shape:
        lon, lat = (side.reshape(-1, side.shape[-1]) for side in (east, north))
        return Patches(*_spares_filled(lon, lat), np.arange(lon.shape[0]))
    if len(axes.horizontal) == 2:
        shape = longitude.shape
        lon, lat = (np.where(known.reshape(shape), degrees(part), np.nan) for part in (longitude, latitude))
        return Patches(*_between(lon, lat), np.arange(lon.size))
    return _from_topology(ds, axes.horizontal[0])


def _spares_filled(lon: Floats, lat: Floats) -> tuple[Floats, Floats]:
    """Missing corners of a cell that has three others or more become its first one."""
    lost = ~(np.isfinite(lon) & np.isfinite(lat))
    spare = lost & ((~lost).sum(axis=1) >= 3)[:, None] & ~lost[:, :1]
    return np.where(spare, lon[:, :1], lon), np.where(spare, lat[:, :1], lat)


def _points(lon: Floats, lat: Floats) -> Floats:
    """(..., 3) on the unit sphere."""
    east, north = np.radians(lon), np.radians(lat)
    return np.stack([np.cos(north) * np.cos(east), np.cos(north) * np.sin(east), np.sin(north)], axis=-1)


def _positions(points: Floats) -> tuple[Floats, Floats]:
    lon = np.degrees(np.arctan2(points[..., 1], points[..., 0]))
    return lon, np.degrees(np.arctan2(points[..., 2], np.hypot(points[..., 0], points[..., 1])))


def _between(lon: Floats, lat: Floats) -> tuple[Floats, Floats]:
    """(cells, 4) corners halfway between the centres of a 2-D grid, averaged on the sphere; rims are extrapolated."""
    points = _points(lon, lat)
    for _ in range(2):  # the second round reaches cells that have neighbours along one dimension only
        points = _extended(points)
    for axis in (0, 1):
        first, last = np.take(points, [0], axis), np.take(points, [-1], axis)
        inner = (1, -2) if points.shape[axis] > 1 else (0, 0)
        second, before = (np.take(points, [place], axis) for place in inner)
        wide = np.concatenate([2 * first - second, points, 2 * last - before], axis)
        size = wide.shape[axis]
        points = (np.take(wide, range(size - 1), axis) + np.take(wide, range(1, size), axis)) / 2
    corners = []
    for node in _positions(points):
        around = np.stack([node[:-1, :-1], node[:-1, 1:], node[1:, 1:], node[1:, :-1]], axis=-1).reshape(-1, 4)
        corners.append(np.where(np.isfinite(lon).reshape(-1, 1), around, np.nan))
    return corners[0], corners[1]


def _extended(points: Floats) -> Floats:
    """Unknown points beside two known ones in a row carry that row on; the mean where several do."""
    total, count = np.zeros_like(points), np.zeros(points.shape[:2])
    for axis in (0, 1):
        for step in (1, -1):
            guess = 2 * _shifted(points, axis, step) - _shifted(points, axis, 2 * step)
            told = np.isfinite(guess[..., 0])
            total[told] += guess[told]
            count += told
    fresh = ~np.isfinite(points[..., 0]) & (count > 0)
    found = points.copy()
    found[fresh] = total[fresh] / count[fresh][:, None]
    return found


def _shifted(points: Floats, axis: int, step: int) -> Floats:
    """The neighbour `step` further along an axis of each point; NaN beyond the rim."""
    found = np.full_like(points, np.nan)
    size = points.shape[axis]
    target = [slice(None)] * points.ndim
    source = list(target)
    target[axis] = slice(max(-step, 0), size - max(step, 0))
    source[axis] = slice(max(step, 0), size - max(-step, 0))
    found[tuple(target)] = points[tuple(source)]
    return found


def _from_topology(ds: xr.Dataset, dim: str) -> Patches | None:
    """Faces, or the surroundings of nodes, of a UGRID mesh that has `dim`; None where there is no such mesh."""
    for mesh in ds.variables.values():
        connectivity = mesh.attrs.get("face_node_connectivity")
        nodes = str(mesh.attrs.get("node_coordinates", "")).split()
        if mesh.attrs.get("cf_role") != "mesh_topology" or not {connectivity, *nodes} <= ds.variables.keys():
            continue
        faces = _faces(ds[connectivity], str(mesh.attrs.get("face_dimension", ds[connectivity].dims[0])))
        lon, lat = _node_positions(ds, nodes)
        if dim == faces.dims[0]:
            return _face_patches(lon, lat, faces.values)
        if dim == ds[nodes[0]].dims[0]:
            return _node_patches(lon, lat, faces.values)
    return None


def _faces(connectivity: xr.DataArray, face_dim: str) -> xr.DataArray:
    """(face, corner) indices of nodes from 0, -1 for corners a face does not have."""
    table = connectivity.transpose(face_dim, ...) if face_dim in connectivity.dims else connectivity
    numbers = table.values.astype(np.float64)
    for key in ("_FillValue", "missing_value"):
        if key in table.attrs:
            numbers[numbers == float(np.ravel(table.attrs[key])[0])] = np.nan
    numbers -= float(table.attrs.get("start_index", 0))
    return xr.DataArray(np.where(numbers >= 0, numbers, -1).astype(np.intp), dims=table.dims)


def _node_positions(ds: xr.Dataset, names: list[str]) -> tuple[Floats, Floats]:
    east = next((name for name in names if "lon" in str(ds[name].attrs.get("standard_name", name)).lower()), names[0])
    north = next(name for name in reversed(names) if name != east or len(names) == 1)
    return degrees(ds[east]), degrees(ds[north])


def _face_patches(lon: Floats, lat: Floats, faces: Indices) -> Patches:
    full = np.where(faces >= 0, faces, faces[:, :1])
    return Patches(lon[full], lat[full], np.arange(full.shape[0]))


def _node_patches(lon: Floats, lat: Floats, faces: Indices) -> Patches:
    """Each face shared out among its corners: one has the part from itself to the middles of its sides and of the face."""
    has = faces >= 0
    full = np.where(has, faces, faces[:, :1])
    points = _points(lon[full], lat[full])
    middle = (points * has[..., None]).sum(axis=1, keepdims=True)
    after = np.roll(points, -1, axis=1)
    last = np.take_along_axis(points, (has.sum(axis=1) - 1)[:, None, None], axis=1)
    before = np.concatenate([last, points[:, :-1]], axis=1)
    parts = [points, points + after, np.broadcast_to(middle, points.shape), points + before]
    corners = np.stack(parts, axis=2)[has]
    east, north = _positions(corners)
    return Patches(east, north, full[has])
