"""The land and the coastline of the Earth, kept beside this package; nothing is fetched."""

from __future__ import annotations

import json
from functools import cache
from importlib.resources import files
from typing import Any

import cartopy.crs as ccrs
import shapely.geometry
from cartopy.mpl.geoaxes import GeoAxes

from gridcarb.figures.drawing import theme


@cache
def _shapes() -> dict[str, Any]:
    """ "land" (polygons) and "coastline" (lines), degrees east and north."""
    collection = json.loads(files("gridcarb.figures").joinpath("coastline.geojson").read_text(encoding="utf-8"))
    return {part["properties"]["name"]: shapely.geometry.shape(part["geometry"]) for part in collection["features"]}


def lay_land(ax: GeoAxes) -> None:
    """Land beneath the cells, for what lies outside the grid."""
    ax.add_geometries([_shapes()["land"]], ccrs.PlateCarree(), facecolor=theme.LAND, edgecolor="none", zorder=1)


def trace_coast(ax: GeoAxes) -> None:
    """The coastline above the cells."""
    ax.add_geometries(
        [_shapes()["coastline"]], ccrs.PlateCarree(), facecolor="none", edgecolor=theme.COAST, linewidth=0.5, zorder=4
    )
