"""`gridcarb plan --rehearse`, against a stand-in: how many blocks are asked for, words, JSON, progress and errors."""

from __future__ import annotations

import json
from types import SimpleNamespace

import pytest
from click.testing import CliRunner, Result

import gridcarb.run
import gridcarb.run.rehearsal
from gridcarb.cli.main import main
from gridcarb.errors import BlockError, GridcarbError
from gridcarb.run.report import Report, Section

RECIPE = "recipe: 1\ninputs: {files: a.nc}\nchemistry: {fields: [ph_total_scale]}\noutput: {folder: out}\n"


class Stage:
    """Remembers for how many blocks it was asked; may fail."""

    def __init__(self) -> None:
        self.asked: list[int] = []
        self.failure: GridcarbError | None = None

    def prepare(self, recipe):
        return SimpleNamespace(report=lambda: Report([Section("Plan", [("blocks", "6")])], (), {"blocks": 6}))

    def rehearse(self, plan, watcher, blocks):
        self.asked.append(blocks)
        watcher.start(blocks, 100)
        if self.failure:
            raise self.failure
        report = Report([Section("What it will cost", [("core-hours", "12")])], (), {"cost": 12})
        return SimpleNamespace(report=lambda: report)


@pytest.fixture
def stage(monkeypatch, tmp_path) -> Stage:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "demo.yaml").write_text(RECIPE)
    found = Stage()
    monkeypatch.setattr(gridcarb.run, "prepare", found.prepare)
    monkeypatch.setattr(gridcarb.run.rehearsal, "rehearse", found.rehearse)
    return found


def call(*words: str) -> Result:
    return CliRunner().invoke(main, ["plan", *words])


@pytest.mark.parametrize(("words", "asked"), [
    (["demo.yaml"], []), (["demo.yaml", "--rehearse"], [3]), (["demo.yaml", "--rehearse", "7"], [7]),
    (["--rehearse", "2", "demo.yaml"], [2]), (["demo.yaml", "--rehearse", "--workers", "2"], [3]),
])
def test_as_many_blocks_as_asked_for(stage, words: list[str], asked: list[int]) -> None:
    assert call(*words).exit_code == 0
    assert stage.asked == asked


def test_costs_on_stdout_and_progress_on_stderr(stage) -> None:
    result = call("demo.yaml", "--rehearse")
    assert result.stdout == "\nWhat it will cost\n  core-hours  12\n"
    assert result.stderr == "3 blocks, 100 cells\n"
    assert (call("demo.yaml", "--rehearse", "--quiet").output) == ""


def test_json_is_one_document_and_nothing_else(stage) -> None:
    result = call("demo.yaml", "--rehearse", "--json")
    assert json.loads(result.output) == {"cost": 12}


def test_errors_end_in_their_code(stage) -> None:
    stage.failure = BlockError("a block could not be done", mend="mend it")
    result = call("demo.yaml", "--rehearse", "--quiet")
    assert (result.exit_code, result.stdout) == (6, "")
    assert result.stderr == "a block could not be done\nto mend it: mend it\n"


@pytest.mark.parametrize("words", [["demo.yaml", "--rehearse", "0"], ["--rehearse", "demo.yaml"]])
def test_no_number_of_blocks(stage, words: list[str]) -> None:
    assert call(*words).exit_code == 2
