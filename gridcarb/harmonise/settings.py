"""The `reading` section of a recipe: how the numbers in the files are to be understood.

Everything here may be left out when the files say it themselves; what they leave open is either assumed with a notice
or refused with the line to write here.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, StringConstraints, field_validator

from gridcarb import units
from gridcarb.errors import UnknownWordError, did_you_mean
from gridcarb.fields import ROLES
from gridcarb.settings import Settings

TemperatureKind = Literal["in situ", "potential", "conservative"]
SalinityKind = Literal["practical", "absolute", "preformed"]
Amount = Annotated[str, StringConstraints(pattern=r"^(assume zero|\d+(\.\d+)?([eE][-+]?\d+)? ?[A-Za-zµμ].*)$")]
Density = Annotated[str, StringConstraints(pattern=r"^(from file|in situ|\d+(\.\d+)? ?kg[ /]m.*)$")]


class ReadingSettings(Settings):
    """How the input is understood where the files do not say, or say it wrongly."""

    temperature: TemperatureKind | None = Field(None, description="kind of temperature")
    salinity: SalinityKind | None = Field(None, description="kind of salinity")
    density: Density | None = Field(
        None, description="one density for all tracers given per volume: '1026 kg m-3', 'from file' or 'in situ' (TEOS-10)"
    )
    phosphate: Amount | None = Field(None, description="'assume zero' or one amount everywhere, such as '0.5 umol kg-1'")
    silicate: Amount | None = Field(None, description="'assume zero' or one amount everywhere, such as '2 umol kg-1'")
    depth: Literal["surface"] | None = Field(
        None, description="'surface': data without a vertical coordinate lie at 0 dbar"
    )
    coverage: Literal["global", "part"] | None = Field(
        None, description="'global': the sea area must be that of the ocean within 2 %; 'part': it need not be"
    )
    units: dict[str, str] = Field(
        default_factory=dict, description="role (or depth): units, where the file gives none or the wrong ones"
    )
    unusual_values: Literal["refuse", "accept"] = Field(
        "refuse", description="'accept': water far from sea water (rivers, brines, dosing) is meant"
    )
    mask_difference: float = Field(
        0.02, ge=0, le=1, description="share of wet cells in which the land masks of two roles may differ"
    )

    @field_validator("units")
    @classmethod
    def _of_roles(cls, stated: dict[str, str]) -> dict[str, str]:
        for word, text in stated.items():
            if word not in (*ROLES, "depth"):
                raise UnknownWordError(f"'{word}' is no role", mend=did_you_mean(word, (*ROLES, "depth")))
            units.read(text)
        return stated
