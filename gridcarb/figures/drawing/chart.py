"""A map on a page: cells, coast, graticule, colour bar, legend."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt
from cartopy.mpl.geoaxes import GeoAxes
from matplotlib.collections import PolyCollection, QuadMesh
from matplotlib.colors import to_rgba
from matplotlib.figure import Figure
from matplotlib.patches import Patch, PathPatch
from matplotlib.path import Path as Outline

from gridcarb.figures.cells import Grid, outlines
from gridcarb.figures.drawing import coastline, theme
from gridcarb.figures.drawing.scales import Scale
from gridcarb.figures.drawing.views import View
from gridcarb.figures.mesh import mesh

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]

_DOTS = (1.5, 40.0)
"""Least and greatest size of a dot, in square points."""

_SIDE = 0.62
"""Margin left and right of the map, in inches."""


@dataclass(frozen=True)
class Plate:
    """All that a map shows.

    values : (y, x) or (cell,), NaN where there is none.
    ground, missing : cells without a value, by reason; same shape.
    label : beside the colour bar; empty: no bar.
    ground_word : what solid ground is called in the legend.
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
    ground_word: str
    coast: bool


def publish(plate: Plate, path: Path) -> Path:
    """Draw the map and write it to `path`."""
    with theme.drawing():
        room = {"globe": 8.6, "window": 8.0, "disc": 5.9}[plate.view.shape]
        height = min(room / plate.view.aspect, 7.2)
        width = height * plate.view.aspect
        across = max(width, 5.4) + 2 * _SIDE
        lines = textwrap.wrap(plate.title, int((across - 2 * _SIDE) * theme.LETTERS)) or [""]
        notes = _shades(plate)
        top = 0.45 + theme.LINE * len(lines) + (0.26 if plate.subtitle or notes else 0.0)
        foot = 1.12 if plate.label else 0.8
        figure = theme.page(across, foot + height + top)
        frame = theme.box(figure, (across - width) / 2, foot, width, height)
        _fill(figure.add_axes(frame, projection=plate.view.projection), plate)
        theme.head(figure, lines, plate.subtitle, _SIDE, 0.24)
        theme.legend(figure, notes, (across - _SIDE, foot + height + 0.3))
        _explain(figure, plate)
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
    if plate.grid.rectilinear:
        _paint_net(ax, plate, colours)
    elif plate.grid.of_points:
        _paint_points(ax, plate, colours.reshape(-1, 4))
    else:
        _paint_cells(ax, plate, colours.reshape(-1, 4))


def _paint_net(ax: GeoAxes, plate: Plate, colours: Floats) -> None:
    net = mesh(plate.grid, plate.view.centre)
    east, north = np.meshgrid(net.x_edges, np.clip(net.y_edges, *_reach(plate.view)))
    nodes = plate.view.place(east, north)
    _add_net(ax, nodes, net.spread(colours, 0.0).reshape(-1, 4))
    _hatch(ax, _strips(nodes, net.spread(plate.missing, False)))


def _paint_cells(ax: GeoAxes, plate: Plate, colours: Floats) -> None:
    view = plate.view
    pieces = outlines(plate.grid, view.centre, uncut=view.shape == "disc", reach=_reach(view))
    quads = view.place(pieces.quads[..., 0], np.clip(pieces.quads[..., 1], *_reach(view)))
    rings = [view.place(ring[:, 0], ring[:, 1]) for ring in pieces.rings]
    shown = colours[pieces.owners][:, 3] > 0
    _add_net(ax, _apart(quads[shown]), _with_gaps(colours[pieces.owners[shown]]))
    ax.add_collection(PolyCollection(
        rings, facecolors=colours[pieces.ring_owners], antialiaseds=False, edgecolors="none", zorder=2
    ), autolim=False)
    missing = plate.missing.reshape(-1)
    lost = [ring for ring, hidden in zip(rings, missing[pieces.ring_owners], strict=True) if hidden]
    _hatch(ax, [*quads[missing[pieces.owners]], *lost])


