from __future__ import annotations

import json
import math
import pickle
import random

import numpy as np
import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from gridcarb.fields import Field
from gridcarb.products import PRODUCTS, Tally

PH = Field(key="ph", long_name="pH", units="1", sane_range=(7.0, 9.0), digits=3)
STATUS = Field(key="status", long_name="status", units="1", part="status", sane_range=(0, 2), digits=0,
               flags=((0, "solved"), (1, "outside"), (2, "missing_input")))


def block(values, status=None):
    values = np.atleast_1d(np.asarray(values, dtype=float))
    status = np.zeros(values.shape, "int8") if status is None else np.asarray(status, "int8")
    return xr.Dataset({"ph": ("x", values), "status": ("x", status)})


def tally_of(*blocks):
    tally = PRODUCTS["ranges"].start([PH, STATUS])
    for one in blocks:
        tally.add(one)
    return tally


def test_one_pass_tells_counts_extremes_and_flags():
    report = tally_of(block([8.0, np.nan, 6.5], [0, 2, 1]), block([9.5, 8.0, np.inf], [0, 0, 7])).report()
    assert report["ph"] == {
        "cells": 6, "values": 4, "minimum": 6.5, "maximum": 9.5, "sane_range": [7.0, 9.0],
        "below_sane_range": 1, "above_sane_range": 1,
    }
    assert report["status"] == {"solved": 3, "outside": 1, "missing_input": 1, "7": 1}


def test_the_ends_of_the_sane_range_are_sane():
    report = tally_of(block([7.0, 9.0, np.nextafter(9.0, 10)])).report()
    assert (report["ph"]["below_sane_range"], report["ph"]["above_sane_range"]) == (0, 1)


@pytest.mark.parametrize("blocks", [[], [block([np.nan, np.nan])], [block(np.empty(0))]])
def test_nothing_has_no_extremes(blocks):
    report = tally_of(*blocks).report()
    assert report["ph"]["values"] == 0
    assert report["ph"]["minimum"] is report["ph"]["maximum"] is None
    json.dumps(report, allow_nan=False)


shares = st.lists(
    hnp.arrays(np.float64, st.integers(0, 5), elements=st.floats(-1e300, 1e300) | st.just(math.nan)), min_size=1, max_size=8
)


@given(shares, st.randoms(use_true_random=False))
def test_the_order_of_merging_changes_not_a_bit(values, shuffle: random.Random):
    forwards = tally_of(*(block(one) for one in values)).report()
    parts = [pickle.loads(pickle.dumps(tally_of(block(one)))) for one in values]
    shuffle.shuffle(parts)
    while len(parts) > 1:
        other = parts.pop(shuffle.randrange(len(parts)))
        before = other.report()
        parts[shuffle.randrange(len(parts))].merge(other)
        assert other.report() == before
    assert parts[0].report() == forwards


@pytest.mark.parametrize("key", list(PRODUCTS))
def test_every_product_keeps_the_contract(key):
    product = PRODUCTS[key]
    assert product.key == key
    assert product.tells
    first, second = product.start([PH, STATUS]), product.start([PH, STATUS])
    assert isinstance(first, Tally)
    first.add(block([8.0, 8.5], [0, 1]))
    second.add(block([7.5, np.nan], [0, 2]))
    second = pickle.loads(pickle.dumps(second))
    one, other = pickle.loads(pickle.dumps(first)), pickle.loads(pickle.dumps(second))
    one.merge(second)
    other.merge(first)
    assert one.report() == other.report()
    json.dumps(one.report(), allow_nan=False)
