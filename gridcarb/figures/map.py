"""A map of one field at one level and time."""

from __future__ import annotations

import datetime
from collections.abc import Collection
from pathlib import Path
from typing import Literal

import xarray as xr
from pydantic import Field, field_validator

from gridcarb.errors import InputError, did_you_mean
from gridcarb.figures.cells import grid_of
from gridcarb.figures.choice import Choice, choose
from gridcarb.figures.kinds import FIGURES, FigureKind
from gridcarb.figures.settings import FigureSettings

Region = tuple[float, float, float, float]

POLAR_EDGE = 50.0
"""Where a polar view ends (degrees of latitude) unless `region` says otherwise."""


class MapSettings(FigureSettings):
    """One map."""

    kind: Literal["map"] = Field(description="'map'")
    field: str = Field(description="the field to draw")
    depth: float = Field(0.0, ge=0, description="m below the surface; the nearest level is drawn and named in the title")
    time: str | int = Field("first", description="'first', 'last', a date in quotes ('2005-07-16', '2005-07') or an index")
    projection: Literal["automatic", "global", "north", "south"] = Field(
        "automatic", description="'automatic' suits the extent of the grid; 'north' and 'south' look at a pole"
    )
    centre: float | None = Field(None, ge=-360, le=360, description="longitude in the middle; default: oceans stay whole")
    region: Region | None = Field(None, description="[west, east, south, north] in degrees")
    limits: tuple[float, float] | None = Field(None, description="[lowest, highest] of the colour scale")
    coastline: bool = Field(True, description="false: no coastline of the Earth (an invented or ancient ocean)")

    @field_validator("time", mode="before")
    @classmethod
    def _date_in_words(cls, value: object) -> object:
        return value.isoformat() if isinstance(value, datetime.date) else value

    @field_validator("region")
    @classmethod
    def _a_region(cls, value: Region | None) -> Region | None:
        if value is not None:
            west, east, south, north = value
            if not (-90 <= south < north <= 90 and -360 <= west <= 360 and -360 <= east <= 360 and west != east):
                raise ValueError("a region is [west, east, south, north] with south < north, in degrees")
        return value

    def window(self) -> Region | None:
        """The part of the Earth asked for, None for all that the grid covers."""
        caps = {"north": (-180.0, 180.0, POLAR_EDGE, 90.0), "south": (-180.0, 180.0, -90.0, -POLAR_EDGE)}
        return self.region or caps.get(self.projection)

    @field_validator("limits")
    @classmethod
    def _ascending(cls, value: tuple[float, float] | None) -> tuple[float, float] | None:
        if value is not None and not value[0] < value[1]:
            raise ValueError("limits are [lowest, highest], the lowest first")
        return value


def check(header: xr.Dataset, settings: MapSettings, fields: Collection[str] = ()) -> None:
    """Refuse what cannot be drawn, from coordinates alone; the fields may be absent or not computed yet.

    fields : what the result will hold besides.

    Raises
    ------
    UnknownWordError, InputError : no such field, depth, time or place.
    """
    choice = _chosen(header, settings, fields)
    grid = grid_of(header, choice.axes)
    window = settings.window()
    if window and not grid.holds(*window):
        west, east, south, north = grid.extent()
        raise InputError(
            "the map would be empty: no cell of the grid lies in it", where="figures: region, projection",
            mend=f"the grid reaches from {west:.4g} to {east:.4g} degrees east, {south:.4g} to {north:.4g} degrees north; "
            "write another `region: [west, east, south, north]` or leave `projection` out in the recipe",
        )


def draw(result: xr.Dataset, settings: MapSettings, folder: Path) -> Path:
    """Draw the map from a result (lazy or loaded; only the slice shown is read) and write it into `folder`.

    Land is told from missing values by the `solution_status` of the result, see `ground.solid_ground`. Results whose global
    attribute `geography` is "invented" get no coastline of the Earth.

    Raises
    ------
    UnknownWordError, InputError : as `check`, or the result does not hold the field.
    OutputError : the file cannot be written.
    """
    # Late, because matplotlib is slow to load and most commands draw nothing.
    from gridcarb.figures.drawing.chart import publish
    from gridcarb.figures.drawing.plates import plate_of

    if settings.field not in result:
        known = [str(name) for name in result.data_vars]
        raise InputError(
            f"the result holds no '{settings.field}'", where="figures: field",
            mend=f"add it to `chemistry: {{fields: [...]}}` in the recipe; {did_you_mean(settings.field, known)}",
        )
    check(result, settings)
    choice = _chosen(result, settings)
    return publish(plate_of(result, choice, settings), folder / file_name(result, settings))


def _chosen(ds: xr.Dataset, settings: MapSettings, fields: Collection[str] = ()) -> Choice:
    return choose(ds, settings.field, settings.depth, settings.time, fields)


def file_name(header: xr.Dataset, settings: MapSettings, fields: Collection[str] = ()) -> str:
    """As the recipe says, else field, depth, time, and how it is looked at when that was said."""
    if settings.file:
        return settings.file
    choice, place = _chosen(header, settings, fields), ""
    if settings.region:
        place = "_".join(f"{edge:g}" for edge in settings.region)
    elif settings.projection != "automatic":
        place = settings.projection
    return "_".join(part for part in (settings.field, choice.level.slug, choice.moment.slug, place) if part) + ".png"


FIGURES.put("map", FigureKind(MapSettings, check, draw, file_name))
