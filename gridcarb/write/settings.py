"""The `output` section of a recipe: where the result goes and in which form."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field

from gridcarb.settings import Settings

Files = Literal["one", "by field", "by year", "by month"]
Count = Annotated[int, Field(ge=1, strict=True)]


class ChunkSettings(Settings):
    """How long the chunks of the stored fields are; a block of a run is made of whole ones."""

    time: Count | None = Field(None, description="time steps of one chunk; default: chosen by the planner")
    cells: Count | None = Field(None, description="grid columns of one chunk; default: chosen by the planner")
    levels: Count | None = Field(None, description="levels of one chunk; default: chosen by the planner")


class OutputSettings(Settings):
    """One folder holds everything a run leaves: stores, maps and the journal."""

    folder: str = Field(description="the result folder, relative to the recipe; it appears when the run is complete")
    replace: bool = Field(False, description="true: a result of this name is replaced once the new one is complete")
    zarr: bool = Field(True, description="keep the Zarr store")
    zarr_format: Literal[2, 3] = Field(3, description="Zarr format of the store")
    chunks: ChunkSettings | None = Field(None, description="stated chunks of the store; default: chosen by the planner")
    netcdf: bool = Field(True, description="export a NetCDF-4 file")
    netcdf_files: Files = Field("one", description="one NetCDF file (fields.nc), or several in the folder netcdf: "
                                "by field, by year, by month")
    precision: Literal["float32", "float64"] = Field("float32", description="how fields are stored")
    amounts: Literal["per mass", "per volume"] = Field(
        "per mass", description="'per volume': amounts in mol m-3, with the density of the input"
    )
    attributes: dict[str, str | float | int] = Field(
        default_factory=dict, description="global attributes of your own: institution, license, creator_name ..."
    )
