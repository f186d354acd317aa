"""What a product is, and the shelf that holds them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Protocol, Self, runtime_checkable

import xarray as xr

from gridcarb.fields import Field
from gridcarb.shelf import Shelf


@runtime_checkable
class Tally(Protocol):
    """A share of a summary: small, picklable, and indifferent to the order in which shares are merged."""

    def add(self, block: xr.Dataset) -> None:
        """Count in one block of results; each block is counted in once in all tallies together."""

    def merge(self, other: Self) -> None:
        """Count in what `other` has counted; `other` stays as it is."""

    def report(self) -> dict[str, Any]:
        """The summary as plain JSON values, None where there is no value."""


class Starter(Protocol):
    """How an empty tally is made."""

    def __call__(self, fields: Sequence[Field]) -> Tally:
        """An empty tally for `fields`, as they are written (per mass or per volume)."""


@dataclass(frozen=True)
class Product:
    """One summary: its key in the journal, what it tells, and how to start it."""

    key: str
    tells: str
    start: Starter


PRODUCTS: Shelf[Product] = Shelf("product")
