"""Finding the axes of a dataset by its CF attributes, never by the order of dimensions.

Used by every stage, so that all of them agree on which dimension is time, which is the vertical, and what is left.
The evidence is weighed as the CF conventions rank it: standard_name and the `axis` attribute, then units and
`positive`, and names only where nothing else speaks (CF 1.11, chapters 4 and 5).
"""
from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Literal

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from gridcarb.errors import InputError

Numbers = NDArray[np.float64]
GridKind = Literal["rectilinear", "curvilinear", "unstructured", "column"]


@dataclass(frozen=True)
class Axes:
    """The axes of a dataset, in its own names.

    time, vertical : dimension names, None if there is no such dimension.
    horizontal : dimension names, (y, x) for maps, (cell,) for unstructured grids and stations, () for a single column.
    time_coordinate, vertical_coordinate, latitude, longitude : variable names; None where absent. The vertical
        coordinate may be a scalar (then `vertical` is None) or missing. The time coordinate may be a scalar, or lie along
        the cells of stations, casts and tracks, each with a moment of its own (then `time` is None).
    """

    time: str | None
    vertical: str | None
    horizontal: tuple[str, ...]
    time_coordinate: str | None
    vertical_coordinate: str | None
    latitude: str | None
    longitude: str | None

    @property
    def order(self) -> tuple[str, ...]:
        """Time, vertical, horizontal: the canonical order of dimensions."""
        return tuple(dim for dim in (self.time, self.vertical, *self.horizontal) if dim)


@dataclass(frozen=True)
class _Marks:
    """What gives a coordinate of one kind away; units are compared in lower case, names too."""

    axis: str
    standard_names: frozenset[str]
    units: re.Pattern[str]
    names: frozenset[str]


_NEVER = re.compile(r"(?!)")

_TIME = _Marks(
    axis="T", standard_names=frozenset({"time"}), units=re.compile(r"^\w+\s+since\s"),
    names=frozenset({"time", "t", "time_counter", "time_centered", "times", "date", "month", "months", "year", "record"}),
)
_VERTICAL = _Marks(
    axis="Z",
    standard_names=frozenset({
        "depth", "height", "altitude", "sea_water_pressure", "sea_water_pressure_due_to_sea_water",
        "depth_below_geoid", "height_above_geopotential_datum", "height_above_reference_ellipsoid",
        "height_above_mean_sea_level", "ocean_sigma_coordinate",
        "ocean_s_coordinate", "ocean_s_coordinate_g1", "ocean_s_coordinate_g2", "ocean_sigma_z_coordinate",
        "ocean_double_sigma_coordinate",
    }),
    units=re.compile(r"^(deci|hecto|kilo|m|d|h|k)?(bar|bars|pascal|pa)$"),
    names=frozenset({
        "depth", "depths", "deptht", "lev", "level", "levels", "olevel", "z", "z_t", "zt", "zlev", "z_l", "st_ocean",
        "gdept", "gdept_1d", "nav_lev", "s_rho", "sigma", "rc", "pressure", "pres", "height", "nz", "k", "layer",
    }),
)
_LATITUDE = _Marks(
    axis="", standard_names=frozenset({"latitude"}), units=re.compile(r"^degrees?_?n(orth)?$"),
    names=frozenset({
        "lat", "latitude", "nav_lat", "lats", "latitudes", "yc", "geolat", "geolat_t", "tlat", "lat_rho", "yt_ocean",
        "clat", "latcell", "gphit", "ulat", "plat", "mesh2d_face_y", "mesh2d_node_y",
    }),
)
_LONGITUDE = _Marks(
    axis="", standard_names=frozenset({"longitude"}), units=re.compile(r"^degrees?_?e(ast)?$"),
    names=frozenset({
        "lon", "longitude", "nav_lon", "lons", "longitudes", "xc", "geolon", "geolon_t", "tlong", "lon_rho", "xt_ocean",
        "clon", "loncell", "glamt", "ulong", "plon", "mesh2d_face_x", "mesh2d_node_x",
    }),
)
_Y = _Marks(
    axis="Y", standard_names=frozenset({"projection_y_coordinate", "grid_latitude"}), units=_NEVER,
    names=frozenset({"y", "j", "ny", "nj", "jm", "yh", "eta_rho", "nlat", "rlat"}) | _LATITUDE.names,
)
_X = _Marks(
    axis="X", standard_names=frozenset({"projection_x_coordinate", "grid_longitude"}), units=_NEVER,
    names=frozenset({"x", "i", "nx", "ni", "im", "xh", "xi_rho", "nlon", "rlon"}) | _LONGITUDE.names,
)
_CELL_DIMS = frozenset({
    "cell", "cells", "ncell", "ncells", "node", "nodes", "nnode", "nnodes", "nod2", "nod2d", "face", "faces", "nface",
    "nfaces", "nmesh2d_face", "nmesh2d_node", "mesh2d_face", "mesh2d_nface", "mesh2d_node", "mesh2d_nnode", "elem",
    "ncol", "cell_index", "points", "point", "obs", "station", "stations", "profile", "profiles", "cast", "casts", "column",
    "site",
})

