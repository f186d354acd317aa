"""Bottles of a coastal cruise: what is computed from measured DIC and alkalinity against what was measured beside it.

Source: Feely et al. 2015, doi 10.3334/CDIAC/OTG.COAST_WCOA2013. pH was measured on the total scale at 25 degC and 0 dbar;
carbonate ion too. Differences carry the errors of four measurements, organic alkalinity near rivers, and the constants.
Surveys of the open ocean close to about 0.01 in pH. Run with `-s` to see the tables.
"""

from __future__ import annotations

import csv
from collections.abc import Mapping
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest

from gridcarb import speciate

Column = npt.NDArray[np.float64]
BANDS = ((0.0, 15.0), (15.0, 25.0), (25.0, 30.0), (30.0, 32.0), (32.0, 33.0), (33.0, 34.0), (34.0, 36.0))


@pytest.fixture(scope="module")
def bottles(data: Path) -> dict[str, Column]:
    """Columns by name; NaN where missing (-999) or not flagged good (2)."""
    lines = (data / "bottles_coast_2013.csv").read_text(encoding="latin-1").splitlines()
    start = next(number for number, line in enumerate(lines) if line.startswith("EXPOCODE,"))
    assert lines[start - 1].count("UMOL/KG") > 5, "the units stand above the names"
    rows = [row for row in csv.DictReader(lines[start:]) if (row["CTDPRS"] or "").strip()]
    found = {}
    for name, flag in (("CTDSAL", "CTDSAL_FLAG_W"), ("SILCAT", "SILCAT_FLAG_W"), ("PHSPHT", "PHSPHT_FLAG_W"),
                       ("TCARBN", "TCARBN_FLAG_W"), ("ALKALI", "ALKALI_FLAG_W"), ("PH_TOT", "PH_TOT_FLAG_W"),
                       ("CO32", "CO32__FLAG_W"), ("PH_TMP", None)):
        values = np.array([float(row[name]) for row in rows])
        good = values > -900
        if flag:
            good &= np.array([row[flag] == "2" for row in rows])
        found[name] = np.where(good, values, np.nan)
    return found


@pytest.fixture(scope="module")
def computed(bottles: Mapping[str, Column]) -> dict[str, Column]:
    return speciate(
        temperature=25.0, salinity=bottles["CTDSAL"], pressure=0.0, dic=bottles["TCARBN"], alkalinity=bottles["ALKALI"],
        phosphate=bottles["PHSPHT"], silicate=bottles["SILCAT"], fields=["ph_total_scale", "carbonate_ion"],
    )


def _spread(values: Column) -> float:
    """Half the width of the middle 68 %."""
    low, high = np.nanpercentile(values, [16, 84])
    return float(high - low) / 2


def _table(title: str, difference: Column, salinity: Column) -> None:
    print(f"\n{title}\n{'salinity':>10} {'count':>6} {'median':>9} {'16 %':>9} {'84 %':>9}")
    for low, high in (*BANDS, (30.0, 36.0), (0.0, 36.0)):
        part = difference[(salinity > low) & (salinity <= high) & np.isfinite(difference)]
        if part.size:
            ends = "".join(f"{value:10.4f}" for value in np.percentile(part, [50, 16, 84]))
            print(f"{low:4.0f} -{high:4.0f} {part.size:6d}{ends}")


def test_ph_of_salt_water_closes(bottles: Mapping[str, Column], computed: Mapping[str, Column]) -> None:
    difference = computed["ph_total_scale"] - bottles["PH_TOT"]
    assert set(bottles["PH_TMP"][np.isfinite(difference)]) == {25.0}
    _table("pH (total scale, 25 degC): computed minus measured", difference, bottles["CTDSAL"])
    salt = difference[bottles["CTDSAL"] > 30]
    assert np.isfinite(salt).sum() > 400
    assert abs(np.nanmedian(salt)) < 0.02
    assert _spread(salt) < 0.03


def test_ph_follows_the_measured_over_its_range(bottles: Mapping[str, Column], computed: Mapping[str, Column]) -> None:
    both = np.isfinite(computed["ph_total_scale"]) & np.isfinite(bottles["PH_TOT"]) & (bottles["CTDSAL"] > 30)
    ours, theirs = computed["ph_total_scale"][both], bottles["PH_TOT"][both]
    assert np.ptp(theirs) > 0.7
    slope = np.polyfit(theirs, ours, 1)[0]
    assert slope == pytest.approx(1.0, abs=0.06)


def test_carbonate_ion_of_salt_water(bottles: Mapping[str, Column], computed: Mapping[str, Column]) -> None:
    difference = computed["carbonate_ion"] - bottles["CO32"]
    _table("carbonate ion (umol/kg, 25 degC): computed minus measured", difference, bottles["CTDSAL"])
    salt = (bottles["CTDSAL"] > 30) & np.isfinite(difference)
    assert salt.sum() > 100
    relative = difference[salt] / bottles["CO32"][salt]
    assert abs(np.median(relative)) < 0.05
    assert _spread(relative) < 0.06
