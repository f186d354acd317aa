"""Sets of constants, one file a set. A set is one declared choice of every equation; nothing is mixed at run time."""

from __future__ import annotations

from gridcarb.chemistry.constants_set import CONSTANTS, ConstantsSet

__all__ = ["CONSTANTS", "ConstantsSet"]
