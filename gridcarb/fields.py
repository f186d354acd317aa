"""The catalogue: every quantity gridcarb reads, computes or writes, declared once.

Inputs are declared here; a derived field is declared beside the function that computes it (`chemistry/derived`) and
put on the same shelf. The declaration feeds the attributes and encoding of the stores, the range checks, the maps, the
listing on the terminal, the table of the README, the recipe's suggestions and the tests.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

import numpy as np

from gridcarb.citations import CITATIONS
from gridcarb.shelf import Shelf

Extent = Literal["cell", "column", "surface"]
Part = Literal["input", "derived", "status"]


@dataclass(frozen=True)
class Ink:
    """How a map draws the field: a colour-blind safe matplotlib palette, the value its middle stands for (None for a
    one-way palette), and fixed limits (None: taken from the data)."""

    palette: str = "viridis"
    centre: float | None = None
    limits: tuple[float, float] | None = None


@dataclass(frozen=True, kw_only=True)
class Field:
    """One quantity.

    key : the word used in recipes, datasets and stores.
    long_name, units : as written to files (units that UDUNITS can read).
    standard_name : only where the official CF table has one for these units; None otherwise.
    volume_standard_name : the CF standard name of the amount per volume (mol m-3), where the table has one.
    scale : the pH scale or measurement scale, where there is one.
    extent : one value a cell, a column, or a piece of surface.
    part : input, derived or status.
    sane_range : values outside it are reported (never altered).
    ink : how it is drawn.
    digits : decimals worth printing.
    comment : what a reader of the file must know.
    citations : keys of the citation shelf.
    flags : for a status field, value -> one word.
    """

    key: str
    long_name: str
    units: str
    sane_range: tuple[float, float]
    digits: int
    standard_name: str | None = None
    volume_standard_name: str | None = None
    scale: str | None = None
    extent: Extent = "cell"
    part: Part = "derived"
    ink: Ink = field(default_factory=Ink)
    comment: str = ""
    citations: tuple[str, ...] = ()
    flags: tuple[tuple[int, str], ...] = ()

    def __post_init__(self) -> None:
        for key in self.citations:
            CITATIONS[key]

    def attributes(self) -> dict[str, object]:
        """The CF attributes of the variable, without fill value or encoding."""
        found: dict[str, object] = {"long_name": self.long_name, "units": self.units}
        if self.standard_name:
            found["standard_name"] = self.standard_name
        comment = " ".join(part for part in (self.scale and f"pH scale: {self.scale}.", self.comment) if part)
        if comment:
            found["comment"] = comment
        if self.citations:
            found["references"] = "; ".join(CITATIONS[key].text for key in self.citations)
        if self.flags:
            found["flag_values"] = np.array([value for value, _ in self.flags], dtype="int8")
            found["flag_meanings"] = " ".join(word for _, word in self.flags)
        return found


FIELDS: Shelf[Field] = Shelf("field")


def declare(entry: Field) -> Field:
    """Put a field into the catalogue."""
    return FIELDS.put(entry.key, entry)


declare(Field(
    key="temperature", long_name="sea water temperature, in situ", units="degC", standard_name="sea_water_temperature",
    scale=None, part="input", sane_range=(-2.5, 45.0), digits=3, ink=Ink("plasma"), comment="ITS-90, in situ.",
    citations=("teos10",),
))
declare(Field(
    key="salinity", long_name="sea water practical salinity", units="1", standard_name="sea_water_practical_salinity",
    part="input", sane_range=(0.0, 50.0), digits=3, ink=Ink("cividis"), comment="PSS-78.", citations=("teos10",),
))
declare(Field(
    key="sea_pressure", long_name="sea pressure (absolute pressure minus one standard atmosphere)", units="dbar",
    standard_name="sea_water_pressure_due_to_sea_water", part="input", sane_range=(0.0, 12000.0), digits=1,
    ink=Ink("cividis"), citations=("teos10",),
))
declare(Field(
    key="dic", long_name="dissolved inorganic carbon", units="umol kg-1",
    standard_name="moles_of_dissolved_inorganic_carbon_per_unit_mass_in_sea_water",
    volume_standard_name="mole_concentration_of_dissolved_inorganic_carbon_in_sea_water", part="input",
    sane_range=(200.0, 5000.0), digits=1, ink=Ink("viridis"),
))
declare(Field(
    key="alkalinity", long_name="total alkalinity", units="umol kg-1",
    standard_name="sea_water_alkalinity_per_unit_mass_expressed_as_mole_equivalent",
    volume_standard_name="sea_water_alkalinity_expressed_as_mole_equivalent", part="input",
    sane_range=(0.0, 5000.0), digits=1, ink=Ink("viridis"), citations=("dickson1981",),
))
declare(Field(
    key="phosphate", long_name="total dissolved inorganic phosphate", units="umol kg-1",
    standard_name="moles_of_phosphate_per_unit_mass_in_sea_water",
    volume_standard_name="mole_concentration_of_phosphate_in_sea_water", part="input", sane_range=(0.0, 20.0), digits=2,
    ink=Ink("viridis"),
))
declare(Field(
    key="silicate", long_name="total dissolved inorganic silicate", units="umol kg-1",
    standard_name="moles_of_silicate_per_unit_mass_in_sea_water",
    volume_standard_name="mole_concentration_of_silicate_in_sea_water", part="input", sane_range=(0.0, 400.0), digits=1,
    ink=Ink("viridis"),
))

ROLES: tuple[str, ...] = ("temperature", "salinity", "dic", "alkalinity", "phosphate", "silicate")
"""The quantities a user's files may supply; pressure follows from depth and latitude."""

REQUIRED_ROLES: tuple[str, ...] = ROLES[:4]
NUTRIENTS: tuple[str, ...] = ROLES[4:]
