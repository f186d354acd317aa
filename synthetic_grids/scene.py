"""A scene: the ocean on one mesh, at one set of depths and times, ready to be written, and the truth beside it.

A scene is put together from three parts, each with the variables a file needs for it: a `Mesh` (where on the map), an
`Upright` (how deep) and a `Times` (when). What the ocean is asked is always the same canonical numbers: degrees from 0
to 360 east, metres down, decimal years. So the same place, depth and time has the same value to the last bit in every
scene, and with the `LOSSLESS` clothes in every file.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from synthetic_grids.clothes import MODEL_NAMES, Clothes, dress
from synthetic_grids.grids import sample
from synthetic_grids.ocean import TRACERS
from synthetic_grids.sphere import Numbers

Point = tuple[float, float, float, float]
"""Degrees east (0 to 360), degrees north, depth in m, decimal year."""

LOSSLESS = Clothes(temperature="in situ", salinity="practical", tracer_units="umol kg-1", precision="float64")
"""Nothing to convert and nothing rounded: what is in the file is the truth itself."""

ATTRIBUTES = {
    "Conventions": "CF-1.11",
    "title": "An invented ocean on one of many kinds of grid",
    "institution": "none: this ocean does not exist",
    "source": "synthetic_grids: formulas of position, depth and time",
    "history": "written by synthetic_grids",
    "references": "the documentation of the package synthetic_grids",
    "comment": "The geography is invented.",
    "geography": "invented",
}


@dataclass(frozen=True)
class Mesh:
    """Where on the map.

    dims : names of the horizontal dimensions, () for a single column.
    longitude, latitude : centres on `dims`, degrees east from 0 to 360 and degrees north.
    variables : coordinates, bounds, topology, as the file has them.
    says : attributes that every tracer carries for the mesh.
    corners : degrees east and north (*dims, corner), or None; anticlockwise.
    repeats : True where a cell is the copy of another (halo, fold).
    """

    dims: tuple[str, ...]
    longitude: Numbers
    latitude: Numbers
    variables: Mapping[str, xr.Variable]
    says: Mapping[str, str] = field(default_factory=dict)
    corners: tuple[Numbers, Numbers] | None = None
    repeats: NDArray[np.bool_] | None = None

    def field(self, values: Numbers) -> xr.DataArray:
        """Values on the horizontal dims."""
        return xr.DataArray(values, dims=self.dims)


@dataclass(frozen=True)
class Upright:
    """How deep: depths in m, positive down, on any dims, and what the file has for them.

    bounds : upper and lower edge of the levels in m (level, 2), where the levels are the same everywhere.
    """

    depth: xr.DataArray
    variables: Mapping[str, xr.Variable]
    says: Mapping[str, str] = field(default_factory=dict)
    bounds: xr.DataArray | None = None


@dataclass(frozen=True)
class Times:
    """When: decimal years on the dim of time or none, and what the file has for them."""

    year: xr.DataArray
    variables: Mapping[str, xr.Variable]
    says: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True)
class Scene:
    """The dataset exactly as it is to be written, and the truth of every cell.

    truth : the tracers of `ocean.TRACERS` in float64 (NaN where there is no water) on the dims (time, level, horizontal)
        that exist, with the coordinates of each cell as variables longitude, latitude, depth and year.
    """

    dataset: xr.Dataset
    truth: xr.Dataset
    mesh: Mesh
    upright: Upright
    times: Times

    def with_dataset(self, dataset: xr.Dataset) -> Scene:
        """The same truth in other clothes."""
        return replace(self, dataset=dataset)

    def points(self) -> Iterator[tuple[tuple[int, ...], Point]]:
        """Index along the dims of the truth, and place, depth and time, of every cell with water.

        Cells that repeat another are passed over.
        """
        wet = self.truth["salinity"].notnull()
        if self.mesh.repeats is not None:
            wet = wet & ~xr.DataArray(self.mesh.repeats, dims=self.mesh.dims)
        where = [self.truth[name].broadcast_like(wet).transpose(*wet.dims).values
                 for name in ("longitude", "latitude", "depth", "year")]
        for index in zip(*np.nonzero(np.atleast_1d(wet.values)), strict=True):
            cell = tuple(int(number) for number in index) if wet.ndim else ()
            lon, lat, depth, year = (float(values[cell]) for values in where)
            yield cell, (lon, lat, depth, year)

    def cells(self) -> dict[Point, tuple[int, ...]]:
        """Point -> index: two scenes are compared at the points that both have."""
        return {point: index for index, point in self.points()}


def attributes_together(*parts: Mapping[str, str]) -> dict[str, str]:
    """Attributes of several parts; the words of `coordinates` and `cell_methods` are joined."""
    together: dict[str, str] = {}
    for part in parts:
        for key, text in part.items():
            joined = key in together and key in ("coordinates", "cell_methods")
            together[key] = f"{together[key]} {text}" if joined else text
    return together


def stage(mesh: Mesh, upright: Upright, times: Times, clothes: Clothes = LOSSLESS) -> Scene:
    """The scene of a mesh, depths and times; every variable but those of dimensions is a plain one, named by attributes."""
    longitude, latitude = mesh.field(mesh.longitude), mesh.field(mesh.latitude)
    truth = sample(longitude, latitude, upright.depth, times.year)
    dressed = dress(truth, upright.depth, latitude, clothes)
    says = attributes_together(times.says, upright.says, mesh.says)
    for name in clothes.names.values():
        dressed[name].attrs |= says
    found = dressed.assign({**times.variables, **upright.variables, **mesh.variables}).assign_attrs(ATTRIBUTES)
    truth = truth.assign(longitude=longitude, latitude=latitude, depth=upright.depth, year=times.year)
    return Scene(found, truth, mesh, upright, times)


def tracers(dataset: xr.Dataset) -> list[str]:
    """The names of the tracers in a dataset, whatever model names they bear."""
    return [name for name in MODEL_NAMES.values() if name in dataset]


def same_values(one: Scene, other: Scene) -> int:
    """How many points two scenes share, after checking that every tracer is the same there to the last bit.

    Raises
    ------
    AssertionError : a value differs; says which.
    """
    mine, theirs = one.cells(), other.cells()
    shared = [point for point in mine if point in theirs]
    for key in TRACERS:
        left, right = one.truth[key].values, other.truth[key].values
        for point in shared:
            if left[mine[point]] != right[theirs[point]]:
                raise AssertionError(f"{key} differs at {point}")
    return len(shared)
