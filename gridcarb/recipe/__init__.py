"""Recipes: text in, a checked `Recipe` out, or every fault of the text with its line."""

from __future__ import annotations

from gridcarb.recipe.load import check, check_reading, load
from gridcarb.recipe.model import Origin, Recipe
from gridcarb.recipe.reference import Row, reference

__all__ = ["Origin", "Recipe", "Row", "check", "check_reading", "load", "reference"]
