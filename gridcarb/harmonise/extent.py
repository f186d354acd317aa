"""The cells of a whole grid, looked at once before a run: which repeat others, which are collapsed, how much is sea.

Positions, areas, and the mask of the salinity of the top level at the first time are read; corners in pieces.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.axes import Axes, grid_kind
from gridcarb.errors import InputError, Notice
from gridcarb.harmonise.corners import degrees
from gridcarb.harmonise.decisions import Decided, Decision, Understanding
from gridcarb.harmonise.duplicates import PackedFlags, repeated, where_repeated
from gridcarb.harmonise.masks import MaskReading, unmask
from gridcarb.harmonise.measures import MeasuresReading, cell_areas, find_areas
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.harmonise.thickness import read_thickness

Numbers = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

OCEAN_AREA = 3.6e14
"""Area of the world ocean, m2."""

_TOLERANCE = 0.02
_PIECE = 1_000_000
"""Cells looked at at once."""

_MOST = 30_000_000
"""Columns of a grid whose sea area is checked unasked, which reads the top level once."""

_STATIONS = frozenset({"timeseries", "profile", "timeseriesprofile", "point", "trajectory", "trajectoryprofile"})


_MEASURES = {
    "area": "cell_area", "thickness": "cell_thickness", "sea_fraction": "sea_area_fraction",
    "sea_floor_depth": "sea_floor_depth_below_geoid",
}
"""Kind of measure -> standard name of the variable that tells it."""


def weigh(
    raw: xr.Dataset, understanding: Understanding, settings: ReadingSettings, measures: Mapping[str, str] | None = None
) -> Understanding:
    """An understanding that knows also how cells are weighed in means over space, and says so.

    raw : the whole collection, lazy.
    measures : kind of measure -> coordinate, where that is known; the others are found by their attributes.

    Raises InputError as `read_measures` does. Thickness is of use only with an area.
    """
    known = {name: _MEASURES[kind] for kind, name in (measures or {}).items() if kind in _MEASURES and name in raw.coords}
    raw = raw.assign_coords({name: raw[name].assign_attrs(standard_name=said) for name, said in known.items()})
    vertical = understanding.place.vertical
    found = read_measures(raw, understanding.axes, understanding.masks, vertical.top, settings)
    flat = found.reading.kind == "unknown"
    thick = Decided(None) if flat else read_thickness(raw, understanding.axes, vertical)
    return replace(
        understanding, measures=found.reading, thickness=thick.reading,
        decisions=(*understanding.decisions, *found.decisions, *thick.decisions),
        notices=(*understanding.notices, *found.notices, *thick.notices),
    )


def read_measures(
    raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], top: int, settings: ReadingSettings
) -> Decided[MeasuresReading]:
    """Decide how cells are weighed in sums and means over space.

    top : index of the uppermost level.

    Raises
    ------
    InputError : the recipe says the grid is global, and its sea area is not that of the ocean, or not known.
    """
    reading, because = find_areas(raw, axes, masks)
    reading = replace(reading, time=axes.time, time_shares=_time_shares(raw, axes))
    if reading.kind == "unknown":
        if settings.coverage == "global":
            raise InputError(f"the sea area of a global grid cannot be checked: {because}", where="reading.coverage",
                             mend="give a file with the areas of the cells, or leave `coverage` out of the recipe")
        return Decided(reading, (Decision("cell area", "not known, no means over space", because),),
                       _unknown_notice(raw, axes))
    whole = _Whole(raw, axes, masks, top, reading)
    notices: list[Notice] = []
    if reading.kind == "given" or whole.may_repeat():
        reading, notices = whole.without_repeated()
        whole.reading = reading
    checked = _check_total(whole, settings)
    ball = f"on a sphere of radius {reading.radius / 1e3:.3f} km"
    how = {"given": "as the files give it", "boxes": f"between parallels and meridians {ball}",
           "polygons": f"of spherical polygons {ball}"}  # fmt: skip
    decision = Decision("cell area", how[reading.kind], because)
    return Decided(reading, (decision, *checked.decisions), (*notices, *checked.notices))


class _Whole:
    """The horizontal grid with its positions, its top level at the first time, and its areas."""

    def __init__(
        self, raw: xr.Dataset, axes: Axes, masks: Mapping[str, MaskReading], top: int, reading: MeasuresReading
    ) -> None:
        self.raw, self.axes, self.masks, self.top, self.reading = raw, axes, masks, top, reading
        self.shape = tuple(raw.sizes[dim] for dim in axes.horizontal)

    def position(self, name: str | None) -> Numbers:
        assert name is not None
        return degrees(self.raw, name, self.raw[name], self.masks.get(name))

    def may_repeat(self) -> bool:
        """Whether cells could lie at one place: always, but for plain axes that never come back to where they were."""
        if self.axes.longitude is None or self.axes.latitude is None:
            return False
        if grid_kind(self.raw, self.axes) != "rectilinear":
            return True
        lon, lat = self.position(self.axes.longitude), self.position(self.axes.latitude)
        ends = ((lon, np.zeros(lon.size)), (np.zeros(lat.size), lat))
        return any(bool(repeated(x, y, np.ones(x.size, dtype=bool)).any()) for x, y in ends)

    def pieces(self) -> Iterator[tuple[dict[str, slice], Numbers, Flags]]:
        """Region, areas and sea of stretches of the grid, in order."""
        dim, *others = self.axes.horizontal
        rows = max(1, _PIECE // max(1, int(np.prod([self.raw.sizes[other] for other in others], dtype=np.int64))))
        for start in range(0, self.raw.sizes[dim], rows):
            region = {dim: slice(start, start + rows)}
            coords = self.raw.coords.to_dataset().assign(temperature=self.raw["temperature"])
            coords = coords.drop_vars([name for name, each in coords.coords.items() if self._moves(each)])
            area = cell_areas(coords.isel(region), self.axes, self.reading, region)
            yield region, area.values, self._sea(region)

    def _moves(self, coordinate: xr.DataArray) -> bool:
        return self.axes.time in coordinate.dims or self.axes.vertical in coordinate.dims

    def _sea(self, region: Mapping[str, slice]) -> Flags:
        """Where the top level has water at the first time."""
        salt = self.raw["salinity"]
        here = {dim: place for dim, place in ((self.axes.time, 0), (self.axes.vertical, self.top)) if dim in salt.dims}
        piece = salt.isel(here).isel(region)
        missing = [dim for dim in self.axes.horizontal if dim not in piece.dims]
        piece = piece.expand_dims(missing).transpose(*self.axes.horizontal)
        numbers = unmask(np.asarray(piece.values), self.masks["salinity"])[0]
        return np.asarray(numbers > 0)

    def without_repeated(self) -> tuple[MeasuresReading, list[Notice]]:
        """The reading with repeated cells excluded, and what is to be said of them and of collapsed cells."""
        pieces = [(area, sea) for _, area, sea in self.pieces()]
        area, sea = (np.concatenate(parts) for parts in zip(*pieces, strict=True))
        again = self._repeated(sea & (area > 0))
        notices = _of_collapsed(area, sea & ~again, self.reading.kind)
        if not again.any():
            return self.reading, notices
        more = float(area[again & sea].sum()) / max(float(area[sea & ~again].sum()), 1e-300)
        if (again & sea).any():
            notices.append(Notice(
                "repeated_cells", f"{int((again & sea).sum()):,} sea cells repeat the place of others"
                f"{where_repeated(again, sea, self.axes.horizontal)}, such as fold rows and halo columns; they get "
                f"their values, and count for nothing in sums and means (they would add {more:.2%} to the sea area)"))
        return replace(self.reading, excluded=PackedFlags.of(again, self.axes.horizontal)), notices

    def _repeated(self, usable: Flags) -> Flags:
        if self.axes.longitude is None or self.axes.latitude is None:
            return np.zeros(self.shape, dtype=bool)
        lon, lat = self.position(self.axes.longitude), self.position(self.axes.latitude)
        if lon.shape != self.shape:
            lon, lat = np.meshgrid(lon, lat)
        return repeated(lon, lat, usable)

    def sea_area(self) -> float:
        """Sea area of the top level, m2."""
        return float(sum(float(area[sea].sum()) for _, area, sea in self.pieces()))

    def claims_the_globe(self) -> bool:
        """Whether the positions cover all longitudes and most latitudes."""
        if self.axes.longitude is None or self.axes.latitude is None:
            return False
        lon, lat = self.position(self.axes.longitude), self.position(self.axes.latitude)
        turns = np.unique(np.round(lon[np.isfinite(lon)] % 360.0, 1))
        if turns.size < 3:
            return False
        gaps = np.diff(np.append(turns, turns[0] + 360.0))
        around = float(gaps.max()) <= max(10.0, 1.5 * float(np.median(gaps)))
        return around and float(np.nanmin(lat)) <= -65.0 and float(np.nanmax(lat)) >= 75.0


def _check_total(whole: _Whole, settings: ReadingSettings) -> Decided[None]:
    """The sea area of a grid that is, or seems, global against that of the ocean."""
    if settings.coverage == "part" or not (settings.coverage == "global" or whole.claims_the_globe()):
        return Decided(None)
    if settings.coverage is None and math.prod(whole.shape) > _MOST:
        because = "the grid is large; `reading: {coverage: global}` would have it checked"
        return Decided(None, (Decision("sea area", "not checked against that of the ocean", because),))
    found = whole.sea_area()
    off = found / OCEAN_AREA - 1.0
    if abs(off) <= _TOLERANCE:
        because = "within 2 % of the ocean's 3.6e14 m2"
        return Decided(None, (Decision("sea area", f"{found / 1e14:.2f}e14 m2 at the top level", because),))
    more = "more" if off > 0 else "less"
    what = f"the sea area of the top level is {found / 1e14:.2f}e14 m2, {abs(off):.1%} {more} than the ocean's 3.6e14 m2"
    if settings.coverage == "global":
        raise InputError(f"{what}, so that global sums and means would be wrong", where="reading.coverage",
                         mend="check land mask, areas and bounds, or write `reading: {coverage: part}` in the recipe")
    text = f"{what}, though the grid goes around the globe; if it is meant to be global, look at land mask and areas"
    return Decided(None, (), (Notice("sea_area", text, "reading: {coverage: part}"),))


def _of_collapsed(area: Numbers, sea: Flags, kind: str) -> list[Notice]:
    """A notice of sea cells without an area, or with next to none."""
    some = area[area > 0]
    least = 1e-6 * float(np.median(some)) if some.size else 0.0
    count = int((sea & (area <= least)).sum())
    why = "their area is missing, zero or negative" if kind == "given" else "their corners coincide or are missing"
    return [Notice("collapsed_cells", f"{count:,} sea cells have no area: {why}; they get their values, and count for "
                   "nothing in sums and means")] if count else []


def _unknown_notice(raw: xr.Dataset, axes: Axes) -> tuple[Notice, ...]:
    """Of a map whose cells have no area; stations and columns need none."""
    if not axes.horizontal or axes.latitude is None or axes.longitude is None:
        return ()
    kind = grid_kind(raw, axes)
    stations = str(raw.attrs.get("featureType", "")).lower() in _STATIONS
    stations |= any(str(coord.attrs.get("cf_role", "")).endswith("_id") for coord in raw.coords.values())
    if kind == "rectilinear" or (kind == "unstructured" and stations):
        return ()
    return (Notice(
        "no_cell_area", "the files give neither areas nor corners of the cells of this grid (its latitudes alone do not "
        "tell them), so there are no means over space; files with areas (standard_name cell_area) or bounds would do",
    ),)


def _time_shares(raw: xr.Dataset, axes: Axes) -> Numbers:
    """What part each step is of the whole time: by bounds, where every step has them, else all alike.

    The bounds of a climatology span many years, so that its steps count alike.
    """
    if axes.time is None:
        return np.ones(1)
    steps = raw.sizes[axes.time]
    alike = np.full(steps, 1.0 / steps)
    attrs: Mapping[Any, Any] = raw[axes.time_coordinate].attrs if axes.time_coordinate else {}
    bounds = attrs.get("bounds")
    if bounds not in raw.variables or raw[bounds].ndim != 2 or raw[bounds].dtype.kind not in "fiu":
        return alike
    lengths = np.abs(np.diff(raw[bounds].transpose(axes.time, ...).values.astype(np.float64), axis=1)[:, 0])
    good = lengths.shape == (steps,) and bool(np.isfinite(lengths).all()) and bool((lengths > 0).all())
    return lengths / lengths.sum() if good else alike
