from __future__ import annotations

import json
import math
import pickle
import random

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.fields import Field
from gridcarb.products import PRODUCTS
from gridcarb.products.exact import ExactSum

PH = Field(key="ph_total_scale", long_name="pH", units="1", scale="total", sane_range=(7.0, 9.0), digits=3)
OMEGA = Field(key="omega", long_name="omega", units="1", sane_range=(0.0, 9.0), digits=3)
STATUS = Field(key="status", long_name="status", units="1", part="status", sane_range=(0, 2), digits=0,
               flags=((0, "solved"), (2, "missing_input")))
FIELDS = [PH, OMEGA, STATUS]


def block(steps=2, levels=3, columns=5, seed=0, thick=True):
    """Random numbers; the first column is land, one sea cell has no value, the second column begins a level lower."""
    number = np.random.default_rng(seed)
    shape, dims = (steps, levels, columns), ("time", "z", "x")
    sea = np.ones(shape, bool)
    sea[..., 0], sea[:, 0, 1] = False, False
    ph = np.where(sea, number.uniform(7.5, 8.3, shape), np.nan)
    ph[0, 0, 2] = np.nan
    top = np.where(sea.any(1), sea.argmax(1), -1)
    coords = {
        "cell_area": ("x", number.uniform(1e9, 2e9, columns)), "time_share": ("time", np.linspace(1, 2, steps) / 10),
        "sea": (dims, sea), "top_level": (("time", "x"), top),
    }
    if thick:
        coords["cell_thickness"] = (("z", "x"), number.uniform(10, 100, (levels, columns)))
    return xr.Dataset({
        "ph_total_scale": (dims, ph), "omega": (dims, np.where(sea, number.uniform(1, 4, shape), np.nan)),
        "status": (dims, np.where(np.isfinite(ph), 0, 2).astype("i1")),
    }, coords=coords)


def tally_of(*blocks):
    tally = PRODUCTS["means"].start(FIELDS)
    for one in blocks:
        tally.add(one)
    return tally


def plainly(one):
    """The same, cell by cell."""
    sums = {extent: [0.0, 0.0, 0.0, 0.0] for extent in ("surface", "volume")}
    steps, levels, columns = one["ph_total_scale"].shape
    for t, x in np.ndindex(steps, columns):
        area = float(one["cell_area"][x] * one["time_share"][t])
        wet = [z for z in range(levels) if one["sea"].values[t, z, x]]
        for z in wet:
            ph = float(one["ph_total_scale"][t, z, x])
            for extent, size in (("surface", area * (z == wet[0])), ("volume", area * float(one["cell_thickness"][z, x]))):
                found = sums[extent]
                found[0] += size
                if size and np.isfinite(ph):
                    found[1] += size
                    found[2] += size * ph
                    found[3] += size * 10.0**-ph
    return sums


def test_means_are_those_cell_by_cell():
    one = block()
    report = tally_of(one).report()
    for extent, (whole, valued, total, hydrogen) in plainly(one).items():
        found = report[extent]["fields"]["ph_total_scale"]
        assert report[extent]["sea"] == pytest.approx(whole, rel=1e-13)
        assert found["mean"] == pytest.approx(total / valued, rel=1e-13)
        assert found["coverage"] == pytest.approx(valued / whole, rel=1e-13)
        assert found["coverage"] < 1
        assert found["ph_of_mean_hydrogen_ion"] == pytest.approx(-np.log10(hydrogen / valued), rel=1e-13)
        assert report[extent]["fields"]["omega"]["coverage"] == pytest.approx(1.0, rel=1e-13)
        status = report[extent]["fields"]["status"]
        assert status["missing_input"] == pytest.approx(1 - valued / whole, rel=1e-9)


def test_ph_of_the_mean_hydrogen_ion_is_lower_by_the_spread():
    """Fassbender, Orr & Dickson (2021), BG 18, 1407: mean pH - 1.151 sigma^2, to second order."""
    one = block(steps=20, columns=50, seed=4)
    one["ph_total_scale"] = 8.0 + 0.05 * (one["ph_total_scale"] - 8.0)
    found = tally_of(one).report()["volume"]["fields"]["ph_total_scale"]
    sigma = float(one["ph_total_scale"].std())
    assert found["mean"] - found["ph_of_mean_hydrogen_ion"] == pytest.approx(1.151 * sigma**2, rel=0.1)


def test_without_areas_there_are_no_means():
    report = tally_of(block().drop_vars("cell_area")).report()
    assert report == {"surface": None, "volume": None}


def test_without_thickness_there_is_no_volume():
    report = tally_of(block(thick=False)).report()
    assert report["volume"] is None
    assert report["surface"]["fields"]["omega"]["mean"] > 0


def test_a_sea_without_values_has_no_mean():
    one = block()
    one["omega"] = one["omega"] * np.nan
    found = tally_of(one).report()["surface"]["fields"]["omega"]
    assert found == {"mean": None, "coverage": 0.0}


@settings(deadline=None, max_examples=25)
@given(st.integers(0, 1000), st.randoms(use_true_random=False))
def test_the_order_of_merging_changes_not_a_bit(seed, shuffle: random.Random):
    blocks = [block(seed=seed + n) for n in range(5)]
    forwards = tally_of(*blocks).report()
    parts = [pickle.loads(pickle.dumps(tally_of(one))) for one in blocks]
    shuffle.shuffle(parts)
    first, *rest = parts
    for part in rest:
        first.merge(part)
    assert first.report() == forwards
    json.dumps(forwards, allow_nan=False)


def test_blocks_change_the_last_digits_at_most():
    one = block(steps=4, columns=8)
    whole = tally_of(one).report()
    parts = tally_of(*(one.isel(time=[t], x=[2 * x, 2 * x + 1]) for t in range(4) for x in range(4))).report()
    for extent in ("surface", "volume"):
        for key in ("ph_total_scale", "omega"):
            for word, value in whole[extent]["fields"][key].items():
                assert parts[extent]["fields"][key][word] == pytest.approx(value, rel=1e-13)


@given(st.lists(st.floats(-1e200, 1e200), max_size=20))
def test_an_exact_sum_is_the_rounded_one(values):
    total = ExactSum()
    for value in values:
        total.add(value)
    assert float(total) == math.fsum(values)
