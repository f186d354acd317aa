"""What was decided about the input, in words for people and in numbers for the blocks."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Generic, TypeVar

from gridcarb.axes import Axes
from gridcarb.errors import Notice

if TYPE_CHECKING:
    from gridcarb.harmonise.amounts import AmountReading, DensityReading
    from gridcarb.harmonise.depth import PlaceReading
    from gridcarb.harmonise.masks import MaskReading
    from gridcarb.harmonise.measures import MeasuresReading
    from gridcarb.harmonise.nutrients import NutrientReading
    from gridcarb.harmonise.salinity import SalinityReading
    from gridcarb.harmonise.temperature import TemperatureReading
    from gridcarb.harmonise.thickness import ThicknessReading

R = TypeVar("R")


@dataclass(frozen=True)
class Decision:
    """One decision: what it concerns, how that is read, and because of what."""

    subject: str
    reading: str
    because: str

    def __str__(self) -> str:
        return f"{self.subject}: {self.reading} ({self.because})"


@dataclass(frozen=True)
class Decided(Generic[R]):
    """A reading, the sentences that explain it, and the notices of what was assumed in it."""

    reading: R
    decisions: tuple[Decision, ...] = ()
    notices: tuple[Notice, ...] = ()


@dataclass(frozen=True)
class Understanding:
    """How one collection is read: all that `clothe` needs, picklable, the same for every block.

    decisions, notices : for people, in the order they were taken.
    axes : the axes of the grid.
    masks : role or coordinate name -> how missing values are marked in it.
    measures : how cells are weighed in means over space; None where nobody asked for such.
    thickness : how thick cells are; None where nobody asked, or it cannot be known.
    """

    axes: Axes
    masks: Mapping[str, MaskReading]
    place: PlaceReading
    temperature: TemperatureReading
    salinity: SalinityReading
    amounts: Mapping[str, AmountReading]
    density: DensityReading
    nutrients: Mapping[str, NutrientReading]
    measures: MeasuresReading | None = None
    thickness: ThicknessReading | None = None
    decisions: tuple[Decision, ...] = ()
    notices: tuple[Notice, ...] = ()
