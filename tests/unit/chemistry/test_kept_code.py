"""Compiled code is found on disk again by another process, and never that of another program."""

from __future__ import annotations

import os
import subprocess
import sys

import numba
import pytest

from gridcarb.chemistry.program import program

SELECTIONS = (("ph_total_scale",), ("aragonite_saturation",))

LOOK = """
from gridcarb.chemistry.program import program
for keys in {selections!r}:
    stats = program("guide2007", keys)[1].stats
    assert sum(stats.cache_hits.values()) == 1, (keys, stats)
    assert not stats.cache_misses, (keys, stats)
"""


@pytest.mark.skipif(bool(numba.config.DISABLE_JIT), reason="nothing is compiled")
def test_another_process_compiles_nothing_again() -> None:
    for keys in SELECTIONS:
        program("guide2007", keys)
    command = [sys.executable, "-c", LOOK.format(selections=SELECTIONS)]
    found = subprocess.run(command, check=False, capture_output=True, text=True)
    assert found.returncode == 0, found.stderr


@pytest.mark.skipif(bool(numba.config.DISABLE_JIT), reason="nothing is compiled")
def test_programs_have_names_of_their_own() -> None:
    functions = [program(constants, keys)[1].py_func for constants in ("guide2007",) for keys in SELECTIONS]
    assert len({function.__name__ for function in functions}) == len({function.__qualname__ for function in functions}) == 2


BITS = """
import hashlib
import numpy as np
from gridcarb import speciate
draw = np.random.default_rng(3).uniform
water = {"temperature": draw(0, 30, 999), "salinity": draw(5, 40, 999), "pressure": draw(0, 5000, 999)}
found = speciate(**water, dic=draw(1500, 2400, 999), alkalinity=draw(1600, 2600, 999), fields=["ph_total_scale"])
print(hashlib.sha256(found["ph_total_scale"].tobytes()).hexdigest())
"""


@pytest.mark.scale
@pytest.mark.skipif(bool(numba.config.DISABLE_JIT), reason="nothing is compiled")
def test_code_from_disk_gives_the_bits_of_code_compiled_just_now(tmp_path) -> None:
    environment = {**os.environ, "XDG_CACHE_HOME": str(tmp_path)}
    told = [subprocess.run([sys.executable, "-c", BITS], check=True, capture_output=True, text=True, env=environment).stdout
            for _ in range(2)]  # fmt: skip
    assert any(tmp_path.rglob("passage.cells_of*"))
    assert told[0] == told[1]
