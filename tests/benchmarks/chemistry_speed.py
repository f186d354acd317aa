"""Speed of the chemistry against a whole-array NumPy script, side by side in one run.

    python -m tests.benchmarks.chemistry_speed [CELLS]

Prints cells per second, nanoseconds per cell and the ratio on one core, then two threads over one. The two sides take
turns, so that a machine whose speed drifts treats both alike; medians are told. Compile time is told apart.
"""

from __future__ import annotations

import statistics
import sys
import threading
import time
from collections.abc import Callable

import numpy as np

from gridcarb import speciate
from tests.benchmarks import whole_array

FIELDS = (
    "ph_total_scale", "aqueous_co2", "bicarbonate_ion", "carbonate_ion", "co2_fugacity", "calcite_saturation",
    "aragonite_saturation",
)  # fmt: skip
ROUNDS = 7


def waters(cells: int) -> dict[str, np.ndarray]:
    """Ocean water of all depths: what a model's grid holds."""
    rng = np.random.default_rng(1)
    return {
        "temperature": rng.uniform(-1.8, 30, cells), "salinity": rng.uniform(30, 38, cells),
        "pressure": rng.uniform(0, 5500, cells), "dic": rng.uniform(1900, 2350, cells),
        "alkalinity": rng.uniform(2200, 2450, cells), "phosphate": rng.uniform(0, 3, cells),
        "silicate": rng.uniform(0, 150, cells),
    }  # fmt: skip


def seconds(work: Callable[[], object]) -> float:
    begun = time.perf_counter()
    work()
    return time.perf_counter() - begun


def against_the_script(cells: int) -> tuple[list[float], list[float]]:
    """Seconds of the script and of gridcarb, in pairs."""
    given = waters(cells)
    pairs = [
        (seconds(lambda: whole_array.speciate(**given)), seconds(lambda: speciate(**given, fields=FIELDS)))
        for _ in range(ROUNDS)
    ]
    return [script for script, _ in pairs], [ours for _, ours in pairs]


def threads_over_one(cells: int) -> list[float]:
    """Speed-up of two threads, each with its own half of the work, over one thread with all of it."""
    given = waters(cells)
    parts = (slice(0, cells // 2), slice(cells // 2, None))
    halves = [{name: values[part] for name, values in given.items()} for part in parts]

    def in_threads() -> None:
        threads = [threading.Thread(target=speciate, kwargs={**half, "fields": FIELDS}) for half in halves]
        for thread in threads:
            thread.start()
        for thread in threads:
            thread.join()

    def alone() -> None:
        for half in halves:
            speciate(**half, fields=FIELDS)

    return [seconds(alone) / seconds(in_threads) for _ in range(ROUNDS)]


def main() -> None:
    """Measure and print."""
    cells = int(sys.argv[1]) if len(sys.argv) > 1 else 2_000_000
    compiling = seconds(lambda: speciate(**waters(10), fields=FIELDS))
    check = waters(1000)
    expected = whole_array.speciate(**check)
    for key, value in speciate(**check, fields=FIELDS).items():
        np.testing.assert_allclose(value, expected[key], rtol=1e-9)
    script, ours = against_the_script(cells)
    ratios = [one / other for one, other in zip(script, ours, strict=True)]
    print(f"{cells:,} cells, {len(FIELDS)} fields, medians of {ROUNDS} turns")
    print(f"first call (compiling, or loading compiled code): {compiling:.2f} s")
    for name, times in (("whole-array NumPy script", script), ("gridcarb, one core", ours)):
        typical = statistics.median(times)
        print(f"{name:26s} {cells / typical / 1e6:7.2f} million cells/s   {typical / cells * 1e9:7.1f} ns a cell")
    spread = f"lowest {min(ratios):.1f}, highest {max(ratios):.1f}"
    print(f"ratio                      {statistics.median(ratios):7.1f}   ({spread})")
    print(f"two threads over one       {statistics.median(threads_over_one(cells)):7.2f}")


if __name__ == "__main__":
    main()
