"""Nutrients that are not in the files: assumed at the surface, refused in the interior, or stated."""

from __future__ import annotations

import pytest
import xarray as xr

from gridcarb.errors import InputError, UnitsError
from gridcarb.harmonise.nutrients import constant, read_nutrients
from gridcarb.harmonise.settings import ReadingSettings

BOTH = ("phosphate", "silicate")


def test_given_ones_are_left_alone() -> None:
    decided = read_nutrients(BOTH, ReadingSettings(), 5000.0)
    assert (decided.reading, decided.decisions, decided.notices) == ({}, (), ())


def test_at_the_surface_zero_with_a_notice_each() -> None:
    decided = read_nutrients((), ReadingSettings(), 50.0)
    assert [constant(decided.reading[role], None).item() for role in BOTH] == [0.0, 0.0]
    assert [notice.state for notice in decided.notices] == [
        "reading: {phosphate: assume zero}", "reading: {silicate: assume zero}"
    ]


def test_in_the_interior_refused_with_the_line_to_write() -> None:
    with pytest.raises(InputError, match="silicate is not given") as caught:
        read_nutrients(("phosphate",), ReadingSettings(), 50.1)
    assert "`reading: {silicate: assume zero}`" in caught.value.mend


def test_zero_on_purpose() -> None:
    decided = read_nutrients(("phosphate",), ReadingSettings(silicate="assume zero"), 5000.0)
    assert constant(decided.reading["silicate"], None).item() == 0.0
    assert decided.notices == ()


@pytest.mark.parametrize(("stated", "wanted"), [
    ("2 umol kg-1", 2.0), ("2.05 mmol m-3", 2.0), ("2.05e-3 mol m-3", 2.0), ("0.002 mmol kg-1", 2.0),
    ("2.05uM", 2.0), ("2 µmol/kg", 2.0),
])
def test_one_amount_everywhere(stated: str, wanted: float) -> None:
    decided = read_nutrients(("silicate",), ReadingSettings(phosphate=stated), 5000.0)
    assert constant(decided.reading["phosphate"], xr.DataArray(1025.0)).item() == pytest.approx(wanted, rel=1e-15)


def test_an_amount_in_strange_units_is_refused() -> None:
    with pytest.raises(UnitsError):
        read_nutrients(BOTH, ReadingSettings(phosphate="2 bananas"), 5000.0)


def test_statement_wins_over_the_file_with_a_notice() -> None:
    decided = read_nutrients(BOTH, ReadingSettings(silicate="assume zero"), 5000.0)
    assert list(decided.reading) == ["silicate"]
    assert [notice.code for notice in decided.notices] == ["nutrient_overruled"]
