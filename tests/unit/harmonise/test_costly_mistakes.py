"""The costly mistakes of reading (M1, M2, M3, M5, M9, M10): what the program does, and what it saves its user from.

The sizes of the errors are those of the science sheet, which computed them with total boron of Lee et al. (2010).
"""

from __future__ import annotations

from typing import Any

import gsw
import numpy as np
import pytest
import xarray as xr

from gridcarb.chemistry.tile import speciate
from gridcarb.errors import InputError
from gridcarb.harmonise import clothe, understand
from gridcarb.harmonise.settings import ReadingSettings

PRESSURE, LATITUDE, LONGITUDE = 4000.0, 10.0, 200.0
ABSOLUTE = float(gsw.SA_from_SP(34.7, PRESSURE, LONGITUDE, LATITUDE))
IN_SITU_DENSITY = float(gsw.rho_t_exact(ABSOLUTE, 1.6, PRESSURE))
DEEP = {"temperature": 1.6, "salinity": 34.7, "dic": 2310.0, "alkalinity": 2400.0, "phosphate": 2.2, "silicate": 120.0}
SURFACE = {"temperature": 20.0, "salinity": 35.0, "dic": 2050.0, "alkalinity": 2300.0, "phosphate": 0.0, "silicate": 0.0}
NAMES = {"temperature": "sea_water_temperature", "salinity": "sea_water_practical_salinity"}
UNITS = {"temperature": "degC", "salinity": "1"}


def cell(water: dict[str, float], level: dict[str, Any] | None = None, **attributes: dict[str, Any]) -> xr.Dataset:
    """One cell as the sources would hand it over, amounts in umol/kg, the level at 4000 dbar."""
    attrs = {
        role: {"units": UNITS.get(role, "umol kg-1")} | ({"standard_name": NAMES[role]} if role in NAMES else {})
        for role in water
    }
    variables = {role: ((), value, attrs[role] | attributes.get(role, {})) for role, value in water.items()}
    level = level or {"value": PRESSURE, "units": "dbar", "standard_name": "sea_water_pressure_due_to_sea_water"}
    return xr.Dataset(variables, coords={
        "level": ((), level["value"], {"axis": "Z", **{key: value for key, value in level.items() if key != "value"}}),
        "lat": ((), LATITUDE, {"units": "degrees_north"}), "lon": ((), LONGITUDE, {"units": "degrees_east"}),
    })


def answer(raw: xr.Dataset, **settings: Any) -> dict[str, float]:
    """Aragonite saturation, pH and fCO2 of the cell as it is read."""
    clothed = clothe(raw, understand(raw, ReadingSettings(**settings))).drop_vars("density", errors="ignore")
    state = {str(key): float(values) for key, values in clothed.items()}
    return chemistry(pressure=state.pop("sea_pressure"), **state)


def chemistry(**state: float) -> dict[str, float]:
    fields = ("aragonite_saturation", "ph_total_scale", "co2_fugacity")
    found = speciate(**state, fields=fields, constants="practice2022")
    return {key: float(found[key]) for key in fields}


def errors(wrong: dict[str, float], right: dict[str, float]) -> tuple[float, float, float]:
    """Relative error of aragonite saturation (per cent), errors of pH and of fCO2 (uatm)."""
    omega, ph, fugacity = "aragonite_saturation", "ph_total_scale", "co2_fugacity"
    return 100 * (wrong[omega] / right[omega] - 1), wrong[ph] - right[ph], wrong[fugacity] - right[fugacity]


@pytest.fixture(scope="module")
def right() -> dict[str, float]:
    return answer(cell(DEEP))


def per_volume(water: dict[str, float], density: float, **more: Any) -> xr.Dataset:
    given = {role: value * density / 1e6 if role not in NAMES else value for role, value in water.items()}
    return cell(given, **{role: {"units": "mol m-3", **more.get(role, {})} for role in water if role not in NAMES})


def test_the_cases_are_those_of_the_sheet(right: dict[str, float]) -> None:
    assert right["aragonite_saturation"] == pytest.approx(0.509, abs=5e-4)
    assert right["ph_total_scale"] == pytest.approx(7.752, abs=2e-3)
    surface = chemistry(**SURFACE)
    assert surface["aragonite_saturation"] == pytest.approx(2.76, abs=5e-3)
    assert surface["ph_total_scale"] == pytest.approx(8.026, abs=5e-4)
    assert surface["co2_fugacity"] == pytest.approx(420.5, abs=0.05)


def test_m1_density_in_situ_or_constant(right: dict[str, float]) -> None:
    raw = per_volume(DEEP, IN_SITU_DENSITY)
    assert answer(raw, density="in situ")["ph_total_scale"] == pytest.approx(right["ph_total_scale"], abs=1e-5)
    omega, ph, _ = errors(answer(raw, density="1025 kg m-3"), right)
    assert omega == pytest.approx(2.7, abs=0.05)
    assert ph == pytest.approx(0.003, abs=5e-4)


