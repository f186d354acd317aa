"""exp and log of one number in plain arithmetic, so that a loop over a tile becomes vector instructions without a library.

Both follow the textbook: take the exponent of two out by its bits, and a polynomial for the rest. Errors stay below two
units of the last place over the range the chemistry uses; the tests hold them against `math`. With the compiler off they
are `math.exp` and `math.log`.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numba
from numba.core import types
from numba.extending import intrinsic

_PER_LN2 = 1.4426950408889634
_LN2_HIGH = 0.6931471803691238
_LN2_LOW = 1.9082149292705877e-10
_SHIFTER = 6755399441055744.0
"""1.5 x 2^52: added to a small number, it leaves the nearest whole number in the low bits."""

_SHIFTER_BITS = 0x4338000000000000
_HALF_ROOT_BITS = 0x3FE6A09E667F3BCD
"""Bits of the square root of one half: mantissas are taken from there to the square root of two."""

_MOST = 700.0


@intrinsic  # type: ignore[untyped-decorator]
def _bits_of(typing_context: Any, number: Any) -> Any:
    """The 64 bits of a float64 as a whole number."""

    def generate(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.bitcast(arguments[0], context.get_value_type(types.int64))

    return types.int64(types.float64), generate


@intrinsic  # type: ignore[untyped-decorator]
def _number_of(typing_context: Any, bits: Any) -> Any:
    """The float64 of 64 bits."""

    def generate(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.bitcast(arguments[0], context.get_value_type(types.float64))

    return types.float64(types.int64), generate


def _exp(x: float) -> float:
    x = min(max(x, -_MOST), _MOST)
    shifted = x * _PER_LN2 + _SHIFTER
    k = shifted - _SHIFTER
    r = (x - k * _LN2_HIGH) - k * _LN2_LOW
    p = 1.0 / 6227020800.0
    p = p * r + 1.0 / 479001600.0
    p = p * r + 1.0 / 39916800.0
    p = p * r + 1.0 / 3628800.0
    p = p * r + 1.0 / 362880.0
    p = p * r + 1.0 / 40320.0
    p = p * r + 1.0 / 5040.0
    p = p * r + 1.0 / 720.0
    p = p * r + 1.0 / 120.0
    p = p * r + 1.0 / 24.0
    p = p * r + 1.0 / 6.0
    p = p * r + 0.5
    p = p * (r * r) + r + 1.0
    return p * _number_of((_bits_of(shifted) + 1023) << 52)  # type: ignore[no-any-return]


def _log(x: float) -> float:
    bits = _bits_of(x)
    e = (bits - _HALF_ROOT_BITS) >> 52
    m = _number_of(bits - (e << 52))
    k = _number_of(e + _SHIFTER_BITS) - _SHIFTER
    f = (m - 1.0) / (m + 1.0)
    s = f * f
    p = 1.0 / 21.0
    p = p * s + 1.0 / 19.0
    p = p * s + 1.0 / 17.0
    p = p * s + 1.0 / 15.0
    p = p * s + 1.0 / 13.0
    p = p * s + 1.0 / 11.0
    p = p * s + 1.0 / 9.0
    p = p * s + 1.0 / 7.0
    p = p * s + 1.0 / 5.0
    p = p * s + 1.0 / 3.0
    return k * _LN2_HIGH + (2.0 * f + (2.0 * f * (s * p) + k * _LN2_LOW))  # type: ignore[no-any-return]


def _strict(function: Callable[[float], float], plain: Callable[[float], float]) -> Any:
    """Compiled without leave to reorder: adding and taking away the shifter must not cancel."""
    if numba.config.DISABLE_JIT:
        return plain
    return numba.njit(nogil=True, error_model="numpy", fastmath={"contract"})(function)


exp = _strict(_exp, math.exp)
"""exp(x) for |x| up to 700."""

log = _strict(_log, math.log)
"""Natural logarithm of a positive, normal number."""
