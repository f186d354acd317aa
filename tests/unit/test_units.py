"""Units: every accepted spelling means what it should to the last digit; everything else is refused with a cure."""

from __future__ import annotations

import pickle
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb import units
from gridcarb.errors import UnitsError

SPELLINGS: dict[str, tuple[str, ...]] = {
    "1 mol m-3": ("mol m-3", "mol/m^3", "mol/m3", "mol m**-3", "mol m^-3", "mol.m-3", "mol*m-3", "moles m-3", "mole m-3",
                  "mol m⁻³", "mol m−3", "mol m^{-3}", "mol C m-3", "molC m-3", "eq m-3", "mol eq m-3",
                  "mol equivalent m-3",
                  "mmol L-1", "mmol/l", "mM", "meq/L", "mEq L-1", "mol per m3", "kmol/dam3", "mmol/litre", "mmol dm-3"),
    "0.001 mol m-3": ("mmol m-3", "mmol/m^3", "mmol/m**3", "mMol/m3", "MMOL/M3", "umol L-1", "umol/l", "µmol/L", "μmol/L",
                      "uM", "µM",
                      "meq m-3", "mmol_eq/m3", "ueq/L", "mmol C m-3", "mmolC/m3", "mmol/m3 of C", "mmol P m-3",
                      "mmol Si/m3", "micromol L-1", "micromoles per litre", "1e-3 mol m-3", "mmol (C) m-3"),
    "1 mol kg-1": ("mol kg-1", "mol/kg", "eq kg-1", "mol kg**-1", "mol kg^-1", "mmol g-1", "mol/kg-sw"),
    "1e-6 mol kg-1": ("umol kg-1", "umol/kg", "µmol/kg", "μmol kg-1", "µmol kg⁻¹", "umol kg**-1", "umol kg^-1", "umol.kg-1",
                      "1e-6 mol kg-1", "umol/kg-sw", "umol kg-1 sw", "umol kg-1 seawater", "umol/kg of sea water",
                      "umol/kgSW",
                      "micromol/kg", "micromoles_per_kilogram", "ueq/kg", "ueq kg-1", "umol Si/kg", "nmol g-1", "mmol t-1"),
    "1 kg m-3": ("kg m-3", "kg/m3", "kg/m^3", "g L-1", "g/L", "mg cm-3"),
    "1000 kg m-3": ("g cm-3", "g/cm3", "kg/L"),
    "1 m": ("m", "metre", "meter", "meters", "metres"),
    "0.01 m": ("cm", "centimeter", "centimetres"),
    "1000 m": ("km", "kilometers"),
    "10000 Pa": ("dbar", "decibar", "decibars"),
    "1 Pa": ("Pa", "pascal"),
}
CASES = [(text, size) for size, texts in SPELLINGS.items() for text in texts]
CELSIUS = ("degC", "deg_C", "degree_Celsius", "degree_C", "degrees_celsius", "celsius", "Celsius", "C", "°C", "deg C",
           "degrees C")
KELVIN = ("K", "kelvin", "degK", "Kelvin", "deg_K", "degree K")
PRACTICAL = ("1", "0.001", "1e-3", "1.e-3", "psu", "PSU", "PSS-78", "pss", "practical salinity units", "ppt", "o/oo")
REFUSED = ("", "  ", "bananas", "unknown", "no_unit", "mol", "kg", "C m-3", "degF", "2 K", "MMOL M", "umol kg",
           "days since 2000-01-01",
           "mol m-3 s-1", "-1 mol m-3", "0 mol m-3", "mol m-2", "%%", "µ", "m3/mol", "mmol/m3/d")


@pytest.mark.parametrize(("text", "size"), CASES)
def test_spelling_means_its_size_exactly(text: str, size: str) -> None:
    number, base = size.split(" ", 1)
    found, plain = units.read(text), units.read(base)
    assert found.kind == plain.kind
    assert found.size / plain.size == Fraction(number)


@settings(deadline=None)
@given(st.sampled_from(CASES), st.sampled_from(CASES), st.floats(1e-6, 1e6))
def test_conversion_there_and_back_is_the_identity(one: tuple[str, str], other: tuple[str, str], number: float) -> None:
    if units.read(one[0]).kind != units.read(other[0]).kind:
        with pytest.raises(UnitsError, match=r"measure|molar mass"):
            units.conversion(one[0], other[0])
        return
    substances = {"C", "P", "Si", "eq"}
    there = units.conversion(one[0], other[0], substances=substances)
    back = units.conversion(other[0], one[0], substances=substances)
    assert back(there(number)) == pytest.approx(number, rel=4e-16)


