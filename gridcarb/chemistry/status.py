"""What became of each cell: solved, solved outside the range of the constants, or NaN and why."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from gridcarb.chemistry.compiled import TILE
from gridcarb.compiling import compile_function
from gridcarb.fields import Field, Ink, declare

Flags = npt.NDArray[np.int8]
Row = npt.NDArray[np.float64]

SOLVED, OUTSIDE, MISSING, UNPHYSICAL, UNSOLVED = range(5)

SOLUTION_STATUS = declare(
    Field(
        key="solution_status",
        long_name="status of the carbonate solution",
        standard_name="status_flag",
        units="1",
        part="status",
        sane_range=(SOLVED, UNSOLVED),
        digits=0,
        ink=Ink("viridis", limits=(SOLVED, UNSOLVED)),
        comment="outside_validity: computed, though temperature or salinity lies outside the range in which K1 and K2 "
        "of the set were measured; missing_input also marks land and sea floor.",
        flags=(
            (SOLVED, "solved"),
            (OUTSIDE, "outside_validity"),
            (MISSING, "missing_input"),
            (UNPHYSICAL, "unphysical_input"),
            (UNSOLVED, "unsolved"),
        ),
    )
)

T_LOW, T_HIGH = -2.5, 45.0
S_HIGH = 300.0
P_BAR_HIGH = 1500.0


def judge_tile(
    flags: Flags, t: Row, s: Row, p_bar: Row, dic: Row, alk: Row, pt: Row, sit: Row,
    t_low: float, t_high: float, s_low: float, s_high: float,
) -> None:  # fmt: skip
    """Flag every cell of a tile by its input, and put harmless water into the cells that cannot be solved."""
    bad = 0
    for i in range(TILE):
        total = t[i] + s[i] + p_bar[i] + dic[i] + alk[i] + pt[i] + sit[i]
        solvable = (
            (t[i] >= T_LOW) & (t[i] <= T_HIGH) & (s[i] >= 0.0) & (s[i] <= S_HIGH) & (p_bar[i] >= 0.0)
            & (p_bar[i] <= P_BAR_HIGH) & (dic[i] > 0.0) & (pt[i] >= 0.0) & (sit[i] >= 0.0) & (abs(total) < 1e300)
        )  # fmt: skip
        inside = (t[i] >= t_low) & (t[i] <= t_high) & (s[i] >= s_low) & (s[i] <= s_high)
        flags[i] = UNPHYSICAL if not solvable else (SOLVED if inside else OUTSIDE)
        bad += not solvable
    if bad == 0:
        return
    for i in range(TILE):
        if flags[i] == UNPHYSICAL:
            for row in (t, s, p_bar, dic, alk, pt, sit):
                if math.isnan(row[i]):
                    flags[i] = MISSING
            t[i], s[i], p_bar[i] = 15.0, 35.0, 0.0
            dic[i], alk[i], pt[i], sit[i] = 2.1e-3, 2.3e-3, 0.0, 0.0


def seal_tile(flags: Flags, h: Row, step: Row, settled: float) -> int:
    """Flag the cells whose root was not found; returns the worst flag of the tile."""
    worst = SOLVED
    for i in range(TILE):
        if flags[i] < MISSING and not (h[i] > 0.0 and math.isfinite(h[i]) and abs(step[i]) < settled):
            flags[i] = UNSOLVED
        worst = max(worst, flags[i])
    return int(worst)


judge = compile_function(judge_tile)
seal = compile_function(seal_tile)
