"""The base of every section of a recipe: frozen, checked, and without room for unknown keys."""

from __future__ import annotations

from pydantic import BaseModel, ConfigDict


class Settings(BaseModel):
    """Each stage, figure and product declares its own section as a subclass, in its own folder."""

    model_config = ConfigDict(extra="forbid", frozen=True, validate_default=True)
