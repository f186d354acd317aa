"""The kinds of figure, and what ships with them."""

from __future__ import annotations

import json
import subprocess
import sys
from importlib.resources import files

import pytest
import shapely.geometry

from gridcarb.errors import UnknownWordError
from gridcarb.figures import FIGURES
from gridcarb.figures.settings import FigureSettings


def test_every_kind_is_whole() -> None:
    assert "map" in FIGURES
    for key, kind in FIGURES.items():
        assert issubclass(kind.settings, FigureSettings)
        assert kind.settings.model_fields["kind"].annotation.__args__ == (key,)
        assert all(field.description for field in kind.settings.model_fields.values())
    with pytest.raises(UnknownWordError, match="no figure 'mapp'"):
        FIGURES["mapp"]


def test_the_settings_come_without_matplotlib() -> None:
    code = "import sys, gridcarb.figures; sys.exit('matplotlib' in sys.modules or 'cartopy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_the_coastline_says_where_it_comes_from_and_is_sound() -> None:
    text = files("gridcarb.figures").joinpath("coastline.geojson").read_text(encoding="utf-8")
    assert len(text) < 200_000
    collection = json.loads(text)
    assert "Natural Earth" in collection["source"]
    assert collection["licence"] == "public domain"
    shapes = {part["properties"]["name"]: shapely.geometry.shape(part["geometry"]) for part in collection["features"]}
    assert set(shapes) == {"land", "coastline"}
    assert all(shape.is_valid for shape in shapes.values())
    land = shapes["land"]
    places = {(25, 0): True, (135, -25): True, (-100, 45): True, (0, -85): True, (-150, 0): False, (-30, 40): False}
    assert {place: land.contains(shapely.geometry.Point(place)) for place in places} == places
