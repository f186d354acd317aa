"""From values to colours: palettes, limits, norms and the colour bar."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import matplotlib
import numpy as np
import numpy.typing as npt
from matplotlib.axes import Axes as Panel
from matplotlib.cm import ScalarMappable
from matplotlib.colorbar import Colorbar
from matplotlib.colors import BoundaryNorm, Colormap, ListedColormap, Normalize, TwoSlopeNorm
from matplotlib.ticker import MaxNLocator

from gridcarb.fields import Ink
from gridcarb.figures.drawing import theme

Floats = npt.NDArray[np.float64]

_SHORTEST_SIDE = 0.4
"""Share of half a centred palette that a side needs to be told from the middle."""


@dataclass(frozen=True)
class Scale:
    """How values become colours; `low` and `high` say whether data pass the ends."""

    palette: Colormap
    norm: Normalize
    ticks: tuple[float, ...]
    low: bool = False
    high: bool = False

    def colours(self, values: Floats) -> Floats:
        """(..., 4) RGBA; values that are not finite are transparent."""
        colours = np.asarray(self.palette(self.norm(np.ma.masked_invalid(values))), dtype=np.float64)
        colours[~np.isfinite(values)] = 0.0
        return colours

    def bar(self, panel: Panel, label: str) -> Colorbar:
        """A horizontal colour bar with arrows at the ends that data pass."""
        extend: dict[tuple[bool, bool], Literal["neither", "min", "max", "both"]] = {
            (False, False): "neither", (True, False): "min", (False, True): "max", (True, True): "both",
        }
        bar = Colorbar(
            panel, ScalarMappable(self.norm, self.palette), orientation="horizontal", extend=extend[self.low, self.high],
            extendfrac=0.035, ticks=list(self.ticks),
        )
        bar.set_label(label, size=theme.TEXT, labelpad=5, parse_math=False)
        bar.outline.set(linewidth=0.6, edgecolor=theme.FRAME)
        panel.tick_params(length=3, width=0.6, color=theme.FRAME)
        panel.minorticks_off()
        return bar


def scale_of(values: Floats, ink: Ink, limits: tuple[float, float] | None) -> Scale:
    """The scale for the finite ones of `values`: `limits` as given, else round numbers about the middle 96 %.

    A centred palette keeps its middle at `ink.centre`, whatever the limits, see `_two_sides`.
    """
    known = values[np.isfinite(values)]
    low, high = limits or _robust(known)
    palette, norm = matplotlib.colormaps[ink.palette], Normalize(low, high)
    ticks = _ticks(low, high, 8)
    if ink.centre is not None and low < ink.centre < high:
        palette, norm, ticks = _two_sides(palette, low, ink.centre, high)
    elif ink.centre is not None:
        palette, low, high = _one_side(palette, ink.centre, (low, high), stated=limits is not None)
        norm, ticks = Normalize(low, high), _ticks(low, high, 8)
    return Scale(palette, norm, ticks, bool((known < low).any()), bool((known > high).any()))


def _two_sides(
    palette: Colormap, low: float, centre: float, high: float
) -> tuple[Colormap, Normalize, tuple[float, ...]]:
    """The part of a centred palette for values on both sides of the centre, with norm and ticks.

    Both sides have one measure, a step of colour meaning the same everywhere. Only a side so short that its end could not
    be told from the middle is stretched, and then no further than the colours need.
    """
    below, above = centre - low, high - centre
    longest = max(below, above)
    if min(below, above) >= _SHORTEST_SIDE * longest:
        places = 0.5 + np.linspace(-below, above, 256) / (2 * longest)
        return ListedColormap(palette(places)), Normalize(low, high), _ticks(low, high, 8)
    left, right = (0.5 * max(side / longest, _SHORTEST_SIDE) for side in (below, above))
    places = np.concatenate([np.linspace(0.5 - left, 0.5, 128), np.linspace(0.5, 0.5 + right, 128)])
    most = (4, 2) if below > above else (2, 4)
    ticks = {*_ticks(low, centre, most[0]), centre, *_ticks(centre, high, most[1])}
    return ListedColormap(palette(places)), TwoSlopeNorm(centre, low, high), tuple(sorted(ticks))


def _one_side(
    palette: Colormap, centre: float, limits: tuple[float, float], stated: bool
) -> tuple[Colormap, float, float]:
    """The half of a centred palette for values on one side of the centre, and its limits.

    Unless limits were stated the scale starts at the centre, as long as that leaves the values a third of it.
    """
    low, high = limits
    above = low >= centre
    if not stated and max(abs(low - centre), abs(high - centre)) <= 3 * (high - low):
        low, high = (centre, high) if above else (low, centre)
    half = palette(np.linspace(0.5, 1.0, 256) if above else np.linspace(0.0, 0.5, 256))
    return ListedColormap(half), low, high


def kinds(flags: tuple[tuple[int, str], ...]) -> tuple[Scale, dict[int, str]]:
    """A scale for a status field, and the colour of each flag."""
    colours = {value: theme.CATEGORIES[place % len(theme.CATEGORIES)] for place, (value, _) in enumerate(flags)}
    ordered = sorted(colours)
    edges = [value - 0.5 for value in ordered] + [ordered[-1] + 0.5]
    palette = ListedColormap([colours[value] for value in ordered])
    return Scale(palette, BoundaryNorm(edges, palette.N), ()), colours


def _robust(known: Floats) -> tuple[float, float]:
    """The 2nd and 98th percentile moved out to round numbers; never equal."""
    if known.size == 0:
        return 0.0, 1.0
    low, high = (float(end) for end in np.percentile(known, [2, 98]))
    if high - low <= 1e-9 * max(abs(low), abs(high), 1e-300):
        half = max(abs(low) * 0.01, 1e-12)
        low, high = low - half, high + half
    steps = MaxNLocator(nbins=16, steps=[1, 2, 2.5, 5, 10]).tick_values(low, high)
    return float(steps[0]), float(steps[-1])


def _ticks(low: float, high: float, most: int) -> tuple[float, ...]:
    ticks = MaxNLocator(nbins=most, steps=[1, 2, 2.5, 5, 10]).tick_values(low, high)
    slack = 1e-9 * (high - low)
    return tuple(float(tick) for tick in ticks if low - slack <= tick <= high + slack)
