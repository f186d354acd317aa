"""The ocean's parametric vertical coordinates of the CF conventions, with their formula terms.

The models behind them know a sea floor of whole metres, no deeper than 1024 m, and a sea surface that rises and falls
with place and time (not at all in the first of the months). At landmarks, where the floor is 1024 m, all terms are
exact in binary: whatever the order of the arithmetic, the levels come out at `landmarks.DEPTHS` to the last bit. The
exception is the stretched s-coordinate, which takes hyperbolic functions: its terms are right to some 1e-12 m.

The formulas are those of CF 1.11, appendix D; z is the height above the datum, so the depth of a cell is -z.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
import xarray as xr

from synthetic_grids.geography import sea_floor_depth
from synthetic_grids.landmarks import DEPTHS
from synthetic_grids.scene import Mesh, Times, Upright
from synthetic_grids.sphere import Numbers

DEEPEST = 1024.0
LEVEL = "layer"
DOWN = np.array([*DEPTHS, 896.0])
"""Depths of the layers where the floor is deepest."""

STRETCHING = (4.0, 0.75)
"""Parameters a and b of the stretched s-coordinate."""

SHALLOW = 16.0
"""Critical depth of the stretched s-coordinate and lower half depth of the double sigma coordinate, in m."""

DATUM = "mean_sea_level"
"""What heights are counted from, as the standard names say it."""

Variables = dict[str, xr.Variable]


@dataclass(frozen=True)
class Model:
    """What the formulas take: floor (horizontal) in m and sea surface (time, horizontal) in m."""

    floor: xr.DataArray
    surface: xr.DataArray

    def terms(self) -> Variables:
        """The two as the file has them."""
        floor = {"standard_name": f"sea_floor_depth_below_{DATUM}", "long_name": "depth of the sea floor", "units": "m"}
        surface = {"standard_name": f"sea_surface_height_above_{DATUM}", "long_name": "sea surface height", "units": "m"}
        return {"floor": _filled(self.floor, floor), "surface": _filled(self.surface, surface)}


def _filled(values: xr.DataArray, attributes: Mapping[str, str]) -> xr.Variable:
    return xr.Variable(values.dims, np.nan_to_num(values.values, nan=1e20), {**attributes, "_FillValue": 1e20})


def model(mesh: Mesh, times: Times, *, still: bool = False) -> Model:
    """Floor min(f, 1024) in whole metres; surface floor / 1024 m times the number of the month and a wave over the map.

    The wave is round(8 sin(lon) cos(lat)) / 8. A `still` surface is zero and has no time.
    """
    deep = sea_floor_depth(mesh.longitude, mesh.latitude)
    floor = mesh.field(np.where(deep > 0.0, np.floor(np.minimum(deep, DEEPEST)), np.nan))
    if still:
        return Model(floor, 0.0 * floor)
    lon, lat = np.radians(mesh.longitude), np.radians(mesh.latitude)
    wave = mesh.field(np.round(8.0 * np.sin(lon) * np.cos(lat)) / 8.0)
    month = xr.DataArray(np.arange(times.year.size, dtype=np.float64).reshape(times.year.shape), dims=times.year.dims)
    return Model(floor, month * wave * floor / DEEPEST)


def _coordinate(values: Numbers, kind: str, terms: Mapping[str, str], positive: str = "up") -> xr.Variable:
    """The coordinate variable with its formula terms."""
    words = " ".join(f"{term}: {name}" for term, name in terms.items())
    attributes = {"standard_name": kind, "long_name": kind.replace("_", " "), "units": "1", "positive": positive,
                  "axis": "Z", "formula_terms": words}
    if kind != "ocean_double_sigma_coordinate":
        attributes["computed_standard_name"] = f"height_above_{DATUM}"
    return xr.Variable(LEVEL, values, attributes)


def _scalar(value: float, long_name: str, units: str = "m") -> xr.Variable:
    return xr.Variable((), np.float64(value), {"long_name": long_name, "units": units})


def _line(values: Numbers) -> xr.DataArray:
    return xr.DataArray(values, dims=LEVEL)


def sigma(mesh: Mesh, times: Times, *, still: bool = False) -> Upright:
    """z = eta + sigma (floor + eta), with bounds that have formula terms of their own."""
    known = model(mesh, times, still=still)
    values = -DOWN / DEEPEST
    edges = np.concatenate([[0.0], (values[1:] + values[:-1]) / 2.0, [-1.0]])
    terms = {"sigma": LEVEL, "eta": "surface", "depth": "floor"}
    coordinate = _coordinate(values, "ocean_sigma_coordinate", terms)
    coordinate.attrs["bounds"] = f"{LEVEL}_bnds"
    of_bounds = {"formula_terms": f"sigma: {LEVEL}_bnds eta: surface depth: floor"}
    bounds = xr.Variable((LEVEL, "bnds"), np.stack([edges[:-1], edges[1:]], axis=-1), of_bounds)
    z = known.surface + _line(values) * (known.floor + known.surface)
    return Upright(-z, {**known.terms(), LEVEL: coordinate, f"{LEVEL}_bnds": bounds})


def _stretched(s: Numbers) -> Numbers:
    """C(s) = (1 - b) sinh(a s) / sinh(a) + b (tanh(a (s + 1/2)) / (2 tanh(a / 2)) - 1/2)."""
    a, b = STRETCHING
    inner = np.tanh(a * (s + 0.5)) / (2.0 * np.tanh(0.5 * a)) - 0.5
    return np.asarray((1.0 - b) * np.sinh(a * s) / np.sinh(a) + b * inner)


def _levels_of(depths: Numbers, depth_of: Callable[[Numbers], Numbers]) -> Numbers:
    """The s in -1 to 0 at which a falling function of s has given values, by halving."""
    low, high = np.full(depths.shape, -1.0), np.zeros(depths.shape)
    for _ in range(60):
        middle = (low + high) / 2.0
        deeper = depth_of(middle) > depths
        low, high = np.where(deeper, middle, low), np.where(deeper, high, middle)
    return (low + high) / 2.0


def stretched(mesh: Mesh, times: Times) -> Upright:
    """z = eta (1 + s) + depth_c s + (floor - depth_c) C(s)."""
    known = model(mesh, times)

    values = _levels_of(DOWN, lambda s: -(SHALLOW * s + (DEEPEST - SHALLOW) * _stretched(s)))
    s, c = _line(values), _line(_stretched(values))
    z = known.surface * (1.0 + s) + SHALLOW * s + (known.floor - SHALLOW) * c
    depth = (-z).where(np.abs(z - z.round()) > 1e-9, -z.round())
    a, b = STRETCHING
    terms = {"s": LEVEL, "eta": "surface", "depth": "floor", "a": "stretch", "b": "share", "depth_c": "critical"}
    return Upright(depth, {
        **known.terms(), LEVEL: _coordinate(values, "ocean_s_coordinate", terms),
        "stretch": _scalar(a, "stretching of the layers", "1"), "share": _scalar(b, "share stretched to the floor", "1"),
        "critical": _scalar(SHALLOW, "critical depth"),
    })


GAP = 2.0**-9
"""How far s and C(s) of the generic s-coordinates lie apart from the share of the depth they make together."""


def generic(number: int, mesh: Mesh, times: Times) -> Upright:
    """The s-coordinates with a stretching curve C given in the file, critical depths 512 m (g1) and 1024 m (g2).

    g1: S = depth_c s + (floor - depth_c) C, z = S + eta (1 + S / floor);
    g2: S = (depth_c s + floor C) / (depth_c + floor), z = eta + (eta + floor) S.
    """
    known = model(mesh, times)
    share = -DOWN / DEEPEST
    values, curve = share - GAP, share + GAP
    critical = 512.0 if number == 1 else 1024.0
    s, c = _line(values), _line(curve)
    if number == 1:
        still = critical * s + (known.floor - critical) * c
        z = still + known.surface * (1.0 + still / known.floor)
    else:
        still = (critical * s + known.floor * c) / (critical + known.floor)
        z = known.surface + (known.surface + known.floor) * still
    terms = {"s": LEVEL, "C": "curve", "eta": "surface", "depth": "floor", "depth_c": "critical"}
    return Upright(-z, {
        **known.terms(), LEVEL: _coordinate(values, f"ocean_s_coordinate_g{number}", terms),
        "curve": xr.Variable(LEVEL, curve, {"long_name": "stretching curve", "units": "1"}),
        "critical": _scalar(critical, "critical depth"),
    })


SIGMA_LAYERS = 4
BREAK = 256.0
"""Depth in m down to which the sigma layers of the mixed coordinate reach."""


def sigma_over_z(mesh: Mesh, times: Times) -> Upright:
    """z = eta + sigma (min(depth_c, floor) + eta) in the upper four layers, z = zlev below."""
    known = model(mesh, times)
    upper = xr.DataArray(np.arange(DOWN.size) < SIGMA_LAYERS, dims=LEVEL)
    values, heights = np.where(upper, -DOWN / BREAK, np.nan), np.where(upper, np.nan, -DOWN)
    above = known.surface + _line(values) * (np.minimum(BREAK, known.floor) + known.surface)
    # Where there is no water below, the fixed heights have none of the model's columns either.
    below = _line(heights) + 0.0 * known.floor + 0.0 * known.surface
    z = above.where(upper, below)
    terms = {"sigma": "sigma", "eta": "surface", "depth": "floor", "depth_c": "critical", "zlev": "heights"}
    of_heights = {"standard_name": f"height_above_{DATUM}", "long_name": "height of the lower layers", "units": "m"}
    return Upright(-z, {
        **known.terms(),
        LEVEL: _coordinate(np.arange(1.0, DOWN.size + 1.0), "ocean_sigma_z_coordinate", terms, "down"),
        "sigma": _filled(_line(values), {"long_name": "sigma of the upper layers", "units": "1"}),
        "heights": _filled(_line(heights), of_heights), "critical": _scalar(BREAK, "depth the sigma layers reach"),
    })


DOUBLE_BREAK = 512.0
SHARPNESS = 16.0
DOUBLE_LAYERS = 5


def double_sigma(mesh: Mesh, times: Times) -> Upright:
    """d = sigma f in the upper five layers, d = f + (sigma - 1) (floor - f) below, d the depth; sigma from 0 to 2.

    f = (z1 + z2) / 2 + (z1 - z2) / 2 tanh(2 a / (z1 - z2) (floor - href)), z1 = href = 512 m, z2 = 16 m, a = 16.
    The formulas of the conventions make one column of both parts only if the lengths count downwards: they are written so,
    and `positive` says it. This coordinate knows no sea surface.
    """
    known = model(mesh, times, still=True)
    upper = xr.DataArray(np.arange(DOWN.size) < DOUBLE_LAYERS, dims=LEVEL)
    values = np.where(upper, DOWN / DOUBLE_BREAK, 1.0 + (DOWN - DOUBLE_BREAK) / (DEEPEST - DOUBLE_BREAK))
    half = (DOUBLE_BREAK - SHALLOW) / 2.0
    parting = (DOUBLE_BREAK + SHALLOW) / 2.0 + half * np.tanh(SHARPNESS / half * (known.floor - DOUBLE_BREAK))
    lower = parting + (_line(values) - 1.0) * (known.floor - parting)
    depth = (_line(values) * parting).where(upper, lower)
    terms = {"sigma": LEVEL, "depth": "floor", "z1": "upper_break", "z2": "lower_break", "a": "sharpness",
             "href": "reference", "k_c": "upper_layers"}
    return Upright(depth.transpose(LEVEL, *mesh.dims), {
        "floor": known.terms()["floor"], LEVEL: _coordinate(values, "ocean_double_sigma_coordinate", terms, "down"),
        "upper_break": _scalar(DOUBLE_BREAK, "greatest depth of the parting"),
        "lower_break": _scalar(SHALLOW, "least depth of the parting"),
        "sharpness": _scalar(SHARPNESS, "sharpness of the change"), "reference": _scalar(DOUBLE_BREAK, "reference depth"),
        "upper_layers": xr.Variable((), np.int32(DOUBLE_LAYERS), {"long_name": "number of layers above the parting"}),
    })


PARAMETRIC: dict[str, Callable[[Mesh, Times], Upright]] = {
    "ocean_sigma": sigma,
    "ocean_sigma_still": lambda mesh, times: sigma(mesh, times, still=True),
    "ocean_s": stretched,
    "ocean_s_g1": lambda mesh, times: generic(1, mesh, times),
    "ocean_s_g2": lambda mesh, times: generic(2, mesh, times),
    "ocean_sigma_z": sigma_over_z,
    "ocean_double_sigma": double_sigma,
}
"""Every parametric coordinate of the sea in the CF conventions, by name; the second has no moving surface."""
