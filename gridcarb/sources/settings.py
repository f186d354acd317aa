"""The `inputs` section of a recipe: which files, and which variable plays which role."""

from __future__ import annotations

from typing import Literal

from pydantic import Field, field_validator

from gridcarb.fields import ROLES
from gridcarb.settings import Settings


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

    files: tuple[str, ...] = Field((), description="NetCDF files, globs, or Zarr stores shared by all roles")
    temperature: RoleInput | None = None
    salinity: RoleInput | None = None
    dic: RoleInput | None = None
    alkalinity: RoleInput | None = None
    phosphate: RoleInput | None = None
    silicate: RoleInput | None = None
    time_gaps: Literal["refuse", "accept"] = Field("refuse", description="steps missing from the time axis")

    @field_validator("files", mode="before")
    @classmethod
    def _one_or_many(cls, value: object) -> object:
        return (value,) if isinstance(value, str) else value

    @field_validator(*ROLES, mode="before")
    @classmethod
    def _bare_name(cls, value: object) -> object:
        return {"variable": value} if isinstance(value, str) else value

    def role(self, key: str) -> RoleInput:
        """The settings of one role, empty if the recipe says nothing of it."""
        return getattr(self, key) or RoleInput()
