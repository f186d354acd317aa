"""The peak of a run is what its plan says, however long the time; runs are processes of their own, on two workers.

The quarter-degree map is a part of the whole: rows are as long and columns as deep, so the blocks are those of the whole.
`python -m tests.benchmarks.memory` measures the whole, with more steps.
"""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import pytest

from tests.benchmarks.memory import ONE_DEGREE, QUARTER_DEGREE, Measured, measured, peak_of, write_zarr

pytestmark = pytest.mark.scale

WORKERS = ("--workers", "2")

SMALL = replace(ONE_DEGREE, levels=10, steps=1, rows=45, columns=90, whole=45, chunk=(10, 45, 90))
EACH_STEP = {"time": 1}
"""The planner makes longer blocks of a longer time until they are as large as may be, with far more cells than a test has
time for. A block a step is the same block for any length of time."""

PART = replace(QUARTER_DEGREE, rows=72)


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("memory")


def run(source: Path, folder: Path, chunks: dict[str, int] | None = None, **sections: object) -> Measured:
    output = {"folder": str(folder / "result"), "replace": True, "netcdf": False, "chunks": chunks}
    return measured(source, folder, *WORKERS, output=output, **sections)


@pytest.fixture(scope="module")
def quarter(folder: Path) -> Measured:
    run(write_zarr(folder / "first.zarr", SMALL), folder)  # which compiles the chemistry, if no run before it has
    return run(write_zarr(folder / "quarter.zarr", PART), folder)


def test_a_quarter_degree_map_of_75_levels_takes_less_than_a_gigabyte(quarter: Measured) -> None:
    assert quarter.blocks >= 4
    assert quarter.projected > 150e6, "blocks are as large as those of the whole map"
    assert quarter.peak < 1e9


def test_the_peak_is_within_what_the_plan_says(quarter: Measured) -> None:
    assert quarter.peak <= quarter.bound


@pytest.mark.usefixtures("quarter")
def test_the_export_holds_no_more_than_a_few_chunks(folder: Path) -> None:
    loading = "import sys, pathlib; from gridcarb.write.netcdf import export; import zarr, numcodecs"
    work = f"{loading}; export(*map(pathlib.Path, sys.argv[1:]))"
    store, target = folder / "result" / "fields.zarr", folder / "fields.nc"
    before = peak_of([sys.executable, "-c", loading])
    assert peak_of([sys.executable, "-c", work, str(store), str(target)]) - before < 100e6
    assert target.stat().st_size > 1e6


def test_ten_times_the_steps_take_the_same_memory(quarter: Measured, folder: Path) -> None:
    # A figure takes more than these blocks, and would hide what they leave behind.
    short, long = (
        run(write_zarr(folder / f"{steps}.zarr", replace(SMALL, steps=steps)), folder, EACH_STEP, figures=[],
            engine={"block": EACH_STEP})
        for steps in (4, 40)
    )
    assert (short.blocks, long.blocks) == (4, 40)
    assert long.peak <= 1.1 * short.peak
    assert long.peak <= long.bound
