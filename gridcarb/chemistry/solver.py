"""The root of the alkalinity equation: hydrogen ion from DIC and total alkalinity.

Alkalinity after Dickson (1981). The equation falls steadily with ln h and has one positive root for any input
(Munhoven 2013). All cells of a tile take the same three Newton steps in ln h, without branches; the few that have not
settled then go through a bracketed iteration that cannot fail.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from gridcarb.chemistry.compiled import TILE, scalar
from gridcarb.compiling import compile_function

Row = npt.NDArray[np.float64]

SWEEPS = 3
SWEPT = 3e-6
"""A last sweep smaller than this, with the correction that follows it, leaves an error below 1e-16."""

SETTLED = 1e-8
"""A plain Newton step in ln h smaller than this leaves an error of its square."""

_MOST_ITERATIONS = 200

UNKNOWNS = (
    "k1", "k2", "kb", "kw", "kp1", "kp2", "kp3", "ksi", "ks", "kf", "bt", "st", "ft", "pt", "sit", "dic", "alk",
)  # fmt: skip
"""The columns the equation is made of, in the order every function here takes them."""


@scalar
def carbonate(h: float, k1: float, k2: float, dic: float) -> tuple[float, float]:
    """Carbonate alkalinity [HCO3-] + 2 [CO3--], and its buffer d/d(-ln h): DIC times the variance of charge over the
    three species, which is never negative."""
    per_sum = 1.0 / (h * (h + k1) + k1 * k2)
    share = dic * k1 * per_sum
    return share * (h + 2.0 * k2), share * per_sum * h * (h * h + 4.0 * h * k2 + k1 * k2)


@scalar
def noncarbonate(
    h: float, kb: float, kw: float, kp1: float, kp2: float, kp3: float, ksi: float, ks: float, kf: float,
    bt: float, st: float, ft: float, pt: float, sit: float,
) -> tuple[float, float]:  # fmt: skip
    """Alkalinity of borate, water, phosphate, silicate, bisulfate and hydrogen fluoride, and its buffer d/d(-ln h), a
    sum of positive terms. ks is on the free scale, every other constant on the total scale.

    Division is by far the slowest arithmetic here, so six reciprocals come from two: 1/a = bcd * (1/abcd).
    """
    p3 = kp1 * kp2 * kp3
    p2 = kp1 * kp2 * h
    p1 = kp1 * h * h
    p0 = h * h * h
    p = p0 + p1 + p2 + p3
    per_ph = 1.0 / (p * h)
    per_p, per_h = per_ph * h, per_ph * p
    phosphate = pt * per_p * (p2 + 2.0 * p3 - p0)
    phosphate_buffer = pt * per_p * per_p * (p0 * p1 + p1 * p2 + p2 * p3 + 4.0 * (p0 * p2 + p1 * p3) + 9.0 * p0 * p3)
    free = ks + st
    weak, strong = (kb + h) * (ksi + h), (free + h) * (kf + h)
    per_all = 1.0 / (weak * strong)
    per_weak, per_strong = per_all * strong, per_all * weak
    per_borate, per_silicate = per_weak * (ksi + h), per_weak * (kb + h)
    per_bisulfate, per_fluoride = per_strong * (kf + h), per_strong * (free + h)
    borate = bt * kb * per_borate
    silicate = sit * ksi * per_silicate
    bisulfate = st * h * per_bisulfate
    fluoride = ft * h * per_fluoride
    hydroxide = kw * per_h
    free_hydrogen = h * (ks / free)
    alkalinity = borate + hydroxide - free_hydrogen + phosphate + silicate - bisulfate - fluoride
    buffer = (
        h * (borate * per_borate + silicate * per_silicate)
        + hydroxide
        + free_hydrogen
        + phosphate_buffer
        + free * bisulfate * per_bisulfate
        + kf * fluoride * per_fluoride
    )
    return alkalinity, buffer


@scalar
def newton_step(
    h: float, k1: float, k2: float, kb: float, kw: float, kp1: float, kp2: float, kp3: float, ksi: float, ks: float,
    kf: float, bt: float, st: float, ft: float, pt: float, sit: float, dic: float, alk: float,
) -> float:  # fmt: skip
    """The Newton step in ln h: (alkalinity at h - alkalinity) / buffer."""
    carbon, carbon_buffer = carbonate(h, k1, k2, dic)
    other, other_buffer = noncarbonate(h, kb, kw, kp1, kp2, kp3, ksi, ks, kf, bt, st, ft, pt, sit)
    step: float = (carbon + other - alk) / (carbon_buffer + other_buffer)
    return step


@scalar
def lower_bound(alk: float, kw: float, ks: float, bt: float, st: float, ft: float, pt: float) -> float:
    """h at which water alone carries the alkalinity left by every acid in its most protonated form."""
    free_fraction = ks / (ks + st)
    gap = alk + pt + st + ft
    root = math.sqrt(gap * gap + 4.0 * kw * free_fraction)
    return 2.0 * kw / (gap + root) if gap >= 0.0 else (root - gap) / (2.0 * free_fraction)


@scalar
def upper_bound(alk: float, kw: float, ks: float, bt: float, st: float, pt: float, sit: float, dic: float) -> float:
    """h at which water alone carries the alkalinity left by every acid in its least protonated form."""
    free_fraction = ks / (ks + st)
    gap = alk - (2.0 * dic + bt + 2.0 * pt + sit)
    root = math.sqrt(gap * gap + 4.0 * kw * free_fraction)
    return 2.0 * kw / (gap + root) if gap >= 0.0 else (root - gap) / (2.0 * free_fraction)


@scalar
def first_guess(alk: float, dic: float, bt: float, k1: float, k2: float, kb: float) -> float:
    """Munhoven's start: the parabola at the minimum of the cubic of carbonate and borate alkalinity."""
    per_alk = 1.0 / alk
    c2 = kb * (1.0 - bt * per_alk) + k1 * (1.0 - dic * per_alk)
    c1 = k1 * (kb * (1.0 - bt * per_alk - dic * per_alk) + k2 * (1.0 - 2.0 * dic * per_alk))
    c0 = k1 * k2 * kb * (1.0 - (2.0 * dic + bt) * per_alk)
    d = c2 * c2 - 3.0 * c1
    root = math.sqrt(max(d, 1e-300))
    turn = (root - c2) / 3.0 if c2 < 0.0 else -c1 / (c2 + root)
    value = c0 + turn * (c1 + turn * (c2 + turn))
    h = turn + math.sqrt(max(-value / root, 0.0))
    h = h if d > 0.0 else 1e-7
    h = h if alk < 2.0 * dic + bt else 1e-10
    h = h if alk > 0.0 else 1e-3
    # A vanishing alkalinity throws the cubic anywhere; from there powers of h would overflow.
    return min(max(h, 1e-15), 1.0) if h > 0.0 else 1e-7


