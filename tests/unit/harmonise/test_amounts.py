"""Amounts per kilogram, and the one density for all tracers."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import InputError, UnitsError
from gridcarb.harmonise.amounts import DensityReading, density, per_kilogram, read_amount, read_density
from gridcarb.harmonise.decisions import Decided
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.harmonise.temperature import in_situ

CHECKS = Path(__file__).parents[4] / "shared" / "data" / "published_checks.json"
PER_VOLUME: dict[str, dict[Any, Any]] = {"dic": {}, "alkalinity": {}}


def read(
    stated: str | None = None, roles: dict[str, dict[Any, Any]] | None = None, file: dict[Any, Any] | None = None,
    **more: Any,
) -> Decided[DensityReading]:
    return read_density(PER_VOLUME if roles is None else roles, ReadingSettings(density=stated, **more), file or {})


@pytest.mark.parametrize(("role", "units", "number", "wanted"), [
    ("dic", "mol m-3", 2.05, 2000.0), ("dic", "mmol C m-3", 2050.0, 2000.0), ("dic", "umol kg-1", 2000.0, 2000.0),
    ("dic", "mol kg-1", 0.002, 2000.0), ("alkalinity", "meq m-3", 2357.5, 2300.0),
    ("alkalinity", "eq kg-1", 0.0023, 2300.0),
    ("alkalinity", "umol L-1", 2357.5, 2300.0), ("phosphate", "mmol P/m3", 2.05, 2.0), ("silicate", "µmol/kg", 60.0, 60.0),
])
def test_every_unit_ends_in_micromoles_per_kilogram(role: str, units: str, number: float, wanted: float) -> None:
    reading = read_amount(role, {"units": units}, ReadingSettings()).reading
    found = per_kilogram(xr.DataArray(number), reading, xr.DataArray(1025.0))
    assert found.item() == pytest.approx(wanted, rel=3e-16)


@pytest.mark.parametrize(("role", "units"), [
    ("dic", None), ("dic", "bananas"), ("dic", "psu"), ("dic", "meq m-3"), ("alkalinity", "mmol C m-3"),
    ("alkalinity", "mg/L CaCO3"), ("dic", "g C m-3"), ("phosphate", "mmol N m-3"), ("silicate", "m"),
])
def test_units_that_do_not_fit_are_refused_with_the_line_that_mends(role: str, units: str | None) -> None:
    with pytest.raises(UnitsError) as caught:
        read_amount(role, {"units": units} if units else {}, ReadingSettings())
    assert f"reading: {{units: {{{role}: mol m-3}}}}" in caught.value.mend
    stated = read_amount(role, {"units": units}, ReadingSettings(units={role: "mol m-3"}))
    assert stated.reading.per_volume


def test_units_against_the_standard_name_give_a_notice() -> None:
    attrs = {"units": "umol kg-1", "standard_name": "mole_concentration_of_dissolved_inorganic_carbon_in_sea_water"}
    assert [notice.code for notice in read_amount("dic", attrs, ReadingSettings()).notices] == ["units_against_name"]


@pytest.mark.parametrize(("holder", "value"), [
    ({"rho0": 1026.0}, 1026.0), ({"rhoConst": np.float32(1035)}, 1035.0), ({"reference_density": "1027.5 kg/m3"}, 1027.5),
    ({"source": "a model; rhoConst=1035 kg m-3; more"}, 1035.0), ({"comment": "rho_0: 1.026 g/cm3"}, 1026.0),
    ({"history": "reference density of 1028 kg m-3"}, 1028.0), ({"rau0": "1026"}, 1026.0),
])
def test_density_is_found_in_metadata_with_a_notice_that_says_where(holder: dict[str, Any], value: float) -> None:
    decided = read(file=holder)
    assert decided.reading == DensityReading("constant", value)
    assert [notice.code for notice in decided.notices] == ["density_from_file"]
    assert f"global attribute '{next(iter(holder))}'" in decided.notices[0].text
    assert read("from file", file=holder).notices == ()


@pytest.mark.parametrize("holder", [
    {"rho0": 1.0}, {"rho0": "unknown"}, {"comment": "arho0=1030"}, {"source": "density 1035"}, {"rho0": 1025.0, "note": 3},
])
def test_other_numbers_are_not_taken_for_a_density(holder: dict[str, Any]) -> None:
    assert read(file=holder).reading.value == 1025.0


def test_nothing_said_gives_the_usual_density_with_a_notice() -> None:
    decided = read()
    assert decided.reading == DensityReading("constant", 1025.0)
    assert [notice.code for notice in decided.notices] == ["density_assumed"]
    assert "1025" in decided.notices[0].state
    assert "dic, alkalinity" in decided.decisions[0].reading


def test_different_densities_are_refused_unless_one_is_stated() -> None:
    roles = {"dic": {"rho0": 1025.0}, "alkalinity": {"rho0": 1035.0}}
    with pytest.raises(InputError, match="different densities") as caught:
        read(roles=roles)
    assert "attribute of dic 'rho0'" in str(caught.value)
    assert "attribute of alkalinity 'rho0'" in str(caught.value)
    with pytest.raises(InputError, match="different densities"):
        read("from file", roles={"dic": {"rho0": 1025.0}, "alkalinity": {}}, file={"source": "rho0=1035 kg m-3"})
    assert read("1026 kg m-3", roles=roles).reading.value == 1026.0


def test_from_file_without_one_is_refused() -> None:
    with pytest.raises(InputError, match="name none"):
        read("from file")


def test_a_stated_density_is_read_with_its_units_and_must_be_of_sea_water() -> None:
    assert read("1026.5 kg/m3").reading.value == 1026.5
    with pytest.raises(InputError, match="not that of sea water"):
        read("102 kg m-3")
    assert read("1200 kg m-3", unusual_values="accept").reading.value == 1200.0


def test_no_density_where_nothing_is_per_volume() -> None:
    assert read(roles={}).reading.kind == "none"
    assert read(roles={}).notices == ()
    assert read("from file", roles={}, file={"rho0": 1026.0}).reading.kind == "none"
    assert density(DensityReading("none"), None, xr.DataArray(1.0), xr.DataArray(0.0)) is None


@pytest.mark.parametrize(("stated", "reading"), [
    ("1026 kg m-3", DensityReading("constant", 1026.0)), ("in situ", DensityReading("in situ")),
])
def test_a_stated_density_is_kept_for_output_per_volume(stated: str, reading: DensityReading) -> None:
    decided = read(stated, roles={})
    assert decided.reading == reading
    assert decided.notices == ()
    assert "output per volume" in decided.decisions[0].reading


def test_in_situ_density_is_the_published_one() -> None:
    if not CHECKS.exists():
        pytest.skip("the shared data with the published check values are not beside the checkout")
    checks = [check for check in json.loads(CHECKS.read_text()) if check["quantity"] == "rho_SA_CT"]
    assert len(checks) >= 5
    for check in checks:
        salinity, pressure = xr.DataArray(float(check["S"])), xr.DataArray(float(check["p_dbar"]))
        warm = in_situ(xr.DataArray(check["t_degC"]), "conservative", salinity, pressure)
        found = density(DensityReading("in situ"), salinity, warm, pressure)
        assert found is not None
        # The way there and back through in-situ temperature costs a few units in the last place.
        assert found.item() == pytest.approx(check["value"], abs=check["half_unit"] + 1e-9), check["source"]
