"""Summaries of a whole run, added up block by block: one product a file, each on the shelf PRODUCTS.

A product makes a *tally*. Every task starts an empty one, adds its block and hands it back; the tallies are merged in
whatever order they come, and the last one reports.
"""

from __future__ import annotations

from gridcarb.products.shelf import PRODUCTS, Product, Tally
from gridcarb.shelf import load_folder

load_folder(__name__)
PRODUCTS.close()

__all__ = ["PRODUCTS", "Product", "Tally"]
