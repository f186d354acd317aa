"""Compiled code is found on disk again by another process, and never that of another program."""

from __future__ import annotations

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