_NAMED_ALONE = 1
"""The rank of a candidate for which only its name speaks."""


def find_axes(ds: xr.Dataset) -> Axes:
    """The axes of `ds`, which may be decoded or raw; only its header is read.

    The dimensions that must find a place are those of the data variables (coordinates, bounds and what other
    variables refer to are left aside). Dimensions of size 1 that are no axis are passed over.

    Raises
    ------
    InputError : a dimension of more than one step is neither time, nor vertical, nor horizontal.
    """
    survey = _Survey(ds)
    dims = survey.dims
    time_coordinate = survey.best(_TIME, dims, most=1)
    time = _dim_of(ds, time_coordinate) or _dim_named(dims, _TIME)
    if time and _is_track(survey, time):
        time = None
    rest = [dim for dim in dims if dim != time]
    latitude = survey.best(_LATITUDE, rest, most=2)
    longitude = survey.best(_LONGITUDE, rest, most=2)
    spherical = _join(ds, latitude, longitude)
    level_dims = [dim for dim in rest if dim not in spherical]
    vertical_coordinate = survey.best(_VERTICAL, level_dims, most=1)
    if vertical_coordinate is None or survey.only_counts(vertical_coordinate):
        vertical_coordinate = survey.best_field(_VERTICAL, dims, level_dims) or vertical_coordinate
    vertical = next((dim for dim in _dims(ds, vertical_coordinate) if dim in level_dims), None)
    vertical = vertical or _dim_named(level_dims, _VERTICAL)
    left = [dim for dim in level_dims if dim != vertical]
    _refuse_half_a_place(survey, latitude, longitude, left)
    horizontal = _horizontal(survey, spherical, left)
    _refuse_strangers(survey, [dim for dim in left if dim not in horizontal])
    return Axes(time, vertical, horizontal, time_coordinate, vertical_coordinate, latitude, longitude)


def grid_kind(ds: xr.Dataset, axes: Axes) -> GridKind:
    """Which kind of horizontal grid `axes` describes."""
    if not axes.horizontal:
        return "column"
    if len(axes.horizontal) == 1:
        return "unstructured"
    plane = axes.latitude is not None and ds[axes.latitude].ndim == 2
    return "curvilinear" if plane else "rectilinear"


def edges_between(centres: Numbers) -> Numbers:
    """Edges (n, 2) halfway between neighbouring centres (n >= 2, in any order); the outer as far out as the inner."""
    order = np.argsort(centres, kind="stable")
    middles = (centres[order][:-1] + centres[order][1:]) / 2.0
    first, last = centres[order[[0, -1]]]
    edges = np.concatenate([[2.0 * first - middles[0]], middles, [2.0 * last - middles[-1]]])
    found = np.empty((centres.size, 2))
    found[order] = np.stack([edges[:-1], edges[1:]], axis=-1)
    return found


def on_one_turn(longitude: Numbers) -> Numbers:
    """Centres (n,) in degrees moved by whole turns, so that neighbours on the map are neighbours in number.

    Where they do not go around in order, the turn begins behind the widest gap.
    """
    turned = np.unwrap(longitude, period=360.0)
    if (np.diff(turned) >= 0.0).all() or (np.diff(turned) <= 0.0).all():
        return turned
    around = np.sort(longitude % 360.0)
    widest = int(np.argmax(np.diff(around, append=around[0] + 360.0)))
    begin = around[(widest + 1) % around.size]
    return np.asarray(begin + (longitude - begin) % 360.0)


