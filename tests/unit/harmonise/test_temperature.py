"""Kinds of temperature: found, stated, refused; converted as TEOS-10 says."""

from __future__ import annotations

from typing import Any

import gsw
import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.errors import InputError, UnitsError
from gridcarb.harmonise.decisions import Decided
from gridcarb.harmonise.settings import ReadingSettings, TemperatureKind
from gridcarb.harmonise.temperature import TemperatureReading, in_situ, read_temperature


def read(
    deepest: float = 5000.0, file: dict[str, Any] | None = None, stated: Any = None, **attrs: Any
) -> Decided[TemperatureReading]:
    return read_temperature({"units": "degC", **attrs}, ReadingSettings(temperature=stated), deepest, file or {})


@pytest.mark.parametrize(("name", "kind"), [
    ("sea_water_temperature", "in situ"), ("sea_surface_temperature", "in situ"),
    ("sea_water_potential_temperature", "potential"), ("sea_water_conservative_temperature", "conservative"),
])
def test_standard_name_settles_it(name: str, kind: str) -> None:
    decided = read(standard_name=name)
    assert decided.reading.kind == kind
    assert decided.notices == ()
    assert name in str(decided.decisions[0])


@pytest.mark.parametrize(("file", "attrs", "kind"), [
    ({}, {"long_name": "Sea Water Potential Temperature"}, "potential"),
    ({}, {"long_name": "in-situ temperature"}, "in situ"),
    ({}, {"original_name": "bigthetao"}, "conservative"),
    ({"variable_id": "thetao"}, {}, "potential"),
])
def test_other_words_help_with_a_notice(file: dict[str, Any], attrs: dict[str, Any], kind: str) -> None:
    decided = read(file=file, **attrs)
    assert decided.reading.kind == kind
    assert [notice.code for notice in decided.notices] == ["temperature_kind_by_words"]
    assert kind in decided.notices[0].state


def test_unknown_kind_is_refused_in_deep_water_and_assumed_in_shallow() -> None:
    with pytest.raises(InputError, match="5000 m") as caught:
        read()
    assert "`reading: {temperature: potential}`" in caught.value.mend
    with pytest.raises(InputError):
        read(deepest=201.0)
    decided = read(deepest=200.0)
    assert decided.reading.kind == "in situ"
    assert [notice.code for notice in decided.notices] == ["temperature_kind_assumed"]


def test_statement_wins_and_says_so_where_it_contradicts() -> None:
    quiet = read(stated="potential", standard_name="sea_water_potential_temperature")
    assert quiet.notices == ()
    loud = read(stated="potential", standard_name="sea_water_temperature")
    assert loud.reading.kind == "potential"
    assert [notice.code for notice in loud.notices] == ["temperature_kind_overruled"]


def test_long_name_that_contradicts_the_standard_name_gives_a_notice() -> None:
    decided = read(standard_name="sea_water_temperature", long_name="potential temperature")
    assert decided.reading.kind == "in situ"
    assert [notice.code for notice in decided.notices] == ["temperature_kind_doubtful"]


def test_kelvin_by_units_never_by_values() -> None:
    assert read(standard_name="sea_water_temperature", units="K").reading.to_celsius(273.15) == 0.0
    assert read(standard_name="sea_water_temperature").reading.to_celsius(290.0) == 290.0
    with pytest.raises(UnitsError, match="missing") as caught:
        read(standard_name="sea_water_temperature", units=None)
    assert "reading: {units: {temperature: degC}}" in caught.value.mend


@settings(deadline=None)
@given(st.floats(-1.9, 35), st.floats(0.5, 42), st.floats(0, 10000))
def test_kinds_meet_in_one_temperature(t: float, salinity: float, pressure: float) -> None:
    given_as: dict[TemperatureKind, float] = {
        "in situ": t, "potential": gsw.pt0_from_t(salinity, t, pressure),
        "conservative": gsw.CT_from_t(salinity, t, pressure),
    }
    for kind, number in given_as.items():
        found = in_situ(xr.DataArray(number), kind, xr.DataArray(salinity), xr.DataArray(pressure))
        assert found.item() == pytest.approx(t, abs=2e-9), kind


def test_potential_route_is_that_of_conservative_temperature() -> None:
    conservative = gsw.CT_from_pt(35.0, 2.0)
    found = in_situ(xr.DataArray(2.0), "potential", xr.DataArray(35.0), xr.DataArray(4000.0))
    assert found.item() == pytest.approx(gsw.t_from_CT(35.0, conservative, 4000.0), abs=1e-12)


def test_missing_and_absurd_numbers_stay_quiet() -> None:
    numbers = xr.DataArray([np.nan, 10.0, 10.0, 1e9], dims="x")
    salinity = xr.DataArray([35.0, np.nan, -1.0, 35.0], dims="x")
    for kind in ("potential", "conservative"):
        found = in_situ(numbers, kind, salinity, xr.DataArray(100.0))
        assert np.isnan(found.values[:2]).all()
