"""Ranges: for each field how many values, their extremes, and how many lie outside the sane range.

Counts and extremes only, so that neither the order in which blocks are merged nor their size changes anything. A mean over
cells of unlike size would mislead: means are weighted, see `means`.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from gridcarb.fields import Field
from gridcarb.products.lines import count_flags
from gridcarb.products.shelf import PRODUCTS, Product


@dataclass
class Range:
    """What is known of one field so far."""

    low: float
    high: float
    cells: int = 0
    values: int = 0
    minimum: float = math.inf
    maximum: float = -math.inf
    below: int = 0
    above: int = 0

    def add(self, values: NDArray[np.floating[Any]]) -> None:
        """Count in `values`; NaN or infinity is a cell without a value."""
        self.cells += values.size
        there = int(np.count_nonzero(np.isfinite(values)))
        if not there:
            return
        self.values += there
        low, high = float(np.fmin.reduce(values, axis=None)), float(np.fmax.reduce(values, axis=None))
        if math.isinf(low) or math.isinf(high):
            values = values[np.isfinite(values)]
            low, high = float(values.min()), float(values.max())
        self.minimum, self.maximum = min(self.minimum, low), max(self.maximum, high)
        self.below += int(np.count_nonzero(values < np.float64(self.low))) if low < self.low else 0
        self.above += int(np.count_nonzero(values > np.float64(self.high))) if high > self.high else 0

    def merge(self, other: Range) -> None:
        """Count in another share of the same field."""
        self.cells += other.cells
        self.values += other.values
        self.minimum = min(self.minimum, other.minimum)
        self.maximum = max(self.maximum, other.maximum)
        self.below += other.below
        self.above += other.above

    def report(self) -> dict[str, Any]:
        """Counts and extremes; None for the extremes of nothing."""
        some = self.values > 0
        return {
            "cells": self.cells, "values": self.values,
            "minimum": self.minimum if some else None, "maximum": self.maximum if some else None,
            "sane_range": [self.low, self.high], "below_sane_range": self.below, "above_sane_range": self.above,
        }


@dataclass
class Flags:
    """How often each value of a status occurs, by value; `words` names them."""

    words: tuple[tuple[int, str], ...]
    counts: dict[int, int] = field(default_factory=dict)

    def add(self, values: NDArray[np.int8]) -> None:
        """Count in the values of a status field."""
        for value, count in count_flags(values.ravel()).items():
            self.counts[value] = self.counts.get(value, 0) + count

    def merge(self, other: Flags) -> None:
        """Count in another share of the same status."""
        for value, count in other.counts.items():
            self.counts[value] = self.counts.get(value, 0) + count

    def report(self) -> dict[str, Any]:
        """Counts by word; a value that was never declared appears as the number it is."""
        words = dict(self.words)
        strangers = {str(value): self.counts[value] for value in sorted(self.counts.keys() - words.keys())}
        return {word: self.counts.get(value, 0) for value, word in self.words} | strangers


class Ranges:
    """The ranges of several fields, and the counts of a status."""

    def __init__(self, fields: Sequence[Field]) -> None:
        self.shares: dict[str, Range | Flags] = {
            entry.key: Flags(entry.flags) if entry.part == "status" else Range(*entry.sane_range) for entry in fields
        }

    def add(self, block: xr.Dataset) -> None:
        """Count in the fields of a block; every field must be there."""
        for key, share in self.shares.items():
            share.add(block.variables[key].values)

    def merge(self, other: Ranges) -> None:
        """Count in the shares of another tally of the same fields."""
        for key, share in self.shares.items():
            share.merge(other.shares[key])  # type: ignore[arg-type]

    def report(self) -> dict[str, Any]:
        """Field key -> its counts and extremes, or its counts by flag."""
        return {key: share.report() for key, share in self.shares.items()}


PRODUCTS.put("ranges", Product(
    "ranges", "number of values, extremes, and how many lie outside the sane range", Ranges,
))