class _Survey:
    """What the header of a dataset says, gathered once."""

    def __init__(self, ds: xr.Dataset) -> None:
        self.ds = ds
        self.names = [str(name) for name in ds.variables]
        self.bounds = set(_referred(ds, ("bounds", "climatology")))
        self.pointed = set(_referred(ds, ("coordinates",)))
        aside = self.bounds | self.pointed | {str(name) for name in ds.coords}
        aside |= set(_referred(ds, ("cell_measures", "grid_mapping", "formula_terms", "ancillary_variables")))
        aside |= _parts_of_meshes(ds)
        aside |= {name for name in self.names if self._is_coordinate(name)}
        self.data = [name for name in self.names if name not in aside and ds.variables[name].ndim]
        basis = self.data or [name for name in self.names if name not in self.bounds]
        self.dims = list(dict.fromkeys(str(dim) for name in basis for dim in ds.variables[name].dims))

    def _is_coordinate(self, name: str) -> bool:
        """A coordinate that no variable points at, known by more than its name."""
        variable = self.ds.variables[name]
        marks = (_TIME, _VERTICAL) if variable.ndim == 1 else ()
        planes = (_LATITUDE, _LONGITUDE) if variable.ndim in (1, 2) else ()
        return any(self.rank(name, kind) > _NAMED_ALONE for kind in (*marks, *planes))

    def rank(self, name: str, marks: _Marks) -> int:
        """How strongly the variable looks like a coordinate of this kind; 0: not at all."""
        variable = self.ds.variables[name]
        attrs = {**variable.encoding, **variable.attrs}
        standard_name = str(attrs.get("standard_name", "")).strip()
        named = standard_name in marks.standard_names
        stranger = bool(standard_name) and not named
        units = not stranger and bool(marks.units.match(str(attrs.get("units", "")).strip().lower()))
        if marks is _TIME and (units or (not stranger and self._holds_dates(name))):
            # Only such a variable says when; one without may be a bare counter, whatever else it is called.
            return 6
        if named:
            return 5
        if marks.axis and str(attrs.get("axis", "")).strip().upper() == marks.axis:
            return 4
        if units:
            return 3
        floor = standard_name.startswith("sea_floor_depth")
        if marks is _VERTICAL and "positive" in attrs and not floor and (name in variable.dims or name in self.ds.coords):
            return 2
        known = name in variable.dims or name in self.ds.coords or name in self.pointed or marks in (_LATITUDE, _LONGITUDE)
        return _NAMED_ALONE if known and not stranger and name.lower() in marks.names else 0

    def _holds_dates(self, name: str) -> bool:
        return self.ds.variables[name].dtype.kind == "M" or isinstance(self.ds.indexes.get(name), xr.CFTimeIndex)

    def best(self, marks: _Marks, dims: list[str], most: int) -> str | None:
        """The likeliest coordinate with at most `most` dimensions, all among `dims`; scalars come last.

        Of two times that tell dates, the one of its own dimension is taken. Elsewhere such a coordinate may be a bare
        counter, and one that the data variables point at goes first.
        """
        found = []
        for place, name in enumerate(self.names):
            variable = self.ds.variables[name]
            rank = 0 if name in self.bounds else self.rank(name, marks)
            if rank and variable.ndim <= most and set(variable.dims) <= set(dims):
                own, pointed = name in variable.dims, name in self.pointed
                evidence = (rank, own, pointed) if marks is _TIME else (pointed, rank, variable.ndim, own)
                found.append((variable.ndim > 0, evidence, -place, name))
        return max(found)[-1] if found else None

    def only_counts(self, name: str) -> bool:
        """Whether a vertical coordinate may number the levels: it says neither units nor what it is."""
        attrs = {**self.ds.variables[name].encoding, **self.ds.variables[name].attrs}
        units = str(attrs.get("units", "")).strip().lower()
        speaks = "formula_terms" in attrs or attrs.get("standard_name") in _VERTICAL.standard_names
        return not speaks and units in ("", "1", "level", "levels", "layer", "layers", "count")

    def best_field(self, marks: _Marks, dims: list[str], level_dims: list[str]) -> str | None:
        """A vertical coordinate with several dimensions (depths that differ from column to column)."""
        for name in self.names:
            own = set(self.ds.variables[name].dims)
            pointed = name in self.pointed or name in self.ds.coords
            fits = len(own) > 1 and own <= set(dims) and len(own & set(level_dims)) == 1
            if pointed and fits and self.rank(name, marks):
                return name
        return None


