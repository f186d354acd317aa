"""`practice2022`: `guide2007` with the boron-to-chlorinity ratio that observers use today."""

from __future__ import annotations

from dataclasses import replace

from gridcarb.chemistry.constants.guide2007 import GUIDE2007
from gridcarb.chemistry.constants_set import declare_constants
from gridcarb.chemistry.formulas.totals import boron_lee2010

PRACTICE2022 = declare_constants(
    replace(
        GUIDE2007,
        key="practice2022",
        title="Dickson, Sabine & Christian 2007, with total boron of Lee et al. 2010",
        bt=boron_lee2010,
    )
)
