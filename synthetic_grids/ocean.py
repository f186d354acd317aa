"""The whole state of the invented ocean at any place, depth and time."""

from __future__ import annotations

from collections.abc import Callable

from numpy.typing import ArrayLike

from synthetic_grids import carbon, water
from synthetic_grids.place import Place, places
from synthetic_grids.sphere import Numbers

TRACERS: dict[str, Callable[[Place, ArrayLike, ArrayLike], Numbers]] = {
    "temperature": water.temperature,
    "salinity": water.salinity,
    "dic": carbon.dic,
    "alkalinity": carbon.alkalinity,
    "phosphate": carbon.phosphate,
    "silicate": carbon.silicate,
}
"""In-situ temperature in degC (ITS-90), practical salinity, and umol kg-1 of sea water for the rest."""


def state(longitude: ArrayLike, latitude: ArrayLike, depth: ArrayLike, year: ArrayLike) -> dict[str, Numbers]:
    """Every tracer by key, at degrees east, degrees north, depth in m (positive down) and time in decimal years.

    All arguments broadcast; longitude and latitude are broadcast with each other first, so give them only the axes they
    need. Nothing is masked: the formulas hold on land and below the sea floor too (see `synthetic_grids.geography`).
    """
    here = places(longitude, latitude)
    return {key: formula(here, depth, year) for key, formula in TRACERS.items()}
