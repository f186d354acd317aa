"""The array face: shapes, missing and unphysical input, errors, and the same bits whatever the way in."""

from __future__ import annotations

import threading

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.chemistry import DERIVED
from gridcarb.chemistry.compiled import TILE
from gridcarb.chemistry.tile import speciate
from gridcarb.errors import InputError, UnknownWordError

WATER = {"temperature": 15.0, "salinity": 35.0, "pressure": 100.0, "dic": 2100.0, "alkalinity": 2300.0}
KEYS = (
    "ph_total_scale", "ph_free_scale", "ph_seawater_scale", "hydrogen_ion", "aqueous_co2", "bicarbonate_ion",
    "carbonate_ion", "co2_fugacity", "co2_partial_pressure", "calcite_saturation", "aragonite_saturation",
    "revelle_factor",
)  # fmt: skip


def waters(count: int, seed: int = 3) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(seed)
    return {
        "temperature": rng.uniform(-1.8, 32, count), "salinity": rng.uniform(2, 40, count),
        "pressure": rng.uniform(0, 9000, count), "dic": rng.uniform(500, 4500, count),
        "alkalinity": rng.uniform(500, 4500, count), "phosphate": rng.uniform(0, 4, count),
        "silicate": rng.uniform(0, 250, count),
    }  # fmt: skip


def test_all_fields_come_under_their_catalogue_keys() -> None:
    result = speciate(**WATER)
    assert tuple(result) == KEYS == tuple(DERIVED)
    assert all(value.shape == () and value.dtype == np.float64 for value in result.values())


def test_inputs_broadcast() -> None:
    result = speciate(**{**WATER, "temperature": np.arange(0.0, 12.0)[:, None], "dic": np.arange(1900.0, 2300, 100)})
    assert result["ph_total_scale"].shape == (12, 4)
    one = speciate(**{**WATER, "temperature": 7.0, "dic": 2000.0})
    assert result["ph_total_scale"][7, 1] == one["ph_total_scale"]


@pytest.mark.parametrize("count", [0, 1, 7, TILE - 1, TILE, TILE + 1])
def test_any_number_of_cells(count: int) -> None:
    result = speciate(**waters(count), fields=["ph_total_scale", "solution_status"])
    assert result["ph_total_scale"].shape == (count,)
    assert np.isfinite(result["ph_total_scale"]).all()


@settings(deadline=None, max_examples=15)
@given(cuts=st.lists(st.integers(1, 2 * TILE), min_size=1, max_size=6), seed=st.integers(0, 5))
def test_chunking_and_order_change_no_bit(cuts: list[int], seed: int) -> None:
    cells = waters(2 * TILE + 17, seed)
    whole = speciate(**cells)
    pieces = [
        speciate(**dict(zip(cells, parts, strict=True)))
        for parts in zip(*(np.split(value, sorted(set(cuts))) for value in cells.values()), strict=True)
    ]
    order = np.random.default_rng(seed).permutation(2 * TILE + 17)
    shuffled = speciate(**{name: value[order] for name, value in cells.items()})
    for key, value in whole.items():
        np.testing.assert_array_equal(np.concatenate([piece[key] for piece in pieces]), value)
        np.testing.assert_array_equal(shuffled[key], value[order])


def test_threads_change_no_bit() -> None:
    cells = waters(3 * TILE)
    expected = speciate(**cells)
    found: list[dict[str, np.ndarray]] = []
    threads = [threading.Thread(target=lambda: found.append(speciate(**cells))) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(found) == 4
    for result in found:
        for key in KEYS:
            np.testing.assert_array_equal(result[key], expected[key])


def test_selection_of_fields_changes_no_bit() -> None:
    cells = waters(1000)
    every = speciate(**cells)
    for key in KEYS:
        np.testing.assert_array_equal(speciate(**cells, fields=[key])[key], every[key])


@pytest.mark.parametrize("share", [0.0, 0.1, 0.5, 0.99, 1.0])
def test_any_share_of_land_changes_no_bit_of_the_sea(share: float) -> None:
    cells = waters(3 * TILE + 5)
    expected = speciate(**cells, fields=[*KEYS, "solution_status"])
    land = np.random.default_rng(1).random(3 * TILE + 5) < share
    cells["dic"] = np.where(land, np.nan, cells["dic"])
    result = speciate(**cells, fields=[*KEYS, "solution_status"])
    for key, value in result.items():
        np.testing.assert_array_equal(value[~land], expected[key][~land])
    assert (result["solution_status"][land] == 2).all()
    assert all(np.isnan(result[key][land]).all() for key in KEYS)


@pytest.mark.parametrize("name", ["temperature", "salinity", "pressure", "dic", "alkalinity", "phosphate", "silicate"])
def test_nan_in_gives_nan_out(name: str) -> None:
    cells = waters(5)
    expected = speciate(**cells)
    cells[name][2] = np.nan
    result = speciate(**cells, fields=[*KEYS, "solution_status"])
    assert result.pop("solution_status")[2] == 2
    for key, value in result.items():
        assert np.isnan(value[2])
        np.testing.assert_array_equal(np.delete(value, 2), np.delete(expected[key], 2))


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("dic", 0.0), ("dic", -5.0), ("salinity", -0.1), ("phosphate", -1.0), ("silicate", -1e-9),
        ("temperature", 300.0), ("temperature", -3.0), ("pressure", -1.0), ("pressure", 4e7),
        ("alkalinity", np.inf), ("alkalinity", -np.inf), ("dic", np.inf), ("temperature", np.inf), ("silicate", np.inf),
    ],
)  # fmt: skip
def test_unphysical_input_gives_nan_and_a_status(name: str, value: float) -> None:
    result = speciate(**{**WATER, name: np.array([WATER.get(name, 0.0), value])}, fields=[*KEYS, "solution_status"])
    np.testing.assert_array_equal(result.pop("solution_status"), [0, 3])
    for values in result.values():
        assert np.isfinite(values[0])
        assert np.isnan(values[1])


