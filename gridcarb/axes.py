"""Finding the axes of a dataset by its CF attributes, never by the order of dimensions.

Used by every stage, so that all of them agree on which dimension is time, which is the vertical, and what is left.
"""
from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

GridKind = Literal["rectilinear", "curvilinear", "unstructured", "column"]


@dataclass(frozen=True)
class Axes:
    """The axes of a dataset, in its own names.

    time, vertical : dimension names, None if there is no such dimension.
    horizontal : dimension names, (y, x) for maps, (cell,) for unstructured grids and stations, () for a single column.
    time_coordinate, vertical_coordinate, latitude, longitude : variable names; None where absent. The vertical
        coordinate may be a scalar (then `vertical` is None) or missing.
    """

    time: str | None
    vertical: str | None
    horizontal: tuple[str, ...]
    time_coordinate: str | None
    vertical_coordinate: str | None
    latitude: str | None
    longitude: str | None

    @property
    def order(self) -> tuple[str, ...]:
        """Time, vertical, horizontal: the canonical order of dimensions."""
        return tuple(dim for dim in (self.time, self.vertical, *self.horizontal) if dim)