def _paint_points(ax: GeoAxes, plate: Plate, colours: Floats) -> None:
    """A dot a cell: large while there are few, never so large that they hide the map."""
    view, missing = plate.view, plate.missing.reshape(-1)
    lon, lat = (side[:, 0] for side in (plate.grid.longitudes, plate.grid.latitudes))
    seen = np.isfinite(lon) & np.isfinite(lat) & (lat >= _reach(view)[0]) & (lat <= _reach(view)[1])
    colours = colours.copy()
    colours[missing] = to_rgba(theme.MISSING)
    size = float(np.clip(2e4 / max(seen.sum(), 1), *_DOTS))
    at = view.place((lon[seen] - view.centre + 180) % 360 - 180, lat[seen])
    ax.scatter(at[:, 0], at[:, 1], s=size, c=colours[seen], linewidths=0.5 if size > 10 else 0.0, edgecolors=theme.FRAME,
               zorder=4.5)


def _add_net(ax: GeoAxes, nodes: Floats, colours: Floats) -> None:
    """A net of (y + 1, x + 1, 2) nodes with a colour for each of its (y * x) pieces."""
    net = QuadMesh(nodes, facecolors=colours, antialiased=False, edgecolors="none", zorder=2)
    ax.add_collection(net, autolim=False)


def _apart(quads: Floats) -> Floats:
    """(pieces, 4, 2) corners as a net one piece high in which no piece touches the next.

    A net is drawn many times faster than as many polygons, and in a tenth of the memory.
    """
    gap = np.full(2, np.nan)
    nodes = np.empty((2, quads.shape[0], 3, 2))
    nodes[0, :, 0], nodes[0, :, 1], nodes[:, :, 2] = quads[:, 0], quads[:, 1], gap
    nodes[1, :, 0], nodes[1, :, 1] = quads[:, 3], quads[:, 2]
    return nodes.reshape(2, -1, 2)


def _with_gaps(colours: Floats) -> Floats:
    """The colours of the pieces of `_apart`, and none for what lies between them."""
    spread = np.zeros((colours.shape[0], 3, 4))
    spread[:, 0] = colours
    return spread.reshape(-1, 4)[:-1]


def _reach(view: View) -> tuple[float, float]:
    """Latitudes worth placing: a disc needs no cells of the other side of the Earth."""
    if view.shape != "disc":
        return -90.0, 90.0
    return max(view.south - 5, -90.0), min(view.north + 5, 90.0)


def _strips(nodes: Floats, chosen: Mask) -> list[Floats]:
    """The outlines of the chosen pieces of a mesh, neighbours in a row taken together."""
    strips = []
    for row in np.flatnonzero(chosen.any(axis=1)):
        ends = np.flatnonzero(np.diff(chosen[row].astype(np.int8), prepend=0, append=0))
        for start, stop in ends.reshape(-1, 2):
            lower, upper = nodes[row, start : stop + 1], nodes[row + 1, start : stop + 1]
            strips.append(np.concatenate([lower, upper[::-1]]))
    return strips


def _hatch(ax: GeoAxes, rings: Sequence[Floats]) -> None:
    """One hatched patch of all `rings`, so that the hatching runs on from cell to cell."""
    if not rings:
        return
    outline = Outline.make_compound_path(*(Outline(np.concatenate([ring, ring[:1]]), closed=True) for ring in rings))
    ax.add_patch(PathPatch(
        outline, facecolor=theme.MISSING, edgecolor=theme.HATCH, hatch=theme.HATCHING, linewidth=0, zorder=2.2
    ))


def _explain(figure: Figure, plate: Plate) -> None:
    """The colour bar, or the legend of a field of kinds, below the map."""
    across, _ = figure.get_size_inches()
    if plate.label:
        length = 0.68 * (across - 2 * _SIDE)
        plate.scale.bar(figure.add_axes(theme.box(figure, (across - length) / 2, 0.68, length, 0.15)), plate.label)
    kinds = [theme.swatch(colour, word) for word, colour in plate.entries]
    theme.legend(figure, kinds, (across / 2, 0.26), anchor="lower center")


def _shades(plate: Plate) -> list[Patch]:
    """Legend entries of the cells without a value; only those on the map."""
    shades = [theme.swatch(theme.LAND, plate.ground_word)] if plate.ground.any() else []
    return shades + ([theme.swatch(theme.MISSING, "no value", hatched=True)] if plate.missing.any() else [])
