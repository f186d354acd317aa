"""The ensemble benchmark, small: its store can be read, its table adds up, and so does the one in the README."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from tests.benchmarks import ensemble

SPAN = {"likely": 2e6, "lowest": 1e6, "highest": 4e6}
TOLD = {
    "grid": {"sizes": {"time": 1800, "lev": 75, "lat": 1080, "lon": 1440}},
    "cost": {
        "blocks": [5, 9], "wet_share": 0.625, "busy_share": 0.875, "cells_per_second": SPAN,
        "shares": {"read": 0.25, "solve": 0.75},
        "core_hours": {"likely": 1800 * 75 * 1080 * 1440 / 2e6 / 3600}, "bytes_in": 1.5e12, "files": 12_345_678,
        "store_bytes": {"likely": 2.25e12}, "netcdf_bytes": {"likely": 3e12}, "netcdf_hours": {"likely": 42.0},
    },
}  # fmt: skip


def numbers(table: str) -> dict[str, list[float]]:
    """First cell of each row -> the numbers in the others; bytes without their prefix."""
    sizes = {"TB": 1e12, "GB": 1e9, "MB": 1e6}
    found = {}
    for line in table.splitlines():
        name, *cells = (cell.strip() for cell in line.strip("|").split("|"))
        if len(cells) == 2 and cells[0][:1].isdigit():
            parts = [cell.replace(",", "").partition(" ") for cell in cells]
            found[name] = [float(number) * sizes.get(unit, 1) for number, _, unit in parts]
    return found


def check(table: str) -> None:
    """Core-hours are cells by rate, hours are core-hours by cores, the ensemble is ten members; to three figures."""
    rate = float(re.search(r"\| ([\d.]+) million cells/s", table).group(1)) * 1e6
    rows = numbers(table)
    assert len(rows) == 11
    for name, (member, ensemble_of_ten) in rows.items():
        assert ensemble_of_ten == pytest.approx(10 * member, rel=0.01), name
    cells, hours = rows["cells"][0], rows["core-hours"][0]
    assert cells == pytest.approx(1800 * 75 * 1080 * 1440, rel=0.005)
    assert hours == pytest.approx(cells / rate / 3600, rel=0.01)
    for cores in ensemble.CORES:
        assert rows[f"hours on {cores} cores"][0] == pytest.approx(hours / cores, rel=0.01)


def test_the_table_adds_up() -> None:
    table = ensemble.table(TOLD)
    check(table)
    assert "| cells | 2.10e11 | 2.10e12 |" in table
    assert "| core-hours of that copy | 42 | 420 |" in table
    assert "| files out | 1.23e7 | 1.23e8 |" in table
    assert "| core-hours | 29,200 | 292,000 |" in ensemble.table(TOLD | {"cost": TOLD["cost"] | {
        "core_hours": {"likely": 29_160.0}}})
    assert "| bytes out, compressed | 2.25 TB | 22.5 TB |" in table
    assert table.split("\n\n")[1].splitlines() == [
        "Measured on 2 blocks; 62% of their cells were water.", "Spent on read 25%, solve 75%;",
        "the core computed for 88% of the time, else it waited."]  # fmt: skip


def test_the_table_of_the_readme_adds_up() -> None:
    check(ensemble.README.read_text().split(ensemble.START)[1].split(ensemble.END)[0])


def test_the_store_has_all_months_and_the_bytes_of_one(tmp_path: Path) -> None:
    store = ensemble.ocean(tmp_path, rows=135, columns=180, years=(1950, 1951))
    with xr.open_zarr(store, consolidated=False, chunks=None) as found:
        assert dict(found["dissic"].sizes) == {"time": 24, "lev": 75, "lat": 135, "lon": 180}
        first, last = found["dissic"].isel(time=0), found["dissic"].isel(time=-1)
        assert 0.3 < float(np.isfinite(first).mean()) < 0.8
        np.testing.assert_array_equal(first, last)
    chunks = [path for path in (store / "dissic" / "c").iterdir() if not path.is_symlink()]
    assert len(chunks) == 1