def test_factors_are_exact_to_the_last_digit() -> None:
    assert units.conversion("mmol m-3", "mol m-3") == units.Linear(1e-3)
    assert units.conversion("umol L-1", "umol m-3") == units.Linear(1000.0)  # 999.9999999999998 in floating point
    assert units.conversion("mol m-3", "umol m-3") == units.Linear(1e6)
    assert units.conversion("mol kg-1", "umol kg-1") == units.Linear(1e6)
    assert units.conversion("umol kg-1", "umol kg-1") == units.Linear(1.0)
    assert units.conversion("kg kg-1", "g kg-1") == units.Linear(1000.0)
    assert units.conversion("Pa", "dbar") == units.Linear(1e-4)


@pytest.mark.parametrize("text", CELSIUS)
def test_celsius_is_never_coulomb(text: str) -> None:
    assert units.conversion(text, "degC") == units.Linear(1.0)
    assert units.conversion(text, "K") == units.Linear(1.0, 273.15)


@pytest.mark.parametrize("text", KELVIN)
def test_kelvin(text: str) -> None:
    assert units.conversion(text, "degC") == units.Linear(1.0, -273.15)


@pytest.mark.parametrize("text", PRACTICAL)
def test_practical_spellings_leave_the_number_alone(text: str) -> None:
    assert units.read(text).kind == "practical salinity"
    assert units.conversion(text, "psu")(35.0) == 35.0


@pytest.mark.parametrize(("text", "factor"), [("g kg-1", 1.0), ("g/kg", 1.0), ("kg/kg", 1000.0), ("gram/gram", 1000.0)])
def test_mass_fractions_are_not_practical(text: str, factor: float) -> None:
    assert units.read(text).kind == "mass fraction"
    assert units.conversion(text, "g kg-1").scale == factor


@pytest.mark.parametrize("text", REFUSED)
def test_refused(text: str) -> None:
    with pytest.raises(UnitsError, match=r"missing|cannot be read") as caught:
        units.conversion(text, "umol kg-1", where="file.nc: dic", mend="write it in the recipe")
    assert caught.value.where == "file.nc: dic"
    assert "write it in the recipe" in str(caught.value)


def test_missing_units_name_the_accepted_spellings() -> None:
    with pytest.raises(UnitsError, match="missing") as caught:
        units.read(None, expected=("temperature",))
    for word in ("degC", "celsius", "K"):
        assert f"'{word}'" in caught.value.mend


def test_volume_is_never_silently_mass() -> None:
    with pytest.raises(UnitsError, match="measure amount per volume; needed is amount per mass"):
        units.conversion("mol m-3", "umol kg-1")


@pytest.mark.parametrize("text", ["g C m-3", "gC/m3", "mg/L CaCO3", "mg/l as CaCO3", "mg CaCO3/L", "mg kg-1", "kg m-3"])
def test_masses_need_a_molar_mass(text: str) -> None:
    with pytest.raises(UnitsError, match="molar mass") as caught:
        units.conversion(text, "umol kg-1" if "kg-1" in text else "umol m-3")
    assert "0.0199827 meq L-1" in caught.value.mend


def test_molar_mass_turns_mass_into_amount() -> None:
    assert units.conversion("g C m-3", "mol m-3", molar_mass=12.011)(12.011) == pytest.approx(1.0, rel=1e-15)
    assert units.conversion("mg kg-1", "umol kg-1", molar_mass=12.011)(12.011) == pytest.approx(1000.0, rel=1e-15)
    # the factors the error message offers: 1 g of carbon, and 1 mg of CaCO3 as two equivalents
    assert units.conversion("0.083257 mol m-3", "mol m-3").scale == pytest.approx(1 / 12.011, rel=1e-5)
    assert units.conversion("0.0199827 meq L-1", "mol m-3", substances={"eq"}).scale == pytest.approx(2 / 100.087, rel=1e-5)


def test_the_substance_must_fit() -> None:
    assert units.conversion("mmol C m-3", "mol m-3", substances={"C"}).scale == 1e-3
    with pytest.raises(UnitsError, match="count C, which"):
        units.conversion("mmol C m-3", "mol m-3", substances={"P"})
    with pytest.raises(UnitsError, match="count eq, which"):
        units.conversion("meq m-3", "mol m-3", substances={"C"})


def test_linear_works_on_arrays_and_travels() -> None:
    kelvin = units.conversion("K", "degC")
    assert kelvin(np.array([273.15, 300.0])).tolist() == [0.0, 300.0 - 273.15]
    assert pickle.loads(pickle.dumps(kelvin)) == kelvin
