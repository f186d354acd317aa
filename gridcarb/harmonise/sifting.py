"""Raw numbers sifted in one compiled passage: widened, marked by the rule that applies, and NaN where one does."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.compiling import compile_function

Numbers = npt.NDArray[np.float64]
Marks = npt.NDArray[np.uint8]


def sift_line(
    raw: npt.NDArray[Any], numbers: Numbers, marks: Marks, packed: bool, floor: float, ceiling: float, fills: Numbers,
    fill_marks: Marks, rounded: bool, usual: Numbers, low: float, high: float, range_unpacked: bool, beyond: float,
    own: Marks,
) -> None:  # fmt: skip
    """Fill `marks` with the mark of the first rule that applies to each number, 0 where none does; see `masks`.

    numbers : of the length of `raw`. If `packed` they hold the unpacked numbers, else they are filled from `raw`; NaN goes
        wherever a rule applies.
    floor, ceiling : between them (both left out) no rule applies to what is in `raw`, so that none needs to be looked at.
    fills, fill_marks : fill values and their marks; `rounded` says that both sides are rounded to single precision.
    usual : fill values nobody declares, compared exactly.
    low, high : valid range, of the unpacked numbers or of those in `raw`. beyond : what no number reaches in size.
    own : marks of NaN, of `usual`, of the range, and of `beyond`.
    """
    for i in range(raw.size):
        given = np.float64(raw[i])
        number = numbers[i] if packed else given
        mark = np.uint8(0)
        if np.isnan(given):
            mark = own[0]
        elif not floor < given < ceiling:
            alike = np.float64(np.float32(given)) if rounded else given
            for k in range(fills.size):
                if alike == fills[k] and (fills[k] != 0.0 or given == 0.0):
                    mark = fill_marks[k]
                    break
            if mark == 0:
                for k in range(usual.size):
                    mark = own[1] if given == usual[k] else mark
            judged = number if range_unpacked else given
            if mark == 0 and (judged < low or judged > high):
                mark = own[2]
            if mark == 0 and abs(number) >= beyond:
                mark = own[3]
        marks[i] = mark
        numbers[i] = number if mark == 0 else np.nan


sift = compile_function(sift_line)
