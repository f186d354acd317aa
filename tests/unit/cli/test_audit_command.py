"""`gridcarb audit` from the command line: exit codes, JSON, and the recipe it writes."""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

import gridcarb.run
from gridcarb.cli.main import main
from gridcarb.errors import InputError, UnitsError
from gridcarb.run.findings import Finding
from gridcarb.run.report import Report, Section


@dataclass
class StandIn:
    """An audit with one finding of the level wanted; remembers what it was asked."""

    worst: str = "fine"
    asked: object = None

    def files(self, names):
        self.asked = list(names)
        return self

    def recipe(self, recipe):
        self.asked = recipe.inputs.files
        return self

    def report(self) -> Report:
        return Report([Section("Found", [("grid", "rectilinear")])], (), {"worst": self.worst})

    def starter(self, path: Path) -> str:
        return f"recipe for {path.name}\n"


@pytest.fixture
def audit(monkeypatch, tmp_path) -> StandIn:
    monkeypatch.chdir(tmp_path)
    found = StandIn()
    monkeypatch.setattr(gridcarb.run, "audit_files", found.files)
    monkeypatch.setattr(gridcarb.run, "audit_recipe", found.recipe)
    return found


def call(*words: str) -> Result:
    return CliRunner().invoke(main, ["audit", *words])


@pytest.mark.parametrize(("worst", "plain", "strict"), [("fine", 0, 0), ("assumed", 0, 9), ("stop", 3, 3)])
def test_the_exit_code_follows_the_worst_finding(audit, worst, plain, strict) -> None:
    audit.worst = worst
    assert call("a.nc").exit_code == plain
    assert call("a.nc", "--strict", "--quiet").exit_code == strict


def test_files_and_json(audit) -> None:
    result = call("a.nc", "b.nc", "--json")
    assert audit.asked == ["a.nc", "b.nc"]
    assert json.loads(result.stdout) == {"worst": "fine"}
    assert call("a.nc").stdout == "\nFound\n  grid  rectilinear\n"
    assert call("a.nc", "--quiet").output == ""


def test_a_recipe_with_other_files(audit, tmp_path) -> None:
    (tmp_path / "demo.yaml").write_text(
        "recipe: 1\ninputs: {files: a.nc}\nchemistry: {fields: [ph_total_scale]}\noutput: {folder: out}\n")
    assert call("demo.yaml").exit_code == 0
    assert audit.asked == ("a.nc",)
    call("demo.yaml", "--input", "b.nc")
    assert audit.asked == (str(tmp_path / "b.nc"),)
    both = call("demo.yaml", "c.nc")
    assert both.exit_code == 2
    assert "a recipe is audited alone" in both.stderr


def test_the_recipe_is_written_once_and_never_over_another(audit, tmp_path) -> None:
    result = call("a.nc", "--recipe-out", "new.yaml")
    assert (tmp_path / "new.yaml").read_text() == "recipe for new.yaml\n"
    assert result.stderr == "a recipe to begin with: new.yaml\n"
    again = call("a.nc", "--recipe-out", "new.yaml")
    assert again.exit_code == 4
    assert "already" in again.stderr
    nowhere = call("a.nc", "--recipe-out", "no/such/new.yaml")
    assert nowhere.exit_code == 4
    assert "cannot be written" in nowhere.stderr


def test_what_else_is_wrong_is_in_the_json(audit, monkeypatch) -> None:
    def fail(names):
        error = InputError("one", where="a.nc", mend="m")
        error.others = (UnitsError("two", where="b.nc"),)
        raise error

    monkeypatch.setattr(gridcarb.run, "audit_files", fail)
    told = json.loads(call("a.nc", "--json").stderr)["error"]
    assert [told["what"], *(other["what"] for other in told["others"])] == ["one", "two"]
    assert told["others"][0]["kind"] == "UnitsError"
    assert call("a.nc").stderr.splitlines() == ["a.nc", "one", "to mend it: m", "and 1 more:", "b.nc", "two"]


def test_without_words() -> None:
    assert call().exit_code == 2


def test_each_finding_says_what_to_do() -> None:
    assert Finding("stop", "files", "two", "a.nc: x", "write this").lines() == ["a.nc: x: two", "to mend it: write this"]
    assert Finding("assumed", "density", "1025", cure="d").lines() == ["1025", "to state it: d"]
    assert Finding("fine", "grid", "rectilinear").lines() == ["rectilinear"]
