"""exp and log in plain arithmetic, against mpmath, over the whole range the chemistry uses and at its edges."""

from __future__ import annotations

import mpmath
import numba
import numpy as np
import pytest

from gridcarb.elementary import exp, log


def units_of_last_place(value: float, exact: mpmath.mpf) -> float:
    return float(abs(mpmath.mpf(value) - exact) / mpmath.mpf(float(np.spacing(abs(float(exact))))))


@pytest.mark.parametrize("x", [0.0, 1.0, -1.0, 0.3465735902799726, -0.3465735902799727, 690.0, -690.0, 1e-300, -1e-17])
def test_exp_at_the_edges(x: float) -> None:
    assert units_of_last_place(exp(x), mpmath.exp(mpmath.mpf(x))) <= 1.5


def test_exp_everywhere() -> None:
    with mpmath.workdps(40):
        for x in np.random.default_rng(1).uniform(-80, 20, 3000):
            assert units_of_last_place(exp(x), mpmath.exp(mpmath.mpf(float(x)))) <= 1.5


@pytest.mark.parametrize("x", [1.0, 2.0, 0.5, 0.7071067811865475, 0.7071067811865476, 1.4142135623730951, 1e-300, 1e300])
def test_log_at_the_edges(x: float) -> None:
    assert log(x) == 0.0 if x == 1.0 else units_of_last_place(log(x), mpmath.log(mpmath.mpf(x))) <= 2.0


def test_log_everywhere() -> None:
    with mpmath.workdps(40):
        for exponent in np.random.default_rng(2).uniform(-15, 4, 3000):
            x = float(10.0**exponent)
            exact = mpmath.log(mpmath.mpf(x))
            assert units_of_last_place(log(x), exact) <= 2.0


def test_beyond_the_range_nothing_wraps_around() -> None:
    """An exponent out of range must stay very large or very small, never come back as an ordinary number."""
    assert exp(1e6) > 1e300
    assert 0.0 <= exp(-1e6) < 1e-300


@pytest.mark.skipif(bool(numba.config.DISABLE_JIT), reason="the compiler is off")
def test_they_are_compiled() -> None:
    assert exp.signatures
    assert log.signatures
