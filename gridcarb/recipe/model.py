"""The recipe: the settings classes of all stages under one roof, and the sections that belong to no stage."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    Field,
    PrivateAttr,
    SerializeAsAny,
    field_validator,
    model_validator,
)

from gridcarb.chemistry.constants import CONSTANTS
from gridcarb.errors import UnknownWordError
from gridcarb.fields import FIELDS
from gridcarb.figures import FIGURES
from gridcarb.figures.settings import FigureSettings
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.recipe.engine import EngineSettings
from gridcarb.settings import Settings
from gridcarb.sources.settings import InputsSettings
from gridcarb.write.settings import OutputSettings


def derived_fields() -> tuple[str, ...]:
    """What the word 'all' stands for: every derived field of the catalogue."""
    return tuple(key for key, field in FIELDS.items() if field.part == "derived")


def _known_field(key: str) -> str:
    FIELDS[key]
    return key


def _known_set(key: str) -> str:
    CONSTANTS[key]
    return key


def _known_kind(key: object) -> object:
    if key is None:
        raise UnknownWordError("the kind of figure is missing", mend=f"write `kind: ...`, one of: {', '.join(FIGURES)}")
    FIGURES[str(key)]
    return key


FieldKey = Annotated[str, AfterValidator(_known_field)]
SetKey = Annotated[str, AfterValidator(_known_set)]


class ChemistrySettings(Settings):
    """Which fields are computed, and with which equilibrium constants."""

    constants: SetKey = Field("guide2007", description="set of equilibrium constants")
    fields: tuple[FieldKey, ...] = Field(
        min_length=1, description="fields to compute, by catalogue key, or 'all'; an input is written as it was understood"
    )

    @field_validator("fields", mode="before")
    @classmethod
    def _all_or_one(cls, value: object) -> object:
        if value == "all":
            return derived_fields()
        return (value,) if isinstance(value, str) else value

    @field_validator("fields", mode="after")
    @classmethod
    def _each_once(cls, value: tuple[str, ...]) -> tuple[str, ...]:
        twice = sorted({key for key in value if value.count(key) > 1})
        if twice:
            raise UnknownWordError(f"written more than once: {', '.join(twice)}", mend="name each field once")
        return value


class _KindOnly(BaseModel):
    kind: Annotated[object, AfterValidator(_known_kind)] = Field(None, validate_default=True)


def _figure(value: object) -> object:
    """A mapping becomes the settings class its `kind` names; faults keep their key path."""
    if not isinstance(value, Mapping):
        return value
    kind = _KindOnly.model_validate(value).kind
    return FIGURES[str(kind)].settings.model_validate(value)


Figure = Annotated[SerializeAsAny[FigureSettings], BeforeValidator(_figure)]


@dataclass(frozen=True)
class Origin:
    """Where a recipe came from.

    base : the folder its paths are relative to, absolute.
    path : its file; None if it was given as text.
    text : as written.
    digest : SHA-256 of the text and of the inputs and result folder given on the command line.
    """

    base: Path
    path: Path | None = None
    text: str = ""
    digest: str = ""


class Recipe(Settings):
    """One recipe, checked. Paths in it are relative to `base`."""

    recipe: Literal[1] = Field(description="version of the recipe format; this program reads 1")
    title: str = Field("Marine carbonate system", description="title of the result, written into its files")
    inputs: InputsSettings = InputsSettings()
    reading: ReadingSettings = ReadingSettings()
    chemistry: ChemistrySettings
    output: OutputSettings
    figures: tuple[Figure, ...] = Field((), description="figures to draw, each with its kind")
    engine: EngineSettings = EngineSettings()

    _origin: Origin = PrivateAttr(default_factory=lambda: Origin(Path.cwd()))

    @model_validator(mode="before")
    @classmethod
    def _empty_sections(cls, value: Any) -> Any:
        """A section whose every line is commented out is a section left out."""
        return {key: part for key, part in value.items() if part is not None} if isinstance(value, dict) else value

    def model_post_init(self, context: Any, /) -> None:
        """Keep the origin, which comes as validation context: it is not a key of the recipe."""
        if isinstance(context, Origin):
            self._origin = context

    @property
    def path(self) -> Path | None:
        """The file of the recipe; None if it was given as text."""
        return self._origin.path

    @property
    def text(self) -> str:
        """The recipe as written."""
        return self._origin.text

    @property
    def digest(self) -> str:
        """SHA-256 of the text and of the inputs and result folder given on the command line."""
        return self._origin.digest

    @property
    def base(self) -> Path:
        """The folder the recipe's paths are relative to."""
        return self._origin.base

    def output_folder(self) -> Path:
        """The result folder, absolute."""
        return resolved(self.output.folder, self.base)


def resolved(folder: str, base: Path) -> Path:
    """`folder` made absolute; links are kept as they are, `~` is the home folder."""
    return Path(os.path.abspath(base / Path(folder).expanduser()))
