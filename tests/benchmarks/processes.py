"""How much faster two processes do the blocks than one.

    python -m tests.benchmarks.processes [STEPS]

One and two processes do the same run, turn and turn about, of the invented ocean on a 1 degree grid with 30 levels, eight
fields. Only the time of the blocks counts, from the moment the processes are ready; medians are told. It needs two idle
cores.
"""

from __future__ import annotations

import shutil
import statistics
import sys
import tempfile
import time
from pathlib import Path

from gridcarb.recipe import check
from gridcarb.run import conduct, prepare
from synthetic_grids.clothes import Clothes
from tests.benchmarks.end_to_end import FIELDS, ocean

ROUNDS = 3


class Stopwatch:
    """A watcher that takes the time from the first block given out to the last one done."""

    seconds = 0.0

    def start(self, total_blocks: int, cells: int) -> None:
        self._begun = time.perf_counter()

    def block_done(self, cells: int, note: str = "") -> None:
        self.seconds = time.perf_counter() - self._begun

    def block_failed(self, note: str) -> None:
        raise AssertionError(note)

    def strength(self, workers: int, resident: int) -> None: ...
    def message(self, text: str) -> None: ...
    def stop(self) -> None: ...


def seconds_of_blocks(source: Path, folder: Path, workers: int) -> float:
    """Seconds of the blocks on so many processes."""
    recipe = check(f"""
recipe: 1
inputs: {{files: {source}}}
reading: {{temperature: in situ, salinity: practical}}
chemistry: {{fields: [{", ".join(FIELDS)}]}}
output: {{folder: {folder / "result"}, netcdf: false}}
engine: {{kind: processes, workers: {workers}}}
""")
    watch = Stopwatch()
    conduct(prepare(recipe), watch)
    shutil.rmtree(folder / "result")
    return watch.seconds


def main() -> None:
    """Print seconds and the ratio."""
    steps = int(sys.argv[1]) if len(sys.argv) > 1 else 24
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        clothes = Clothes(temperature="in situ", salinity="practical", tracer_units="umol kg-1")
        source = ocean(folder, steps, "zarr", clothes)
        pairs = [tuple(seconds_of_blocks(source, folder, workers) for workers in (1, 2)) for _ in range(ROUNDS)]
    one, two = (statistics.median(column) for column in zip(*pairs, strict=True))
    print(f"one process {one:.2f} s, two processes {two:.2f} s: ratio {one / two:.2f}")


if __name__ == "__main__":  # the processes import this file, and must not begin a benchmark of their own
    main()
