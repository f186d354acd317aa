"""A map on a page: cells, coast, graticule, colour bar, legend."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt
from cartopy.mpl.geoaxes import GeoAxes
from matplotlib.artist import Artist
from matplotlib.collections import PolyCollection, QuadMesh
from matplotlib.colors import to_rgba
from matplotlib.figure import Figure
from matplotlib.patches import PathPatch
from matplotlib.path import Path as Outline

from gridcarb.figures.drawing import coastline, theme
from gridcarb.figures.cells import Grid, mesh, outlines
from gridcarb.figures.drawing.scales import Scale
from gridcarb.figures.drawing.views import View

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]

_SIDE, _HEAD, _FOOT = 0.62, 0.98, 1.12
"""Margins round the map, in inches: left and right, above for a title of one line, below."""


@dataclass(frozen=True)
class Plate:
    """All that a map shows.

    values : (y, x) or (cell,), NaN where there is none.
    ground, missing : cells without a value, by reason; same shape.
    label : beside the colour bar; empty: no bar.
    entries : legend entries (label -> colour) of a field of kinds.
    """

    grid: Grid
    values: Floats
    ground: Mask
    missing: Mask
    view: View
    scale: Scale
    title: str
    subtitle: str
    label: str
    entries: Sequence[tuple[str, str]]
    coast: bool


def publish(plate: Plate, path: Path) -> Path:
    """Draw the map and write it to `path`."""
    with theme.drawing():
        width = {"globe": 8.6, "window": 8.0, "disc": 5.9}[plate.view.shape]
        height = min(width / plate.view.aspect, 7.2)
        width = min(width, height * plate.view.aspect)
        page_width = max(width, 5.4) + 2 * _SIDE
        lines = textwrap.wrap(plate.title, int(page_width * 7.6)) or [""]
        top = _HEAD + 0.27 * (len(lines) - 1)
        figure = theme.page(page_width, height + top + _FOOT)
        left = (page_width - width) / 2
        ax = figure.add_axes(theme.box(figure, left, _FOOT, width, height), projection=plate.view.projection)
        _fill(ax, plate)
        theme.head(figure, lines, plate.subtitle, _SIDE, 0.24)
        _explain(figure, plate, height)
        return theme.save(figure, path, plate.title, ", ".join(part for part in (plate.label, plate.subtitle) if part))


def _fill(ax: GeoAxes, plate: Plate) -> None:
    ax.set_facecolor(theme.PAPER)
    plate.view.frame(ax)
    colours = plate.scale.colours(plate.values)
    colours[plate.ground] = to_rgba(theme.LAND)
    colours[plate.missing] = 0.0
    if plate.coast:
        coastline.lay_land(ax)
    _paint(ax, plate, colours)
    if plate.coast:
        coastline.trace_coast(ax)
    plate.view.letter(ax)


def _paint(ax: GeoAxes, plate: Plate, colours: Floats) -> None:
    """The cells in their colours, and the missing ones hatched."""
    view = plate.view
    if plate.grid.rectilinear:
        net = mesh(plate.grid, view.centre)
        east, north = np.meshgrid(net.x_edges, np.clip(net.y_edges, *_hemisphere(view)))
        nodes = view.place(east, north)
        quads = np.stack([nodes[:-1, :-1], nodes[:-1, 1:], nodes[1:, 1:], nodes[1:, :-1]], axis=2)
        ax.add_collection(QuadMesh(
            nodes, facecolors=net.spread(colours, 0.0).reshape(-1, 4), antialiased=False, edgecolors="none", zorder=2,
        ), autolim=False)
        _hatch(ax, quads[net.spread(plate.missing, False).astype(bool)])
        return
    pieces = outlines(plate.grid, view.centre)
    rings = [view.place(ring[:, 0], np.clip(ring[:, 1], *_hemisphere(view))) for ring in pieces.rings]
    ax.add_collection(PolyCollection(
        rings, facecolors=colours.reshape(-1, 4)[pieces.cells], antialiaseds=False, edgecolors="none", zorder=2
    ), autolim=False)
    hidden = plate.missing.reshape(-1)[pieces.cells]
    _hatch(ax, [ring for ring, missing in zip(rings, hidden, strict=True) if missing])


def _hemisphere(view: View) -> tuple[float, float]:
    """Latitudes that can be shown: a disc needs no cells of the other side of the Earth."""
    return (view.south - 5, 90.0) if view.shape == "disc" and view.north > 0 else (
        (-90.0, view.north + 5) if view.shape == "disc" else (-90.0, 90.0))


def _hatch(ax: GeoAxes, rings: Sequence[Floats] | Floats) -> None:
    """One hatched patch under all `rings`, so that the hatching runs on from cell to cell."""
    if len(rings) == 0:
        return
    patch = PathPatch(
        Outline.make_compound_path(*(Outline(np.concatenate([ring, ring[:1]]), closed=True) for ring in rings)),
        facecolor=theme.MISSING, edgecolor=theme.HATCH, hatch=theme.HATCHING, linewidth=0, zorder=2.2,
    )
    ax.add_patch(patch)


def _explain(figure: Figure, plate: Plate, height: float) -> None:
    """The colour bar below the map and the legend beside the subtitle."""
    across, _ = figure.get_size_inches()
    if plate.label:
        length = 0.68 * (across - 2 * _SIDE)
        panel = figure.add_axes(theme.box(figure, (across - length) / 2, 0.68, length, 0.15))
        plate.scale.bar(panel, plate.label)
    kinds: list[Artist] = [theme.swatch(colour, label) for label, colour in plate.entries]
    if kinds:
        theme.legend(figure, kinds, across - _SIDE, 0.3, columns=3)
    shades: list[Artist] = []
    if plate.ground.any():
        shades.append(theme.swatch(theme.LAND, "land or sea floor"))
    if plate.missing.any():
        shades.append(theme.swatch(theme.MISSING, "no value", hatched=True))
    theme.legend(figure, shades, across - _SIDE, _FOOT + height + 0.14)
