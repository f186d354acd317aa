"""The benchmark itself, small: that both sides compute the same and the report comes out. Times are not judged here."""

from __future__ import annotations

import sys

import numpy as np
import pytest

from gridcarb import speciate
from tests.benchmarks import chemistry_speed, whole_array


def test_the_script_computes_the_same_chemistry() -> None:
    given = chemistry_speed.waters(5000)
    expected = whole_array.speciate(**given)
    for key, value in speciate(**given, fields=chemistry_speed.FIELDS).items():
        np.testing.assert_allclose(value, expected[key], rtol=1e-9)


def test_the_report_tells_speeds_and_ratios(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "argv", ["chemistry_speed", "20000"])
    chemistry_speed.main()
    told = capsys.readouterr().out
    assert "million cells/s" in told
    assert "ratio" in told
    assert "two threads over one" in told
