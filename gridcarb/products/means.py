"""Means over space: by area at the top of the sea, by volume over all of it, with how much of it had values.

Every cell counts by its area (or volume) and by the part its time step is of the whole time, so that areas and volumes
are those of the mean time. Sums within a block are float64, blocks are added exactly (see `ranges`).
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from gridcarb.fields import Field
from gridcarb.products.exact import ExactSum
from gridcarb.products.lines import keep_weights, weigh, weigh_flags, weigh_powers
from gridcarb.products.shelf import PRODUCTS, Product

Numbers = NDArray[np.float64]


@dataclass
class Mean:
    """Weight that had values, weighted values, and for a pH its hydrogen ion."""

    is_ph: bool
    weight: ExactSum = field(default_factory=ExactSum)
    total: ExactSum = field(default_factory=ExactSum)
    hydrogen: ExactSum = field(default_factory=ExactSum)

    def add(self, values: NDArray[np.floating[Any]], weights: Numbers) -> None:
        """Count in values with their weights, 0 for a cell that does not count; NaN has none."""
        weight, total = weigh(values, weights)
        self.weight.add(weight)
        self.total.add(total)
        if self.is_ph:
            self.hydrogen.add(weigh_powers(values, weights))

    def merge(self, other: Mean) -> None:
        """Count in another share of the same field."""
        self.weight.merge(other.weight)
        self.total.merge(other.total)
        self.hydrogen.merge(other.hydrogen)

    def report(self, whole: ExactSum) -> dict[str, float | None]:
        """The mean, the part of the `whole` weight that had values, and for a pH the one of the mean hydrogen ion."""
        found = {"mean": self.total.over(self.weight), "coverage": self.weight.over(whole)}
        if self.is_ph:
            hydrogen = self.hydrogen.over(self.weight)
            found["ph_of_mean_hydrogen_ion"] = -math.log10(hydrogen) if hydrogen else None
        return found


@dataclass
class Extents:
    """Weight by each value of a status; `words` names them."""

    words: tuple[tuple[int, str], ...]
    weights: dict[int, ExactSum] = field(default_factory=dict)

    def add(self, values: NDArray[np.int8], weights: Numbers) -> None:
        """Count in the weights of each value."""
        for value, weight in weigh_flags(values, weights).items():
            self.weights.setdefault(value, ExactSum()).add(weight)

    def merge(self, other: Extents) -> None:
        """Count in another share of the same status."""
        for value, weight in other.weights.items():
            self.weights.setdefault(value, ExactSum()).merge(weight)

    def report(self, whole: ExactSum) -> dict[str, float | None]:
        """The part of the `whole` weight by word; a value that was never declared appears as the number it is."""
        words = dict(self.words)
        return {words.get(value, str(value)): self.weights[value].over(whole) for value in sorted(self.weights)}


class Means:
    """The means of several fields; `known` says which weights the blocks came with."""

    def __init__(self, fields: Sequence[Field]) -> None:
        self.known: set[str] = set()
        self.sizes = {extent: ExactSum() for extent in ("surface", "volume")}
        self.shares: dict[str, dict[str, Mean | Extents]] = {
            extent: {entry.key: _empty(entry) for entry in fields} for extent in self.sizes
        }

    def add(self, block: xr.Dataset) -> None:
        """Count in a block.

        Its coordinates tell its weights: cell_area (m2), sea (whether a cell is water), top_level (index of the uppermost
        water of a column, -1 without any), time_share, and cell_thickness (m) where it is known. Without areas nothing is
        counted.
        """
        if "cell_area" not in block.coords:
            return
        told = block.variables
        fields = {key: told[key] for key in self.shares["surface"]}
        top, sea = told["top_level"], told["sea"]
        area = [told[name] for name in ("cell_area", "time_share") if name in told]
        vertical = next((dim for dim in sea.dims if dim not in top.dims), None)
        self._count("surface", fields if vertical is None else _at_level(fields, top, vertical), area, top >= 0)
        if "cell_thickness" in told:
            self._count("volume", fields, [*area, told["cell_thickness"]], sea)

    def _count(
        self, extent: str, fields: Mapping[str, xr.Variable], factors: Sequence[xr.Variable], sea: xr.Variable
    ) -> None:
        """Count in fields whose cells weigh the product of the factors, where they are sea."""
        self.known.add(extent)
        sizes = dict(next(iter(fields.values())).sizes)
        weights = np.ones(tuple(sizes.values()))
        for factor in factors:
            weights *= _spread(factor, sizes)
        flat = weights.ravel()
        self.sizes[extent].add(keep_weights(flat, np.ascontiguousarray(_spread(sea, sizes)).ravel()))
        for key, share in self.shares[extent].items():
            share.add(_spread(fields[key], sizes).ravel(), flat)

    def merge(self, other: Means) -> None:
        """Count in the shares of another tally of the same fields."""
        self.known |= other.known
        for extent, size in self.sizes.items():
            size.merge(other.sizes[extent])
            for key, share in self.shares[extent].items():
                share.merge(other.shares[extent][key])  # type: ignore[arg-type]

    def report(self) -> dict[str, Any]:
        """For the surface (m2) and the volume (m3): its size, and for each field its mean and coverage; None: not known."""
        return {
            extent: {
                "units": units, "sea": float(size),
                "fields": {key: share.report(size) for key, share in self.shares[extent].items()},
            } if extent in self.known else None
            for (extent, size), units in zip(self.sizes.items(), ("m2", "m3"), strict=True)
        }  # fmt: skip


def _spread(variable: xr.Variable, sizes: Mapping[Any, int]) -> NDArray[Any]:
    """The numbers over all of `sizes`, in its order of dimensions."""
    if variable.dims == tuple(sizes):
        return variable.values
    spread = variable.set_dims(dict(sizes)).transpose(*sizes)  # type: ignore[no-untyped-call]
    return np.asarray(spread.values)


def _at_level(fields: Mapping[str, xr.Variable], top: xr.Variable, vertical: Any) -> dict[str, xr.Variable]:
    """Each field at the level that `top` tells for each column; where it tells none, at the first."""
    if not (top.values > 0).any():
        return {key: field_.isel({vertical: 0}) for key, field_ in fields.items()}
    found = {}
    for key, field_ in fields.items():
        rest = [dim for dim in field_.dims if dim != vertical]
        place = np.maximum(top.transpose(*rest).values, 0)[..., np.newaxis]
        values = np.take_along_axis(field_.transpose(*rest, vertical).values, place, axis=-1)
        found[key] = xr.Variable(rest, values[..., 0])
    return found


def _empty(entry: Field) -> Mean | Extents:
    if entry.part == "status":
        return Extents(entry.flags)
    return Mean(is_ph=entry.scale is not None and entry.key.startswith("ph_"))


PRODUCTS.put("means", Product(
    "means", "means by area at the top of the sea and by volume over all of it, with the part of the sea that had values",
    Means,
))
