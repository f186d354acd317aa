"""Sums of float64 numbers that do not depend on the order in which they are added, not even in the last bit."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

_BITS = 1074
"""Every finite float64 is a whole multiple of 2**-1074."""


@dataclass
class ExactSum:
    """A sum kept as a whole number of 2**-1074."""

    total: int = 0

    def add(self, value: float) -> None:
        """Add a finite number."""
        top, bottom = float(value).as_integer_ratio()
        self.total += top << (_BITS + 1 - bottom.bit_length())

    def merge(self, other: ExactSum) -> None:
        """Add another sum."""
        self.total += other.total

    def over(self, other: ExactSum | int) -> float | None:
        """This sum divided by a count or by another sum; None where that is zero."""
        below = other.total if isinstance(other, ExactSum) else other << _BITS
        return float(Fraction(self.total, below)) if below else None

    def __float__(self) -> float:
        return float(Fraction(self.total, 1 << _BITS))
