"""Where a map looks: its projection, frame, graticule and the letters around it."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, Literal

import cartopy.crs as ccrs
import numpy as np
import numpy.typing as npt
from cartopy.mpl.geoaxes import GeoAxes
from matplotlib.collections import LineCollection
from matplotlib.path import Path as Outline
from matplotlib.patheffects import withStroke
from matplotlib.ticker import MaxNLocator

from gridcarb.figures.drawing import theme
from gridcarb.figures.lettering import meridian, parallel

Floats = npt.NDArray[np.float64]
Shape = Literal["globe", "window", "disc"]

_NUDGE = 1e-7
"""Degrees by which points on the outer meridian are kept on their own side of it."""


@dataclass(frozen=True)
class View:
    """One way of looking: a whole globe, a window in longitude and latitude, or a disc about a pole.

    centre : the meridian in the middle (degrees east).
    west, east : degrees east of the centre; south, north : latitudes.
    """

    shape: Shape
    projection: ccrs.Projection
    centre: float
    west: float
    east: float
    south: float
    north: float

    def place(self, east_of_centre: Floats, latitude: Floats) -> Floats:
        """(..., 2) projected points."""
        longitude = np.clip(east_of_centre, -180 + _NUDGE, 180 - _NUDGE) + self.centre
        points = self.projection.transform_points(ccrs.PlateCarree(), longitude, latitude)
        return np.asarray(points[..., :2], dtype=np.float64)

    @property
    def aspect(self) -> float:
        """Width over height of the frame on paper."""
        if self.shape == "disc":
            return 1.0
        if self.shape == "window":
            return (self.east - self.west) * self._squeeze / (self.north - self.south)
        left, right = self.projection.x_limits
        bottom, top = self.projection.y_limits
        return float((right - left) / (top - bottom))

    @property
    def _squeeze(self) -> float:
        """How long a degree of longitude is in the middle of a window, in degrees of latitude."""
        return float(max(np.cos(np.radians((self.south + self.north) / 2)), 0.2))

    def frame(self, ax: GeoAxes) -> None:
        """Set the limits and the outline of the map."""
        if self.shape == "window":
            ax.set_xlim(self.west, self.east)
            ax.set_ylim(self.south, self.north)
            ax.set_aspect(1 / self._squeeze)
        elif self.shape == "disc":
            turn = np.linspace(0, 2 * np.pi, 361)
            radius = self._radius()
            ax.set_xlim(-radius, radius)
            ax.set_ylim(-radius, radius)
            ax.set_boundary(Outline(radius * np.stack([np.cos(turn), np.sin(turn)], axis=1)))
        else:
            ax.set_global()
        ax.spines["geo"].set(linewidth=0.8, edgecolor=theme.FRAME, zorder=5)

    def _radius(self) -> float:
        edge = self.south if self.north > 0 else self.north
        return float(np.hypot(*self.place(np.array([90.0]), np.array([edge]))[0]))

    def letter(self, ax: GeoAxes) -> None:
        """Draw the graticule and its labels."""
        meridians, parallels = self._lines()
        ends = (-90.0, 90.0) if self.shape == "globe" else (self.south, self.north)
        along = np.linspace(*ends, 181)
        around = np.linspace(self.west, self.east, 361)
        lines = [self.place(np.full_like(along, lon), along) for lon in meridians]
        lines += [self.place(around, np.full_like(around, lat)) for lat in parallels]
        graticule = LineCollection(lines, colors=[theme.GRATICULE], linewidths=0.5, zorder=3)
        ax.add_collection(graticule, autolim=False)
        graticule.set_clip_path(ax.patch)
        {"globe": self._letter_globe, "window": self._letter_window, "disc": self._letter_disc}[self.shape](
            ax, meridians, parallels
        )

    def _lines(self) -> tuple[list[float], list[float]]:
        """Meridians (degrees east of the centre) and parallels to draw."""
        if self.shape == "globe":
            return self._turned(range(-180, 180, 60)), [-60.0, -30.0, 0.0, 30.0, 60.0]
        if self.shape == "disc":
            step = 10.0 if self.north - self.south <= 45 else 20.0
            sign = 1.0 if self.north > 0 else -1.0
            edge = min(abs(self.south), abs(self.north))
            rings = [sign * lat for lat in np.arange(90 - step, edge, -step)]
            return self._turned(range(-180, 180, 45)), rings
        steps = MaxNLocator(nbins=6, steps=[1, 1.5, 2, 3, 4.5, 5, 6, 9, 10])
        meridians = [float(x) - self.centre for x in steps.tick_values(self.west + self.centre, self.east + self.centre)]
        parallels = [float(y) for y in steps.tick_values(self.south, self.north)]
        return (
            [x for x in meridians if self.west - 1e-6 <= x <= self.east + 1e-6],
            [y for y in parallels if self.south - 1e-6 <= y <= self.north + 1e-6],
        )

    def _turned(self, longitudes: Iterable[int]) -> list[float]:
        """Degrees east of the centre."""
        return [(longitude - self.centre + 180) % 360 - 180 for longitude in longitudes]

    def _letter_globe(self, ax: GeoAxes, meridians: list[float], parallels: list[float]) -> None:
        for lat in parallels:
            heights = "center" if lat == 0 else "bottom" if lat > 0 else "top"
            self._text(ax, parallel(lat), (-180.0, lat), xytext=(-4, 0), ha="right", va=heights)
        for lon in meridians:
            if abs(lon) < 179:
                self._text(ax, meridian(self.centre + lon), (lon, -90.0), xytext=(0, -4), ha="center", va="top")

    def _letter_window(self, ax: GeoAxes, meridians: list[float], parallels: list[float]) -> None:
        for lat in parallels:
            self._text(ax, parallel(round(lat, 6)), (self.west, lat), xytext=(-5, 0), ha="right", va="center")
        for lon in meridians:
            label = meridian(round(self.centre + lon, 6))
            self._text(ax, label, (lon, self.south), xytext=(0, -4), ha="center", va="top")

    def _letter_disc(self, ax: GeoAxes, meridians: list[float], parallels: list[float]) -> None:
        edge = self.south if self.north > 0 else self.north
        for lon in meridians:
            x, y = self.place(np.array([lon]), np.array([edge]))[0] / self._radius()
            sides = "center" if abs(x) < 0.1 else "left" if x > 0 else "right"
            heights = "center" if abs(y) < 0.1 else "bottom" if y > 0 else "top"
            self._text(ax, meridian(self.centre + lon), (lon, edge), xytext=(4 * x, 4 * y), ha=sides, va=heights)
        within: dict[str, Any] = {"ha": "center", "va": "center", "color": theme.INK}
        within["path_effects"] = [withStroke(linewidth=2.0, foreground=(1, 1, 1, 0.75))]
        for lat in parallels:
            self._text(ax, parallel(lat), (22.5, lat), xytext=(0, 0), **within)

    def _text(self, ax: GeoAxes, text: str, place: tuple[float, float], **how: Any) -> None:
        """A small label at a place (degrees east of the centre, latitude), shifted by `xytext` in typographic points."""
        point = self.place(np.array(place[:1]), np.array(place[1:]))[0]
        ax.annotate(text, tuple(point), **{
            "textcoords": "offset points", "fontsize": theme.SMALL, "color": theme.SOFT_INK, "zorder": 6,
            "annotation_clip": False, **how,
        })


def globe(centre: float) -> View:
    """The whole Earth, equal areas."""
    return View("globe", ccrs.EqualEarth(central_longitude=centre), centre, -180.0, 180.0, -90.0, 90.0)


def window(west: float, east: float, south: float, north: float) -> View:
    """A region; parallels and meridians are straight, and true to scale in its middle."""
    east = west + ((east - west) % 360.0 or 360.0)
    centre = (west + east) / 2
    return View("window", ccrs.PlateCarree(central_longitude=centre), centre, west - centre, east - centre, south, north)


def disc(pole: Literal["north", "south"], edge: float, centre: float) -> View:
    """A cap about a pole down to the latitude `edge`, equal areas; `centre` points down (north) or up (south)."""
    north = pole == "north"
    projection = ccrs.LambertAzimuthalEqualArea(central_longitude=centre, central_latitude=90.0 if north else -90.0)
    bounds = (edge, 90.0) if north else (-90.0, edge)
    return View("disc", projection, centre, -180.0, 180.0, *bounds)
