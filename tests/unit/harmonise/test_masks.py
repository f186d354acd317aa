"""Missing values by attribute, by default and by physics; packing as CF has it."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.errors import InputError
from gridcarb.harmonise.masks import RULES, read_mask, rules_met, unmask, unmask_roles


def decode(values: Any, dtype: str, **attrs: Any) -> tuple[list[float], list[str]]:
    raw = xr.DataArray(np.array(values, dtype=dtype), attrs=attrs)
    numbers, found = unmask(raw.values, read_mask(raw, "somewhere"))
    return numbers.tolist(), list(rules_met(found))


def same(numbers: list[float], wanted: list[float]) -> None:
    np.testing.assert_array_equal(numbers, wanted)


@pytest.mark.parametrize("data", ["f4", "f8"])
@pytest.mark.parametrize("fill", [np.float32(1e20), np.float64(1e20), np.float64(np.float32(1e20)), "1e20"])
@pytest.mark.parametrize("written", [1e20, float(np.float32(1e20))])
def test_fill_rounded_to_single_precision_or_not_is_the_same_fill(data: str, fill: Any, written: float) -> None:
    numbers, found = decode([1.0, written], data, _FillValue=fill)
    same(numbers, [1.0, np.nan])
    assert found == ["fill_value"]


def test_fill_value_and_missing_value_that_differ_both_count() -> None:
    numbers, found = decode([1.0, 1e20, -99.0, 2.0], "f4", _FillValue=np.float32(1e20), missing_value=np.float32(-99))
    same(numbers, [1.0, np.nan, np.nan, 2.0])
    assert found == ["fill_value", "missing_value"]


def test_several_missing_values() -> None:
    same(decode([1.0, -1.0, -2.0], "f8", missing_value=np.array([-1.0, -2.0]))[0], [1.0, np.nan, np.nan])


def test_undeclared_defaults() -> None:
    numbers, found = decode([9.969209968386869e36, -999.0, -9999.0, 1e30, np.nan, 3.0], "f4")
    same(numbers, [np.nan] * 5 + [3.0])
    assert found == ["nan", "default_fill", "usual_fill", "beyond_physics"]
    same(decode([-32767, 5], "i2")[0], [np.nan, 5.0])
    same(decode([-32767, 5], "i2", _FillValue=np.int16(0))[0], [-32767.0, 5.0])


def test_zero_as_fill_is_exact() -> None:
    same(decode([0.0, 1e-300, 1.0], "f8", _FillValue=0.0)[0], [np.nan, 1e-300, 1.0])


def test_fill_of_integers_is_compared_before_unpacking() -> None:
    attrs: dict[str, Any] = {"_FillValue": np.int16(-1), "scale_factor": 0.01, "add_offset": -0.99}
    same(decode([-1, 0, 199], "i2", **attrs)[0], [np.nan, -0.99, 199 * 0.01 - 0.99])


def test_unsigned_bytes() -> None:
    same(decode([-1, -2, 1], "i1", _Unsigned="true", _FillValue=np.int8(-1))[0], [np.nan, 254.0, 1.0])


def test_fill_that_an_integer_cannot_hold_masks_nothing() -> None:
    same(decode([1, 2], "i2", missing_value=1e20, _FillValue=np.int16(-5))[0], [1.0, 2.0])


@pytest.mark.parametrize("attrs", [{"valid_range": np.array([0.0, 50.0])}, {"valid_min": 0.0, "valid_max": 50.0}])
def test_valid_range(attrs: dict[str, Any]) -> None:
    numbers, found = decode([-1.0, 0.0, 50.0, 51.0], "f8", **attrs)
    same(numbers, [np.nan, 0.0, 50.0, np.nan])
    assert found == ["valid_range"]


def test_valid_range_of_packed_numbers_by_its_type() -> None:
    packing = {"scale_factor": 0.5, "_FillValue": np.int16(-1)}
    same(decode([10, 30, 50], "i2", valid_max=np.int16(40), **packing)[0], [5.0, 15.0, np.nan])
    same(decode([10, 30, 50], "i2", valid_max=np.float64(10), **packing)[0], [5.0, np.nan, np.nan])


def test_valid_range_of_numbers_unpacked_by_the_reader() -> None:
    raw = xr.DataArray(np.array([5.0, 25.0]), attrs={"valid_max": np.int16(40)})
    raw.encoding = {"scale_factor": 0.5, "add_offset": 0.0}
    same(unmask(raw.values, read_mask(raw, ""))[0].tolist(), [5.0, np.nan])


@settings(deadline=None)
@given(
    st.sampled_from(["f4", "f8", ">f4", "i2", "i4", "u1"]), st.lists(st.sampled_from(
        [0.0, 1.0, 7.0, 98.0, 99.0, 100.0, 200.0, -1.0, -98.0, -99.0, -100.0, -999.0, -9999.0, 1e15, 1e20, np.inf,
         np.nan]), min_size=1, max_size=20),
    st.sampled_from([None, 0.0, 99.0, -99.0, 1e20]), st.sampled_from([None, 0.0, -99.0]),
    st.sampled_from([None, 7.0, 150.0]), st.sampled_from([(1.0, 0.0), (0.5, 10.0), (-2.0, 3.0)]),
)  # fmt: skip
def test_every_number_is_judged_as_the_rules_say(dtype, values, fill, low, high, packing) -> None:
    """The rules one by one in plain words, number by number."""
    if np.dtype(dtype).kind != "f":
        bounds = np.iinfo(dtype)
        values = [value for value in values if np.isfinite(value) and bounds.min <= value <= bounds.max]
    raw = np.array(values, dtype=dtype)
    attrs = {"_FillValue": fill, "valid_min": low, "valid_max": high, "scale_factor": packing[0], "add_offset": packing[1]}
    attrs = {key: value for key, value in attrs.items() if value is not None}
    numbers, marks = unmask(raw, read_mask(xr.DataArray(raw, attrs=attrs), ""))
    for given_, number, mark in zip(raw.astype("f8"), numbers, marks, strict=True):
        unpacked = given_ * packing[0] + packing[1]
        alike = np.float32(given_) == np.float32(fill) if np.dtype(dtype).kind == "f" and fill else given_ == fill
        rules = {
            "nan": np.isnan(given_), "fill_value": fill is not None and alike,
            "usual_fill": np.dtype(dtype).kind == "f" and given_ in (-999.0, -9999.0),
            "valid_range": (low is not None and unpacked < low) or (high is not None and unpacked > high),
            "beyond_physics": abs(unpacked) >= 1e15,
        }
        first = next((rule for rule, hit in rules.items() if hit), None)
        assert rules_met(np.array([mark])) == ((first,) if first else ())
        same([number], [np.nan if first else unpacked])


def test_attributes_that_are_no_numbers_are_refused() -> None:
    with pytest.raises(InputError, match="_FillValue = 'none' is not a number") as caught:
        decode([1.0], "f8", _FillValue="none")
    assert caught.value.where == "somewhere"
    with pytest.raises(InputError, match="not numbers"):
        read_mask(xr.DataArray(np.array(["a"])), "")


def test_land_by_physics_only_where_salinity_and_alkalinity_both_vanish() -> None:
    salinity = np.array([0.0, 0.0, 35.0, -1.0, np.nan])
    alkalinity = np.array([0.0, 2.0, 0.0, 0.0, 0.0])
    raw = xr.Dataset({"salinity": ("x", salinity), "alkalinity": ("x", alkalinity), "dic": ("x", np.full(5, 2.0))})
    readings = {name: read_mask(raw[name], name) for name in raw}
    clean, counts = unmask_roles(raw, readings, tuple(raw))
    assert np.isnan(clean["dic"].values).tolist() == [True, False, False, True, False]
    assert (counts["land"], counts["nan"]) == (2, 1)
    assert tuple(counts) == RULES


@settings(deadline=None)
@given(st.lists(st.sampled_from([1.0, 2.5, 1e20, -999.0, np.nan, 0.0]), min_size=1, max_size=12))
def test_counts_add_up_over_slices(values: list[float]) -> None:
    raw = xr.Dataset({name: ("x", np.array(values), {"_FillValue": 1e20}) for name in ("salinity", "alkalinity")})
    readings = {name: read_mask(raw[name], name) for name in raw}
    whole = unmask_roles(raw, readings, tuple(raw))[1]
    parts = [unmask_roles(raw.isel(x=slice(n, n + 1)), readings, tuple(raw))[1] for n in range(len(values))]
    assert whole == {rule: sum(part[rule] for part in parts) for rule in RULES}
    assert sum(whole.values()) == sum(v in (1e20, -999.0, 0.0) or np.isnan(v) for v in values)
