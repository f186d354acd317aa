"""Published check values, read from the shared table beside the checkout; the source stands beside each.

Entries marked `from_memory` there say so in the name of their test: the print itself was not at hand.
"""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import gsw
import numpy as np
import pytest

from gridcarb.chemistry import FORMULAS
from gridcarb.chemistry.formulas.pressure import MILLERO1995, ln_pressure_factor
from gridcarb.compiling import plain
from tests.unit.chemistry.test_declarations import columns_at

TABLE = Path(__file__).parents[2].parent / "shared" / "data" / "published_checks.json"
LN10 = math.log(10.0)

FORMULA_OF = {
    "lnK0": ("ln_k0_weiss1974", 1.0), "lnKS": ("ln_ks_dickson1990", 1.0), "lnKF_PF_total": ("ln_kf_perez1987", 1.0),
    "lnKB": ("ln_kb_dickson1990", 1.0), "log10K1_lueker": ("ln_k1_lueker2000", 1 / LN10),
    "log10K2_lueker": ("ln_k2_lueker2000", 1 / LN10), "lnKW_guide": ("ln_kw_millero1995", 1.0),
    "lnKP1_guide": ("ln_kp1_millero1995", 1.0), "lnKP2_guide": ("ln_kp2_millero1995", 1.0),
    "lnKP3_guide": ("ln_kp3_millero1995", 1.0), "lnKSi_guide": ("ln_ksi_millero1995", 1.0),
    "BT_uppstrom": ("boron_uppstrom1974", 1.0), "ST": ("sulfate_morris1966", 1.0), "FT": ("fluoride_riley1965", 1.0),
    "CaT": ("calcium_riley1967", 1.0), "log10KspC": ("ln_k_calcite_mucci1983", 1 / LN10),
    "log10KspA": ("ln_k_aragonite_mucci1983", 1 / LN10),
    "B_to_S_mgkg_lee2010": ("boron_lee2010", 10.811 * 1e3 / 35),
    "B_to_Cl_mgkg_lee2010": ("boron_lee2010", 10.811 * 1e3 * 1.80655 / 35),
    "B_to_Cl_mgkg_uppstrom": ("boron_uppstrom1974", 10.811 * 1e3 * 1.80655 / 35),
}
"""Quantity of the table -> our formula and the factor to the table's form."""

PRESSURE_RATIOS = {"Kratio_K1": "k1", "Kratio_K2": "k2", "Kratio_KB": "kb"}

NOT_IN_THESE_SETS = {
    "lnKF_DR_total", "lnK1_roy_total", "lnK2_roy_total", "pK1_millero2006_sws", "pK2_millero2006_sws", "pK1_caiwang_nbs",
    "pK2_caiwang_nbs", "pK1_dm87_as_nbs", "pK2_dm87_as_nbs", "pK1_millero2010_sws", "pK2_millero2010_sws",
    "O2_umolkg_t68", "O2_umolkg", "O2_ml_per_l", "O2_mmol_m3", "N2_umolkg", "Ar_umolkg", "Ne_nmolkg", "rho_EOS80",
}
"""Constants of other sets and gases that are not computed yet."""


def entries(*quantities: str) -> list[Any]:
    if not TABLE.exists():
        return [pytest.param(None, marks=pytest.mark.skip(f"the shared table {TABLE.name} is not beside the checkout"))]
    table = json.loads(TABLE.read_text())
    return [pytest.param(row, id=name_of(row)) for row in table if row["quantity"] in quantities]


def name_of(row: dict[str, Any]) -> str:
    return f"{row['quantity']}-{row['t_degC']}-{row['p_dbar']}{'-from-memory' if row['from_memory'] else ''}"


def ours(key: str, row: dict[str, Any]) -> float:
    formula = FORMULAS[key]
    columns = columns_at(row["t_degC"], row["S"])
    return float(formula.cell(*(columns[name] for name in formula.columns)))


@pytest.mark.parametrize("row", entries(*FORMULA_OF))
def test_constant_or_total(row: dict[str, Any]) -> None:
    key, factor = FORMULA_OF[row["quantity"]]
    value = ours(key, row) * factor
    assert abs(value - row["value"]) <= row["half_unit"] * 1.0000001, (value, row["source"])


@pytest.mark.parametrize("row", entries(*PRESSURE_RATIOS))
def test_effect_of_pressure_against_measurements(row: dict[str, Any]) -> None:
    volumes = MILLERO1995[PRESSURE_RATIOS[row["quantity"]]]
    factor = plain(ln_pressure_factor)
    given = (volumes.a0, volumes.a1, volumes.a2, volumes.b0, volumes.b1)
    ratio = math.exp(factor(row["t_degC"], row["p_dbar"] / 10, row["t_degC"] + 273.15, *given))
    assert abs(ratio - row["value"]) <= row["half_unit"], row["source"]


@pytest.mark.parametrize("row", entries("CO2_F_over_K0fug"))
def test_solubility_and_fugacity_agree_with_the_combined_function(row: dict[str, Any]) -> None:
    """Weiss & Price 1980 (coefficients from memory): F = K0 x fugacity coefficient x (1 - pH2O)."""
    tk, s = row["t_degC"] + 273.15, row["S"]
    hundredth = tk / 100
    combined = math.exp(
        -162.8301 + 218.2968 / hundredth + 90.9241 * math.log(hundredth) - 1.47696 * hundredth**2
        + s * (0.025695 - 0.025225 * hundredth + 0.0049867 * hundredth**2)
    )
    vapour = math.exp(24.4543 - 67.4509 / hundredth - 4.8489 * math.log(hundredth) - 0.000544 * s)
    separate = math.exp(ours("ln_k0_weiss1974", row) + ours("ln_fugacity_coefficient_weiss1974", row)) * (1 - vapour)
    assert abs(combined / separate - row["value"]) <= row["half_unit"]


@pytest.mark.parametrize("row", entries("rho_SA_CT", "rho_SA_t"))
def test_the_library_that_gives_our_densities(row: dict[str, Any]) -> None:
    """Densities of the TEOS-10 function pages; in-situ densities of cells come from gsw."""
    given = (row["S"], row["t_degC"], row["p_dbar"])
    value = gsw.rho(*given) if row["quantity"] == "rho_SA_CT" else gsw.rho_t_exact(*given)
    np.testing.assert_allclose(value, row["value"], rtol=0, atol=row["half_unit"])


@pytest.mark.skipif(not TABLE.exists(), reason="the shared table is not beside the checkout")
def test_every_entry_of_the_table_is_used_or_named_as_not_ours() -> None:
    known = {*FORMULA_OF, *PRESSURE_RATIOS, *NOT_IN_THESE_SETS, "CO2_F_over_K0fug", "rho_SA_CT", "rho_SA_t"}
    assert {row["quantity"] for row in json.loads(TABLE.read_text())} == known
