"""Figures from results: one kind of figure a file, all in one theme, nothing fetched at run time."""

from __future__ import annotations

from gridcarb.figures.kinds import FIGURES, FigureKind
from gridcarb.shelf import load_folder

load_folder(__name__)
FIGURES.close()

__all__ = ["FIGURES", "FigureKind"]
