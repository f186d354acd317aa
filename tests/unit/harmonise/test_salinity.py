"""Kinds of salinity: found by name and units; there and back through TEOS-10 anywhere on the globe."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import xarray as xr
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from gridcarb.errors import InputError, UnitsError
from gridcarb.harmonise.decisions import Decided
from gridcarb.harmonise.depth import Place
from gridcarb.harmonise.salinity import SalinityReading, absolute_salinity, practical_salinity, read_salinity
from gridcarb.harmonise.settings import ReadingSettings


def read(stated: Any = None, said: str | None = None, **attrs: Any) -> Decided[SalinityReading]:
    return read_salinity(attrs, ReadingSettings(salinity=stated, units={"salinity": said} if said else {}))


@pytest.mark.parametrize(("attrs", "kind", "codes"), [
    ({"standard_name": "sea_water_practical_salinity", "units": "1"}, "practical", []),
    ({"standard_name": "sea_water_practical_salinity"}, "practical", []),
    ({"standard_name": "sea_water_absolute_salinity", "units": "g kg-1"}, "absolute", []),
    ({"standard_name": "sea_water_preformed_salinity", "units": "g/kg"}, "preformed", []),
    ({"standard_name": "sea_water_absolute_salinity", "units": "1"}, "absolute", ["salinity_units"]),
    ({"standard_name": "sea_water_salinity", "units": "0.001"}, "practical", ["salinity_kind_assumed"]),
    ({"standard_name": "sea_surface_salinity", "units": "psu"}, "practical", ["salinity_kind_assumed"]),
    ({"units": "1e-3"}, "practical", ["salinity_kind_assumed"]),
    ({"standard_name": "sea_water_salinity", "units": "g kg-1"}, "absolute", ["salinity_kind_by_units"]),
])
def test_name_first_then_units(attrs: dict[str, str], kind: str, codes: list[str]) -> None:
    decided = read(**attrs)
    assert decided.reading.kind == kind
    assert [notice.code for notice in decided.notices] == codes
    assert decided.reading.to_grams_or_practical(35.0) == 35.0


def test_kilograms_per_kilogram() -> None:
    assert read(standard_name="sea_water_absolute_salinity", units="kg kg-1").reading.to_grams_or_practical(0.035) == 35.0


def test_statement_wins_over_the_name() -> None:
    decided = read("absolute", standard_name="sea_water_practical_salinity", units="g kg-1")
    assert decided.reading.kind == "absolute"
    assert [notice.code for notice in decided.notices] == ["salinity_kind_overruled"]


def test_name_and_units_that_contradict_are_refused() -> None:
    with pytest.raises(InputError, match="practical") as caught:
        read(standard_name="sea_water_practical_salinity", units="g kg-1")
    assert "`reading: {salinity: absolute}`" in caught.value.mend


@pytest.mark.parametrize("attrs", [{}, {"standard_name": "sea_water_salinity"}, {"units": "degC"}, {"units": "ppm"}])
def test_units_missing_or_of_another_kind_are_refused(attrs: dict[str, str]) -> None:
    with pytest.raises(UnitsError) as caught:
        read(**attrs)
    assert "reading: {units: {salinity: psu}}" in caught.value.mend
    assert read(said="psu", **attrs).reading.kind == "practical"


PLACES = st.tuples(st.floats(0, 6000), st.floats(-90, 90), st.floats(0, 359.99))


@settings(deadline=None)
@given(st.floats(2, 42), PLACES)
def test_there_and_back_anywhere(number: float, where: tuple[float, float, float]) -> None:
    place = Place(*(xr.DataArray(value) for value in where))
    absolute = absolute_salinity(xr.DataArray(number), "practical", place)
    assert practical_salinity(absolute, "absolute", place).item() == pytest.approx(number, rel=1e-9)
    assert absolute_salinity(absolute, "absolute", place) is absolute
    assert practical_salinity(absolute, "practical", place) is absolute


@settings(deadline=None)
@given(st.floats(2, 42), PLACES)
def test_preformed_lies_near_absolute(number: float, where: tuple[float, float, float]) -> None:
    # On the western edge of the Baltic, TEOS-10 passes from one rule to another, and they do not meet to the last digit.
    assume(not (50 < where[1] < 68 and 6 < where[2] < 32))
    place = Place(*(xr.DataArray(value) for value in where))
    absolute = absolute_salinity(xr.DataArray(number), "preformed", place).item()
    assert absolute == pytest.approx(number, abs=0.15)
    practical = practical_salinity(xr.DataArray(number), "preformed", place)
    assert absolute_salinity(practical, "practical", place).item() == pytest.approx(absolute, rel=1e-9)


def test_south_of_the_atlas_has_the_anomaly_of_its_edge() -> None:
    south, edge = (Place(xr.DataArray(10.0), xr.DataArray(lat), xr.DataArray(200.0)) for lat in (-88.6, -86.0))
    found = absolute_salinity(xr.DataArray(34.0), "practical", south).item()
    assert found == absolute_salinity(xr.DataArray(34.0), "practical", edge).item()
    assert np.isfinite(found)


def test_without_a_place_it_is_refused() -> None:
    with pytest.raises(InputError, match="latitude and longitude"):
        absolute_salinity(xr.DataArray(34.0), "practical", Place(xr.DataArray(0.0), None, None))
