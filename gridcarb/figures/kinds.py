"""The shelf of the kinds of figure. A new kind is one new file in this folder that puts itself here."""

from __future__ import annotations

from collections.abc import Callable, Collection
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import xarray as xr

from gridcarb.figures.settings import FigureSettings
from gridcarb.shelf import Shelf


@dataclass(frozen=True)
class FigureKind:
    """One kind of figure.

    settings : the class of its section in a recipe.
    check : `check(header, settings, fields)` raises InputError for what cannot be drawn of a result that will hold
        `fields`; reads no field.
    draw : `draw(result, settings, folder)` writes one PNG and gives its path.
    file_name : `file_name(header, settings, fields)` is the name `draw` will give it.
    """

    settings: type[FigureSettings]
    check: Callable[[xr.Dataset, Any, Collection[str]], None]
    draw: Callable[[xr.Dataset, Any, Path], Path]
    file_name: Callable[[xr.Dataset, Any, Collection[str]], str]


FIGURES: Shelf[FigureKind] = Shelf("figure")