def test_m1_two_densities_are_refused() -> None:
    raw = per_volume(DEEP, 1025.0, dic={"rho0": 1025.0}, alkalinity={"rho0": 1035.25})
    with pytest.raises(InputError, match="different densities"):
        understand(raw, ReadingSettings())
    right = chemistry(**SURFACE)
    omega, ph, fugacity = errors(chemistry(**SURFACE | {"alkalinity": 2300 * 1.01}), right)
    assert omega * right["aragonite_saturation"] / 100 == pytest.approx(0.24, abs=5e-3)
    assert ph == pytest.approx(0.04, abs=2e-3)
    assert fugacity == pytest.approx(-39, abs=0.5)


@pytest.mark.parametrize("units", ["mol m-3", "mmol m-3"])
def test_m1_forgotten_conversion_is_refused(units: str) -> None:
    raw = cell(DEEP, **{role: {"units": units} for role in ("dic", "alkalinity")})
    if units == "mol m-3":
        with pytest.raises(InputError, match="look like mmol m-3 or umol kg-1"):
            understand(raw, ReadingSettings())
    else:  # mmol m-3 for umol kg-1 looks like sea water; only the density notice tells
        assert "density_assumed" in {notice.code for notice in understand(raw, ReadingSettings()).notices}


def test_m2_potential_for_in_situ(right: dict[str, float]) -> None:
    potential = float(gsw.pt0_from_t(ABSOLUTE, 1.6, PRESSURE))
    assert 1.6 - potential == pytest.approx(0.35, abs=0.04)
    raw = cell(DEEP | {"temperature": potential}, temperature={"standard_name": "sea_water_potential_temperature"})
    read = answer(raw)
    assert read["aragonite_saturation"] == pytest.approx(right["aragonite_saturation"], rel=1e-9)
    omega, ph, _ = errors(answer(raw, temperature="in situ"), right)
    assert omega == pytest.approx(-0.6, abs=0.1)
    assert ph == pytest.approx(0.005, abs=5e-4)
    del raw["temperature"].attrs["standard_name"]
    with pytest.raises(InputError, match="potential or conservative"):
        understand(raw, ReadingSettings())


def test_m3_absolute_for_practical(right: dict[str, float]) -> None:
    raw = cell(DEEP | {"salinity": ABSOLUTE}, salinity={"standard_name": "sea_water_salinity", "units": "g kg-1"})
    assert answer(raw)["aragonite_saturation"] == pytest.approx(right["aragonite_saturation"], rel=1e-9)
    omega, ph, _ = errors(answer(raw, salinity="practical"), right)
    assert omega == pytest.approx(-0.1, abs=0.05)
    assert ph == pytest.approx(-0.002, abs=5e-4)


def test_m5_pressure_left_out(right: dict[str, float]) -> None:
    raw = cell(DEEP)
    omega, ph, _ = errors(answer(raw, depth="surface"), right)
    assert ph == pytest.approx(0.163, abs=2e-3)
    assert right["aragonite_saturation"] * (1 + omega / 100) == pytest.approx(1.18, abs=5e-3)
    assert "depth_overruled" in {notice.code for notice in understand(raw, ReadingSettings(depth="surface")).notices}
    levels = cell(DEEP).expand_dims(lev=15).drop_vars("level")
    with pytest.raises(InputError, match="no coordinate"):
        understand(levels, ReadingSettings())


def test_m5_metres_for_decibars(right: dict[str, float]) -> None:
    depth = -float(gsw.z_from_p(PRESSURE, LATITUDE))
    metres = cell(DEEP, {"value": depth, "units": "m", "positive": "down", "standard_name": "depth"})
    assert answer(metres)["aragonite_saturation"] == pytest.approx(right["aragonite_saturation"], rel=1e-9)
    taken_as_dbar = cell(DEEP, {"value": depth, "units": "dbar", "standard_name": "sea_water_pressure_due_to_sea_water"})
    # The sheet says 1.4 per cent, down; 3932 m read as 3932 dbar gives 1.2 per cent, up: less pressure, more saturation.
    assert errors(answer(taken_as_dbar), right)[0] == pytest.approx(1.2, abs=0.1)


def test_m9_nutrients_left_out(right: dict[str, float]) -> None:
    raw = cell(DEEP).drop_vars(["phosphate", "silicate"])
    with pytest.raises(InputError, match="phosphate is not given"):
        understand(raw, ReadingSettings())
    omega, ph, _ = errors(answer(raw, phosphate="assume zero", silicate="assume zero"), right)
    assert omega == pytest.approx(2.7, abs=0.1)
    assert ph == pytest.approx(0.012, abs=5e-4)
    stated = answer(raw, phosphate="2.2 umol kg-1", silicate="120 umol kg-1")
    assert stated == right


@pytest.mark.parametrize("fill", [1e20, float(np.float32(1e20)), 9.969209968386869e36, -999.0, 0.0])
def test_m10_no_fill_value_becomes_water(fill: float) -> None:
    wet = cell(DEEP)
    land = wet.copy(deep=True)
    for role in DEEP:
        land[role] = ((), fill, wet[role].attrs)
    raw = xr.concat([wet, land], dim="station", combine_attrs="override", coords="different", compat="equals", join="exact")
    clothed = clothe(raw, understand(raw, ReadingSettings()))
    for role in DEEP:
        assert np.isfinite(clothed[role].values).tolist() == [True, False]
    assert sum(clothed.attrs["masked_cells"].values()) == 1