def sweep_tile(
    h: Row, step: Row, k1: Row, k2: Row, kb: Row, kw: Row, kp1: Row, kp2: Row, kp3: Row, ksi: Row, ks: Row, kf: Row,
    bt: Row, st: Row, ft: Row, pt: Row, sit: Row, dic: Row, alk: Row,
) -> int:  # fmt: skip
    """Start and three Newton steps for every cell of a tile; `step` keeps the size of the last one.

    Newton's error shrinks as e -> c e^2, and two steps running tell c: the error that the last step leaves is foreseen and
    taken away with it, which spares a fourth sweep. exp(x) is replaced by its (2, 2) Pade approximant, which is positive
    for every x and keeps the convergence. Returns how many cells have not settled.
    """
    unsettled = 0
    for i in range(TILE):
        x = first_guess(alk[i], dic[i], bt[i], k1[i], k2[i], kb[i])
        before = 0.0
        d = 0.0
        for _ in range(SWEEPS):
            before = d
            d = newton_step(
                x, k1[i], k2[i], kb[i], kw[i], kp1[i], kp2[i], kp3[i], ksi[i], ks[i], kf[i],
                bt[i], st[i], ft[i], pt[i], sit[i], dic[i], alk[i],
            )  # fmt: skip
            d = min(max(d, -2.0), 2.0)
            x = x * (12.0 + d * (6.0 + d)) / (12.0 - d * (6.0 - d))
        shrink = d / before if abs(d) < abs(before) else 0.0
        h[i] = x * (1.0 + d * shrink * shrink)
        step[i] = d
        unsettled += not abs(d) < SWEPT
    return unsettled


def settle_tile(
    h: Row, step: Row, k1: Row, k2: Row, kb: Row, kw: Row, kp1: Row, kp2: Row, kp3: Row, ksi: Row, ks: Row, kf: Row,
    bt: Row, st: Row, ft: Row, pt: Row, sit: Row, dic: Row, alk: Row,
) -> None:  # fmt: skip
    """Bracketed Newton in ln h for the cells of a tile that the sweeps left unsettled.

    A step that leaves the bracket, or does not shrink fast enough, is replaced by a bisection in ln h.
    """
    for i in range(TILE):
        if abs(step[i]) < SWEPT:
            continue
        low = lower_bound(alk[i], kw[i], ks[i], bt[i], st[i], ft[i], pt[i])
        high = upper_bound(alk[i], kw[i], ks[i], bt[i], st[i], pt[i], sit[i], dic[i])
        x = h[i] if low < h[i] < high else math.sqrt(low) * math.sqrt(high)
        before = 1e300
        d = 1.0
        for _ in range(_MOST_ITERATIONS):
            d = newton_step(
                x, k1[i], k2[i], kb[i], kw[i], kp1[i], kp2[i], kp3[i], ksi[i], ks[i], kf[i],
                bt[i], st[i], ft[i], pt[i], sit[i], dic[i], alk[i],
            )  # fmt: skip
            if d > 0.0:
                low = x
            else:
                high = x
            target = x * math.exp(d)
            if not (low <= target <= high) or abs(d) > 0.5 * before:
                target = math.sqrt(low) * math.sqrt(high)
            before = abs(d)
            x = target
            if abs(d) < SETTLED or high <= low * (1.0 + 4e-16):
                d = 0.0
                break
        h[i] = x
        step[i] = d


sweep = compile_function(sweep_tile)
settle = compile_function(settle_tile)
