from __future__ import annotations

import pickle

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.harmonise.duplicates import PackedFlags, repeated, where_repeated


def plane(rows=4, columns=6):
    lat, lon = np.meshgrid(np.linspace(-60.0, 60.0, rows), np.arange(columns) * 60.0 + 5.0, indexing="ij")
    return lon, lat


@pytest.mark.parametrize("precision", ["f4", "f8"])
@pytest.mark.parametrize("turn", [-360.0, 0.0, 360.0])
def test_halo_columns_are_found_on_any_turn_and_in_any_precision(precision, turn):
    lon, lat = plane()
    lon = np.concatenate([lon[:, -1:] - 360, lon + 0.1234567, lon[:, :1] + turn], axis=1)
    lon[:, 0] += 0.1234567
    lon[:, -1] += 0.1234567
    lat = np.concatenate([lat[:, -1:], lat, lat[:, :1]], axis=1)
    found = repeated(lon.astype(precision).astype("f8"), lat.astype(precision).astype("f8"), np.ones(lon.shape, bool))
    assert np.flatnonzero(found.all(axis=0)).tolist() == [6, 7]
    assert found.sum() == 8


def test_single_precision_on_two_conventions_is_one_place():
    number = np.random.default_rng(1)
    lon, lat = number.uniform(180, 360, 4000).astype("f4"), number.uniform(-90, 90, 4000).astype("f4")
    other = (lon.astype("f8") - 360).astype("f4")
    both = np.concatenate([lon, other]).astype("f8")
    found = repeated(both, np.concatenate([lat, lat]).astype("f8"), np.ones(8000, bool))
    assert found[4000:].all()
    assert not found[:4000].any()


def test_the_copy_that_is_sea_counts():
    lon, lat = plane()
    lon, lat = np.concatenate([lon, lon[-1:, ::-1]]), np.concatenate([lat, lat[-1:, ::-1]])
    usable = np.ones(lon.shape, bool)
    usable[3, :2] = False
    found = repeated(lon, lat, usable)
    assert np.argwhere(found).tolist() == [[3, 0], [3, 1], [4, 0], [4, 1], [4, 2], [4, 3]]


def test_places_that_are_missing_repeat_nothing():
    lon, lat = plane()
    lon[1], lat[2] = np.nan, np.nan
    assert not repeated(lon, lat, np.ones(lon.shape, bool)).any()


@pytest.mark.parametrize("step", [1.0, 0.01, 1e-4, 1e-6])
def test_cells_of_fine_grids_are_no_copies(step):
    lat, lon = np.meshgrid(40 + step * np.arange(30), 200 + step * np.arange(40), indexing="ij")
    assert not repeated(lon, lat, np.ones(lon.shape, bool)).any()


@settings(deadline=None)
@given(st.integers(1, 5), st.integers(1, 9), st.integers(0, 2**31), st.data())
def test_packed_flags_give_back_any_part(rows, columns, seed, data):
    flags = np.random.default_rng(seed).random((rows, columns)) < 0.5
    packed = pickle.loads(pickle.dumps(PackedFlags.of(flags, ("y", "x"))))
    start = data.draw(st.integers(0, columns - 1))
    part = packed.within({"x": slice(start, start + 2), "time": slice(0, 1)})
    assert part.dims == ("y", "x")
    assert np.array_equal(part.values, flags[:, start:start + 2])
    assert packed.bits.nbytes == -(-flags.size // 8)


def test_words_name_rows_and_columns_of_the_sea():
    sea, again = np.ones((4, 5), bool), np.zeros((4, 5), bool)
    again[3], again[:, 4] = True, True
    sea[3, 0] = False
    assert where_repeated(again, sea, ("j", "i")) == " (at j = 3 and i = 4, counted from 0)"
    assert where_repeated(again.ravel(), sea.ravel(), ("cell",)) == ""
