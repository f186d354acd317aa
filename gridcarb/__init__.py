"""gridcarb: the marine carbonate system on gridded ocean model output and climatologies.

`speciate` computes it for numbers and arrays, `derive` for xarray datasets; recipes are run by the command ``gridcarb``.
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from gridcarb.chemistry.tile import speciate
    from gridcarb.errors import GridcarbError, NoticeWarning
    from gridcarb.fields import FIELDS
    from gridcarb.run.lazy import derive

__all__ = ["FIELDS", "GridcarbError", "NoticeWarning", "__version__", "derive", "speciate"]

_HOMES = {
    "speciate": "gridcarb.chemistry.tile",
    "derive": "gridcarb.run.lazy",
    "GridcarbError": "gridcarb.errors",
    "NoticeWarning": "gridcarb.errors",
}


def __getattr__(name: str) -> Any:
    """Names are fetched when first used: the command line starts without the weight of the chemistry."""
    if name == "__version__":
        return importlib.import_module("importlib.metadata").version("gridcarb")
    if name == "FIELDS":
        importlib.import_module("gridcarb.chemistry")  # puts the derived fields on the shelf
        return importlib.import_module("gridcarb.fields").FIELDS
    if name in _HOMES:
        return getattr(importlib.import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'gridcarb' has no attribute '{name}'")
