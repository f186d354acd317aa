"""Every field of thousands of waters against the slow twin in fifty digits, and the twin against itself in double."""

from __future__ import annotations

from typing import Any

import mpmath
import numpy as np
import pytest

import gridcarb
from gridcarb.chemistry import CONSTANTS, DERIVED
from tests.naive.twin import Twin

AGREEMENT = 1e-11
"""Asked for: 1e-9."""

FIFTY = mpmath.mp.clone() if hasattr(mpmath.mp, "clone") else mpmath.mp
FIFTY.dps = 50

Waters = dict[str, np.ndarray]


def ordinary(count: int, seed: int) -> Waters:
    """T -1.8 to 35, S 2 to 42, 0 to 10000 dbar, DIC and alkalinity 500 to 4500, silicate to 250 umol/kg."""
    rng = np.random.default_rng(seed)
    return {
        "temperature": rng.uniform(-1.8, 35, count), "salinity": rng.uniform(2, 42, count),
        "pressure": rng.uniform(0, 10000, count), "dic": rng.uniform(500, 4500, count),
        "alkalinity": rng.uniform(500, 4500, count), "phosphate": rng.uniform(0, 5, count),
        "silicate": rng.uniform(0, 250, count),
    }  # fmt: skip


def extreme(count: int, seed: int) -> Waters:
    """T to 45, S 0 to 66, DIC 0.001 to 25000, alkalinity -18000 to 96000 umol/kg, nutrients to 1000."""
    rng = np.random.default_rng(seed)
    alkalinity = rng.uniform(-18000, 96000, count) * np.where(rng.random(count) < 0.3, 1e-3, 1.0)
    return {
        "temperature": rng.uniform(-1.8, 45, count),
        "salinity": np.where(rng.random(count) < 0.1, 0.0, rng.uniform(0, 66, count)),
        "pressure": rng.uniform(0, 10000, count),
        "dic": 10 ** rng.uniform(-3, np.log10(25000), count),
        "alkalinity": np.where(rng.random(count) < 0.1, 0.0, alkalinity),
        "phosphate": 10 ** rng.uniform(-3, 3, count),
        "silicate": 10 ** rng.uniform(-3, 3, count),
    }  # fmt: skip


def worst_disagreement(waters: Waters, constants: str) -> tuple[float, str]:
    found = gridcarb.speciate(**waters, constants=constants)
    worst = (0.0, "")
    for place in range(len(waters["dic"])):
        one = {name: float(values[place]) for name, values in waters.items()}
        expected = solved_by_twin(one, constants)
        for key, value in expected.items():
            ours = float(found[key][place])
            error = abs(float((mpmath.mpf(ours) - value) / value)) if value else abs(ours)
            if not error <= worst[0]:
                worst = (error, f"{key} of {one}")
    return worst


def solved_by_twin(one: dict[str, float], constants: str) -> dict[str, Any]:
    twin = Twin(one["temperature"], one["salinity"], one["pressure"], constants, FIFTY)
    return twin.solve(one["dic"], one["alkalinity"], one["phosphate"], one["silicate"], digits=28)


@pytest.mark.parametrize("seed", range(8))
def test_ordinary_water_agrees_with_fifty_digits(seed: int) -> None:
    error, where = worst_disagreement(ordinary(250, seed), list(CONSTANTS)[seed % len(CONSTANTS)])
    assert error < AGREEMENT, where


@pytest.mark.parametrize("seed", range(2))
def test_extreme_water_agrees_with_fifty_digits(seed: int) -> None:
    error, where = worst_disagreement(extreme(250, 100 + seed), list(CONSTANTS)[seed % len(CONSTANTS)])
    assert error < AGREEMENT, where


def test_twin_covers_every_set_and_field() -> None:
    for key in CONSTANTS:
        found = Twin(15, 35, 0, key).solve(2100, 2300)
        assert set(found) == set(DERIVED)


def test_alkalinity_residual_of_every_cell_is_at_round_off() -> None:
    """Alkalinity put together again from the fields, in double precision, against what was given.

    Round-off is that of the terms of the sum, not of the (possibly tiny) alkalinity, and of the constants: the exponent of
    KB is a difference of numbers near a thousand, so double precision knows KB itself to 1e-13 only.
    """
    for waters in (ordinary(2000, 50), extreme(2000, 51)):
        h = gridcarb.speciate(**waters, fields=["hydrogen_ion"])["hydrogen_ion"]
        for place in range(0, 2000, 10):
            one = {name: float(values[place]) for name, values in waters.items()}
            twin = Twin(one["temperature"], one["salinity"], one["pressure"], m=FIFTY)
            amounts = [FIFTY.mpf(one[name]) * FIFTY.mpf(10) ** -6 for name in ("dic", "phosphate", "silicate")]
            alkalinity = FIFTY.mpf(one["alkalinity"]) * FIFTY.mpf(10) ** -6
            residual = abs(twin.alkalinity(FIFTY.mpf(float(h[place])), *amounts) - alkalinity)
            hydrogen = FIFTY.mpf(float(h[place]))
            size = abs(alkalinity) + 2 * amounts[0] + 3 * amounts[1] + amounts[2] + twin.BT
            size += hydrogen + twin.K["KW"] / hydrogen
            assert residual <= 1e-13 * size, (float(residual / size), one)
