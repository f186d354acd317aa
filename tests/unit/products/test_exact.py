"""Exact sums: no order of adding or merging changes a bit, and the quotient is the exactly rounded one."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gridcarb.products.exact import ExactSum

numbers = st.lists(st.floats(-1e150, 1e150), min_size=1, max_size=30)


def summed(values):
    found = ExactSum()
    for value in values:
        found.add(value)
    return found


@given(numbers)
def test_the_mean_is_the_exactly_rounded_one(values):
    assert summed(values).over(len(values)) == pytest.approx(math.fsum(values) / len(values), rel=3e-16, abs=5e-324)


@given(numbers, st.randoms(use_true_random=False))
def test_order_and_grouping_change_nothing(values, shuffle):
    mixed = list(values)
    shuffle.shuffle(mixed)
    cut = shuffle.randrange(len(mixed) + 1)
    merged = summed(mixed[:cut])
    merged.merge(summed(mixed[cut:]))
    assert merged.over(3) == summed(values).over(3)