def _parts_of_meshes(ds: xr.Dataset) -> set[str]:
    """Nodes and connectivities of UGRID meshes, which lie on places of their own."""
    found: set[str] = set()
    for name, variable in ds.variables.items():
        if variable.attrs.get("cf_role") == "mesh_topology":
            keys = [key for key in variable.attrs if str(key).endswith(("_coordinates", "_connectivity"))]
            words = " ".join(str(variable.attrs[key]) for key in keys).split()
            found |= {str(name), *(word for word in words if word in ds.variables)}
    return found


def _referred(ds: xr.Dataset, keys: Iterable[str]) -> list[str]:
    """Names of variables that attributes of others point at."""
    words: list[str] = []
    for variable in ds.variables.values():
        for key in keys:
            text = variable.attrs.get(key, variable.encoding.get(key))
            words += re.split(r"\s+", text.strip()) if isinstance(text, str) else []
    return [word for word in words if word in ds.variables]


def _dims(ds: xr.Dataset, name: str | None) -> tuple[str, ...]:
    return tuple(str(dim) for dim in ds.variables[name].dims) if name else ()


def _dim_of(ds: xr.Dataset, name: str | None) -> str | None:
    dims = _dims(ds, name)
    return dims[0] if dims else None


def _is_track(survey: _Survey, dim: str) -> bool:
    """Whether each step along `dim` is a place of its own: casts and tracks, with latitudes and longitudes along it."""
    placed = [survey.best(marks, [dim], most=1) for marks in (_LATITUDE, _LONGITUDE)]
    return all(name is not None and survey.ds.variables[name].dims == (dim,) for name in placed)


def _dim_named(dims: list[str], marks: _Marks) -> str | None:
    """A dimension without a coordinate variable that bears a name of this kind."""
    return next((dim for dim in dims if dim.lower() in marks.names), None)


def _join(ds: xr.Dataset, latitude: str | None, longitude: str | None) -> tuple[str, ...]:
    return tuple(dict.fromkeys((*_dims(ds, latitude), *_dims(ds, longitude))))


def _horizontal(survey: _Survey, spherical: tuple[str, ...], left: list[str]) -> tuple[str, ...]:
    """(y, x), (cell,) or (): from latitude and longitude, else from what is known of the dimensions left over."""
    if spherical:
        return spherical
    sides = {dim: _side(survey, dim) for dim in left}
    return tuple(sorted((dim for dim in left if sides[dim] is not None), key=lambda dim: sides[dim] or 0))


def _side(survey: _Survey, dim: str) -> int | None:
    """0 for y or cells, 1 for x, None for a dimension that is not known to be horizontal."""
    for side, marks in enumerate((_Y, _X)):
        marked = dim in survey.names and survey.rank(dim, marks) > 0
        if marked or dim.lower() in marks.names:
            return side
    return 0 if dim.lower() in _CELL_DIMS else None


def _refuse_half_a_place(survey: _Survey, latitude: str | None, longitude: str | None, left: list[str]) -> None:
    """A dimension of a map is left over and one of its two coordinates is missing: the message speaks of that."""
    long = [dim for dim in left if survey.ds.sizes[dim] > 1 and _side(survey, dim) is not None]
    if not long or (latitude is None) == (longitude is None):
        return
    absent, units = ("latitude", "degrees_north") if latitude is None else ("longitude", "degrees_east")
    raise InputError(
        f"there is no {absent} along the dimension '{long[0]}', only the other coordinate '{latitude or longitude}'",
        where="dimension " + long[0], mend=f"give the files a coordinate along '{long[0]}' with units {units}",
    )


def _refuse_strangers(survey: _Survey, left: list[str]) -> None:
    strangers = [dim for dim in left if survey.ds.sizes[dim] > 1]
    if not strangers:
        return
    dim = strangers[0]
    holders = [name for name in survey.data if dim in survey.ds.variables[name].dims]
    raise InputError(
        f"the dimension '{dim}' (size {survey.ds.sizes[dim]}) is neither time, nor vertical, nor horizontal",
        where="variable " + ", ".join(holders[:6]) if holders else "",
        mend=f"give files that hold one step of '{dim}' each, or a coordinate variable '{dim}' with an `axis` attribute "
        "(T, Z, Y or X) if it is one of these",
    )
