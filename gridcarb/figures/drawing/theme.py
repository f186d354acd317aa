"""The one look of all figures: type, neutral colours, resolution, the page and how it is saved.

Everything is drawn through matplotlib's object interface, under one lock and in one style laid over matplotlib's own
defaults, so that neither threads nor a user's matplotlib settings change a picture: the same input gives the same bytes.
"""

from __future__ import annotations

import os
import threading
from collections.abc import Iterator, Sequence
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Literal

import matplotlib.style
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.patches import Patch

from gridcarb.errors import OutputError

INK = "#22282e"
SOFT_INK = "#5b646d"
PAPER = "#ffffff"
LAND = "#cdc8bf"
COAST = "#4a4640"
FRAME = "#3b4248"
GRATICULE = (0.13, 0.16, 0.18, 0.22)
MISSING = "#f4f2ee"
HATCH = "#8d8a94"
HATCHING = "/////"
CATEGORIES = ("#0072b2", "#e69f00", "#56b4e9", "#d55e00", "#cc79a7", "#009e73")
"""Colours for kinds without order, told apart with any colour vision (Okabe and Ito's set)."""

DPI = 200
TITLE, TEXT, SMALL = 14.0, 10.5, 8.5
LINE = 0.27
"""Distance between the lines of a title, in inches."""
LETTERS = 8.8
"""Letters of a title that fit into an inch."""

Corner = Literal["lower right", "lower center"]

_STYLE = {
    "font.family": ["DejaVu Sans"], "font.size": TEXT, "text.color": INK, "axes.labelcolor": INK,
    "xtick.color": SOFT_INK, "ytick.color": SOFT_INK, "xtick.labelsize": 9.0, "ytick.labelsize": 9.0,
    "hatch.linewidth": 0.7, "hatch.color": HATCH, "figure.facecolor": PAPER, "savefig.facecolor": PAPER,
}
_LOCK = threading.RLock()


@contextmanager
def drawing() -> Iterator[None]:
    """Everything that makes or saves a figure happens inside this."""
    with _LOCK, matplotlib.style.context(["default", _STYLE]):
        yield


def page(width: float, height: float) -> Figure:
    """An empty page, in inches."""
    figure = Figure(figsize=(width, height), dpi=DPI)
    FigureCanvasAgg(figure)
    return figure


def box(figure: Figure, left: float, bottom: float, width: float, height: float) -> tuple[float, float, float, float]:
    """Inches from the lower left corner of the page as the fractions matplotlib wants."""
    across, up = figure.get_size_inches()
    return left / across, bottom / up, width / across, height / up


def head(figure: Figure, title: Sequence[str], subtitle: str, left: float, top: float) -> None:
    """Title lines and the line under them; `left` and `top` in inches from the upper left corner."""
    across, up = figure.get_size_inches()
    at = up - top
    for line in title:
        figure.text(left / across, at / up, line, size=TITLE, weight="bold", va="top", parse_math=False)
        at -= LINE
    figure.text(left / across, (at - 0.03) / up, subtitle, size=TEXT, color=SOFT_INK, va="top", parse_math=False)


def swatch(color: str, label: str, hatched: bool = False) -> Patch:
    """One entry of a legend."""
    return Patch(
        facecolor=color, edgecolor=HATCH if hatched else SOFT_INK, hatch=HATCHING if hatched else None, label=label,
        linewidth=0.5,
    )


def legend(figure: Figure, entries: Sequence[Patch], at: tuple[float, float], anchor: Corner = "lower right") -> None:
    """Entries in a row whose `anchor` lies at `at`, inches from the lower left corner."""
    if entries:
        left, bottom, _, _ = box(figure, *at, 0, 0)
        figure.legend(
            handles=list(entries), loc=anchor, bbox_to_anchor=(left, bottom), ncols=len(entries), frameon=False,
            fontsize=9.0, handlelength=1.5, handleheight=1.0, columnspacing=1.3, borderpad=0, borderaxespad=0,
        )


def save(figure: Figure, path: Path, title: str, description: str) -> Path:
    """Write the PNG beside its name, then move it there; no dates and no versions inside.

    Raises
    ------
    OutputError : the picture cannot be written.
    """
    aside = path.with_name(f".{path.name}.part")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        figure.savefig(aside, format="png", dpi=DPI, metadata={
            "Software": None, "Title": title, "Description": description,
        })
        os.replace(aside, path)
    except OSError as error:
        with suppress(OSError):
            aside.unlink(missing_ok=True)
        raise OutputError(
            f"the picture cannot be written: {error.strerror or error}", where=str(path),
            mend="free some space, or give `output: {folder: ...}` a folder that can be written",
        ) from error
    return path
