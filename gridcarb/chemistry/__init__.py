"""The chemistry: numbers for cells. It knows no xarray, dask, file or recipe, except in `stage`.

Importing it fills the shelves: formulas, sets of constants, columns, and the derived fields of the catalogue.
"""

from __future__ import annotations

import gridcarb.chemistry.cell
from gridcarb.chemistry.constants_set import CONSTANTS
from gridcarb.chemistry.declare import COLUMNS, DERIVED, FORMULAS
from gridcarb.fields import FIELDS
from gridcarb.shelf import load_folder

__all__ = ["COLUMNS", "CONSTANTS", "DERIVED", "FORMULAS"]

for _folder in ("formulas", "constants", "derived"):
    load_folder(f"{__name__}.{_folder}")
import gridcarb.chemistry.status  # noqa: E402, F401  (the status comes last in the catalogue)

for _shelf in (FORMULAS, CONSTANTS, COLUMNS, DERIVED, FIELDS):
    _shelf.close()
