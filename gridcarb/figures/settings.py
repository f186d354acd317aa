"""What every figure of a recipe may say; each kind adds its own words in its own file."""

from __future__ import annotations

from pydantic import Field

from gridcarb.settings import Settings


class FigureSettings(Settings):
    """The words shared by all kinds of figure."""

    kind: str = Field(description="the kind of figure")
    file: str | None = Field(
        None, pattern=r"^[^/\\]+\.png$",
        description="file name inside the result's figure folder, ending in .png; default made from the content",
    )
    title: str | None = Field(None, min_length=1, description="title above the figure; default made from the content")
