"""Units that are wrong, missing or unreadable: refused, and the recipe line that is named gives the true result."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from synthetic_grids.clothes import MODEL_NAMES

ROLES = {name: role for role, name in MODEL_NAMES.items()}


def _scaled(ds: xr.Dataset, name: str, factor: float, offset: float = 0.0) -> xr.Dataset:
    """Other numbers, the same attributes; fill values stay."""
    values = ds[name]
    ds[name] = xr.where(values < 1e19, factor * values + offset, values).astype(np.float32).transpose(*values.dims)
    ds[name].attrs = values.attrs
    return ds


def _relabelled(ds: xr.Dataset, name: str, units: str | None) -> xr.Dataset:
    if units is None:
        del ds[name].attrs["units"]
    else:
        ds[name].attrs["units"] = units
    return ds


def _close(mended: xr.Dataset, true: xr.Dataset) -> None:
    xr.testing.assert_allclose(mended["ph_total_scale"], true["ph_total_scale"], rtol=0, atol=2e-4)


@pytest.fixture
def true(bench, ocean) -> xr.Dataset:
    bench.put(ocean())
    return bench.success()


@pytest.mark.parametrize("name", ROLES)
@pytest.mark.parametrize(("units", "what"), [
    (None, "missing"), ("", "missing"), ("furlong", "measure length"), ("frobs", "cannot be read"),
])
def test_missing_or_unreadable(bench, ocean, *, name: str, units: str | None, what: str) -> None:
    ds = _relabelled(ocean(), name, units)
    if name == "so":
        del ds["so"].attrs["standard_name"]  # practical salinity may go without units
    bench.put(ds)
    told = bench.refusal(3)
    role = ROLES[name]
    assert told.where == f"{bench.folder / 'ocean.nc'}: {name} ({role})"
    assert what in told.what
    line = told.line()
    assert list(line["reading"]["units"]) == [role]
    bench.say({"reading": {"units": {role: {"thetao": "degC", "so": "psu"}.get(name, "umol kg-1")}}})
    bench.success()


WRONG: dict[str, tuple[str, float, float, str | None, str]] = {
    "dic in mmol m-3 said to be mol m-3": ("dissic", 1.025, 0, "mol m-3", "mmol m-3"),
    "alkalinity in mol m-3 said to be mmol m-3": ("talk", 1.025e-3, 0, "mmol m-3", "mol m-3"),
    "dic in mol/kg said to be umol/kg": ("dissic", 1e-6, 0, "umol kg-1", "mol kg-1"),
    "alkalinity as a mass of CaCO3": ("talk", 0.0500435 * 1.025, 0, "mol m-3", "CaCO3"),
    "dic as a mass of carbon": ("dissic", 0.012011 * 1.025, 0, "mol m-3", "of C"),
    "kelvin said to be degC": ("thetao", 1, 273.15, "degC", "kelvin"),
    "degC said to be kelvin": ("thetao", 1, 0, "K", "degC"),
    "kg of salt per kg": ("so", 1e-3, 0, "1", "kg of salt"),
    "phosphate in nmol said to be umol": ("po4", 1e3, 0, "umol kg-1", "more than sea water holds"),
}


@pytest.mark.parametrize("case", WRONG)
def test_units_that_are_not_those_of_the_numbers(bench, ocean, true: xr.Dataset, case: str) -> None:
    name, factor, offset, units, what = WRONG[case]
    ds = _relabelled(_scaled(ocean(), name, factor, offset), name, units)
    del ds[name].attrs["standard_name"]
    bench.put(ds)
    bench.say({"reading": {"temperature": "potential"}})
    told = bench.refusal(3)
    assert what in told.what
    bench.say(told.line(**({"...": "nmol kg-1"} if name == "po4" else {})))
    if name == "so":
        bench.say({"reading": {"salinity": "practical"}})
    _close(bench.success(), true)


def test_where_two_units_are_likely_both_are_named(bench, ocean) -> None:
    bench.put(_relabelled(ocean(), "dissic", "mol m-3"))
    told = bench.refusal(3)
    assert "look like mmol m-3 or umol kg-1" in told.what
    assert "whichever is true" in told.mend
    assert [told.line(place)["reading"]["units"]["dic"] for place in (0, 1)] == ["mmol m-3", "umol kg-1"]


@pytest.mark.parametrize(("name", "units", "factor"), [
    ("dissic", "MMOL/M3", 1.025), ("dissic", "UMOL/KG", 1), ("talk", "umol/l", 1.025), ("talk", "microeq/kg", 1),
    ("dissic", "μmol kg⁻¹", 1), ("talk", "uEq/L", 1.025), ("po4", "umol P/l", 1.025), ("thetao", "DEG C", 1),
    ("thetao", "degrees Celsius", 1), ("so", "PSU", 1), ("so", "g/kg", 1.004715),
])
def test_spellings_of_the_trade_are_read(bench, ocean, true: xr.Dataset, *, name: str, units: str, factor: float) -> None:
    ds = _relabelled(_scaled(ocean(), name, factor), name, units)
    if units == "g/kg":
        ds["so"].attrs["standard_name"] = "sea_water_absolute_salinity"
    bench.put(ds)
    _close(bench.success(), true)


def test_a_substance_that_is_another(bench, ocean, true: xr.Dataset) -> None:
    bench.put(_relabelled(ocean(), "dissic", "umol N kg-1"))
    told = bench.refusal(3)
    assert "umol N kg-1" in told.what
    bench.say({"reading": {"units": {"dic": "umol C kg-1"}}})
    _close(bench.success(), true)


@pytest.mark.parametrize("stated", ["umol", "parsec", "kg"])
def test_units_of_the_recipe_are_checked_too(bench, ocean, stated: str) -> None:
    bench.put(ocean())
    bench.say({"reading": {"units": {"dic": stated}}})
    ended = bench.run()
    assert ended.exit_code in (2, 3)
    assert stated in ended.stderr


def test_a_fill_value_that_is_text(bench, ocean) -> None:
    ds = ocean()
    for name, variable in ds.data_vars.items():
        ds[name] = variable.astype("f4")
    ds["dissic"].attrs["missing_value"] = "none"
    bench.put(ds)
    told = bench.refusal(3)
    assert "missing_value" in told.what
    assert told.where.endswith("dissic (dic)")


@pytest.mark.parametrize(("stated", "what"), [("5 kg m-3", "not that of sea water"), ("from file", "name none")])
def test_a_density_that_cannot_be_has_its_place_in_the_recipe(bench, ocean, stated: str, what: str) -> None:
    bench.put(ocean(tracer_units="mol m-3"))
    bench.say({"reading": {"density": stated}})
    told = bench.refusal(3)
    assert told.where == "reading.density"
    assert what in told.what
    bench.say(told.line())
    bench.success()
