"""Declaring: a published equation with its citation and check value, and the columns a tile is made of."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from gridcarb.chemistry.compiled import arguments, scalar
from gridcarb.citations import CITATIONS
from gridcarb.fields import Field, declare
from gridcarb.shelf import Shelf


@dataclass(frozen=True)
class Check:
    """A published value of an equation: at t (degC), s (practical salinity) and surface pressure, to half a unit of
    the last printed digit. `from_memory` says that the print itself was not at hand."""

    value: float
    half_unit: float
    source: str
    t: float = 25.0
    s: float = 35.0
    from_memory: bool = True


@dataclass(frozen=True)
class Formula:
    """One published equation: `cell` computes it for one cell from the columns its arguments name.

    scale : the pH scale of a dissociation constant ("total", "free", "seawater"), "" where none applies.
    units : of the value, or of the argument of the logarithm when the key begins with ``ln_``.
    """

    key: str
    cell: Any
    units: str
    scale: str
    citation: str
    check: Check

    @property
    def columns(self) -> tuple[str, ...]:
        """The columns the equation reads."""
        return arguments(self.cell)


FORMULAS: Shelf[Formula] = Shelf("formula")
"""Every published equation, under author-year keys such as ``ln_k1_lueker2000``."""


def formula(*, units: str, citation: str, check: Check, scale: str = "") -> Callable[[Callable[..., float]], Formula]:
    """Declare the decorated scalar function as a published equation under its own name."""
    CITATIONS[citation]

    def enter(function: Callable[..., float]) -> Formula:
        entry = Formula(function.__name__, scalar(function), units, scale, citation, check)
        return FORMULAS.put(entry.key, entry)

    return enter


COLUMNS: Shelf[Any] = Shelf("column")
"""Quantities of a cell that follow from other columns by a scalar function: name -> compiled function.

Two rules save declarations: ``ln_x`` is the natural logarithm of column ``x``; and where only ``ln_x`` is declared,
``x`` is its exponential.
"""

DERIVED: Shelf[Any] = Shelf("derived field")
"""Derived fields of the catalogue: key -> compiled function of the columns its arguments name."""


def column(function: Callable[..., float]) -> Any:
    """Declare the decorated scalar function as the column of its own name."""
    return COLUMNS.put(function.__name__, scalar(function))


def derived(field: Field) -> Callable[[Callable[..., float]], Any]:
    """Declare a field of the catalogue together with the scalar function that computes it.

    The function's arguments name columns of the solved cell: inputs (t, s, p_bar, dic, alk, pt, sit; amounts in
    mol/kg), constants (k0, k1, ...), totals (bt, st, ft, ca), hydrogen ion h, or other derived fields by key.
    """

    def enter(function: Callable[..., float]) -> Any:
        if function.__name__ != field.key:
            raise RuntimeError(f"the function of field '{field.key}' is called '{function.__name__}'")
        declare(field)
        return DERIVED.put(field.key, scalar(function))

    return enter
