"""Edges of cells from their centres, which may come in any order and on any turn."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.axes import edges_between, on_one_turn


def test_edges_are_halfway() -> None:
    assert edges_between(np.array([0.0, 1.0, 3.0])).tolist() == [[-0.5, 0.5], [0.5, 2.0], [2.0, 4.0]]


@given(st.permutations(range(6)))
def test_the_order_of_centres_does_not_matter(order: list[int]) -> None:
    centres = np.array([-3.0, 0.0, 1.0, 5.0, 6.0, 10.0])
    assert edges_between(centres[order]).tolist() == edges_between(centres)[order].tolist()


@pytest.mark.parametrize(("centres", "found"), [
    ([350.0, 355.0, 0.0, 5.0], [350.0, 355.0, 360.0, 365.0]),
    ([170.0, 175.0, -180.0], [170.0, 175.0, 180.0]),
    ([5.0, 0.0, 355.0], [5.0, 0.0, -5.0]),
    ([0.5, 325.5, 330.5, 355.5], [360.5, 325.5, 330.5, 355.5]),  # as a file had it: sorted by number, cut at 0
])
def test_neighbours_on_the_map_become_neighbours_in_number(centres: list[float], found: list[float]) -> None:
    assert on_one_turn(np.array(centres)).tolist() == found


@settings(max_examples=50)
@given(st.permutations(range(8)), st.floats(-180.0, 540.0))
def test_columns_in_any_order_are_as_wide_as_in_order(order: list[int], west: float) -> None:
    centres = (west + 5.0 * np.arange(8.0))[order]
    edges = edges_between(on_one_turn(centres % 360.0))
    assert np.abs(edges[:, 1] - edges[:, 0]) == pytest.approx(5.0, abs=1e-9)
    assert np.sort((edges.mean(axis=1) - centres + 180.0) % 360.0) == pytest.approx(180.0, abs=1e-9)
