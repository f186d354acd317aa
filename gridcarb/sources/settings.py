"""The `inputs` section of a recipe: which files, and which variable plays which role."""

from __future__ import annotations

from typing import Literal

from pydantic import Field, field_validator

from gridcarb.fields import ROLES
from gridcarb.settings import Settings
from gridcarb.sources.conventions import MEASURES
from gridcarb.sources.dates import Months


class RoleInput(Settings):
    """Where one role comes from, when that differs from the rest or must be said."""

    files: tuple[str, ...] = Field((), description="files or globs of this role alone; empty: the shared files")
    variable: str | None = Field(None, description="name of the variable in the files; empty: found by its attributes")

    @field_validator("files", mode="before")
    @classmethod
    def _one_or_many(cls, value: object) -> object:
        return (value,) if isinstance(value, str) else value


class InputsSettings(Settings):
    """Files and roles. A path is relative to the recipe; a role may be given as a bare variable name."""

    files: tuple[str, ...] = Field(
        (), description="NetCDF files, globs, Zarr stores or URLs shared by all roles; FILE#GROUP reads a group",
    )
    temperature: RoleInput | None = None
    salinity: RoleInput | None = None
    dic: RoleInput | None = None
    alkalinity: RoleInput | None = None
    phosphate: RoleInput | None = None
    silicate: RoleInput | None = None
    area: RoleInput | None = Field(None, description="horizontal area of the cells; found by itself in the shared files")
    volume: RoleInput | None = Field(None, description="volume of the cells")
    thickness: RoleInput | None = Field(None, description="thickness of the cells, also changing in time")
    sea_fraction: RoleInput | None = Field(None, description="share of a cell's area that is sea")
    basin: RoleInput | None = Field(None, description="number of the sea basin a cell belongs to")
    sea_floor_depth: RoleInput | None = Field(None, description="depth of the sea floor")
    time_gaps: Literal["refuse", "accept"] = Field("refuse", description="steps missing from the time axis")
    months: Months = Field(
        "refuse", description="what times in 'months since' a date mean: months of the calendar, or mean months (a twelfth "
        "of 365.2422 days); years likewise",
    )

    @field_validator("files", mode="before")
    @classmethod
    def _one_or_many(cls, value: object) -> object:
        return (value,) if isinstance(value, str) else value

    @field_validator(*ROLES, *MEASURES, mode="before")
    @classmethod
    def _bare_name(cls, value: object) -> object:
        return {"variable": value} if isinstance(value, str) else value

    def role(self, key: str) -> RoleInput:
        """The settings of one role or measure, empty if the recipe says nothing of it."""
        return getattr(self, key) or RoleInput()