@pytest.mark.parametrize(
    "water",
    [
        {"alkalinity": 0.0}, {"alkalinity": -500.0}, {"alkalinity": -18000.0}, {"alkalinity": 96000.0}, {"salinity": 0.0},
        {"salinity": 0.0, "alkalinity": -18000.0, "dic": 0.001}, {"dic": 25000.0}, {"dic": 0.001},
        {"salinity": 66.0, "temperature": 45.0}, {"alkalinity": 0.006, "dic": 0.001, "salinity": 0.0},
        {"dic": 5000.0, "alkalinity": 100.0},
        *({"salinity": 0.0, "dic": 7055.0, "alkalinity": 10.0**power} for power in range(-320, 1, 5)),
        *({"salinity": 0.0, "dic": 7055.0, "alkalinity": -(10.0**power)} for power in range(-320, 1, 5)),
    ],
)  # fmt: skip
def test_hard_but_physical_water_is_solved(water: dict[str, float]) -> None:
    result = speciate(**{**WATER, **water}, fields=[*KEYS, "solution_status"])
    assert result.pop("solution_status") in (0, 1)
    assert all(np.isfinite(value) for value in result.values())
    assert -2 < result["ph_total_scale"] < 16


def test_water_outside_the_range_of_the_constants_is_computed_and_flagged() -> None:
    result = speciate(**{**WATER, "salinity": np.array([35.0, 10.0])}, fields=["ph_total_scale", "solution_status"])
    np.testing.assert_array_equal(result["solution_status"], [0, 1])
    assert np.isfinite(result["ph_total_scale"]).all()


def test_masked_cells_count_as_missing() -> None:
    dic = np.ma.masked_array([2100.0, 2100.0], mask=[False, True])
    result = speciate(**{**WATER, "dic": dic}, fields=["ph_total_scale"])["ph_total_scale"]
    np.testing.assert_array_equal(np.isnan(result), [False, True])


def test_float32_and_integers_are_computed_in_double_precision() -> None:
    cells = {name: value.astype(np.float32) for name, value in waters(100).items()}
    expected = speciate(**{name: value.astype(np.float64) for name, value in cells.items()})
    for key, value in speciate(**cells).items():
        np.testing.assert_array_equal(value, expected[key])
    assert speciate(temperature=15, salinity=35, dic=2100, alkalinity=2300)["ph_total_scale"].dtype == np.float64


def test_arrays_of_any_making_are_read_and_left_alone() -> None:
    cells = waters(50)
    expected = speciate(**cells)["ph_total_scale"]
    frozen = {name: value.copy() for name, value in cells.items()}
    for value in frozen.values():
        value.flags.writeable = False
    strided = {name: np.repeat(value, 3)[::3] for name, value in cells.items()}
    swapped = {name: value.astype(">f8") for name, value in cells.items()}
    for other in (frozen, strided, swapped, {name: list(value) for name, value in cells.items()}):
        np.testing.assert_array_equal(speciate(**other)["ph_total_scale"], expected)
    for name, value in frozen.items():
        np.testing.assert_array_equal(value, cells[name])


def test_unknown_words_are_answered_with_the_nearest() -> None:
    with pytest.raises(UnknownWordError, match="aragonite_saturation"):
        speciate(**WATER, fields=["aragonite_saturaton"])
    with pytest.raises(UnknownWordError, match="guide2007"):
        speciate(**WATER, constants="guide2006")


def test_bad_arrays_are_refused_with_names() -> None:
    with pytest.raises(InputError, match=r"dic \(3,\)"):
        speciate(**{**WATER, "dic": np.ones(3), "salinity": np.ones(4)})
    with pytest.raises(InputError, match="salinity"):
        speciate(**{**WATER, "salinity": "35"})
    with pytest.raises(InputError, match="dic"):
        speciate(**{**WATER, "dic": 2100 + 1j})
