"""The commands, against a stand-in run: words, exit codes, JSON, and what reaches the recipe."""

from __future__ import annotations

import json
import subprocess
import sys
from dataclasses import dataclass, field

import pytest
from click.testing import CliRunner, Result

import gridcarb.run
from gridcarb.cli.main import main
from gridcarb.errors import (
    BlockError,
    BudgetError,
    GridcarbError,
    InputError,
    Notice,
    OutputError,
    RecipeError,
    UnitsError,
    UnknownWordError,
)
from gridcarb.fields import FIELDS
from gridcarb.recipe import reference

RECIPE = "recipe: 1\ninputs: {files: a.nc}\nchemistry: {fields: [ph_total_scale]}\noutput: {folder: out}\n"


@dataclass(frozen=True)
class Section:
    title: str
    rows: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Report:
    sections: tuple[Section, ...]
    notices: tuple[Notice, ...] = ()

    def as_dict(self) -> dict[str, object]:
        return {section.title: dict(section.rows) for section in self.sections}


@dataclass
class Stage:
    """A stand-in for `gridcarb.run`: remembers the recipe, walks three blocks, may fail."""

    failure: BaseException | None = None
    recipes: list = field(default_factory=list)
    stopped: int = 0

    def prepare(self, recipe):
        self.recipes.append(recipe)
        return self

    def report(self):
        notice = Notice("density", "one density of 1025 kg m-3 was taken", "reading: {density: 1025 kg m-3}")
        rows = (("temperature", "thetao in a.nc"), ("dic", "dissic in a.nc"))
        return Report((Section("What will be read", rows),), (notice,))

    def conduct(self, plan, watcher, manner):
        assert plan is self
        watcher.start(4, 400)
        for _ in range(4):
            watcher.block_done(100)
            if self.failure:
                raise self.failure
        return self

    def summary(self):
        return Report((Section("Result", (("store", "out/fields.zarr"),)),))


@pytest.fixture
def stage(monkeypatch, tmp_path):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "demo.yaml").write_text(RECIPE)
    found = Stage()
    monkeypatch.setattr(gridcarb.run, "prepare", found.prepare, raising=False)
    monkeypatch.setattr(gridcarb.run, "conduct", found.conduct, raising=False)
    return found


def call(*words: str) -> Result:
    return CliRunner().invoke(main, list(words))


def test_run_tells_progress_on_stderr_and_the_summary_on_stdout(stage):
    result = call("run", "demo.yaml")
    assert result.exit_code == 0
    assert result.stdout == "\nResult\n  store  out/fields.zarr\n"
    lines = result.stderr.splitlines()
    assert lines[0] == "4 blocks, 400 cells"
    assert [line.split("  ")[0].strip() for line in lines[1:]] == ["25 %", "50 %", "75 %", "100 %"]


def test_plan_shows_sections_and_notices(stage):
    result = call("plan", "demo.yaml")
    assert result.exit_code == 0
    assert "What will be read\n  temperature  thetao in a.nc\n  dic          dissic in a.nc\n" in result.stdout
    assert "  - one density of 1025 kg m-3 was taken\n" in result.stdout
    assert "to state it: reading: {density: 1025 kg m-3}\n" in result.stdout
    assert result.stderr == ""


@pytest.mark.parametrize("command", ["run", "plan"])
def test_quiet_says_nothing_when_all_is_well(stage, command):
    result = call(command, "demo.yaml", "--quiet")
    assert (result.exit_code, result.stdout, result.stderr) == (0, "", "")


@pytest.mark.parametrize(("command", "content"), [
    ("run", {"Result": {"store": "out/fields.zarr"}}),
    ("plan", {"What will be read": {"temperature": "thetao in a.nc", "dic": "dissic in a.nc"}}),
])
def test_json_is_one_document(stage, command, content):
    result = call(command, "demo.yaml", "--json")
    assert json.loads(result.stdout) == content
    assert result.stderr == ""


def test_what_is_said_on_the_command_line_reaches_the_recipe(stage, tmp_path):
    words = ["--input", "b.nc", "--input", "c*.nc", "--result", "there", "--replace", "--workers", "2", "--memory", "1 GB"]
    assert call("plan", "demo.yaml", *words).exit_code == 0
    (recipe,) = stage.recipes
    assert recipe.inputs.files == (str(tmp_path / "b.nc"), str(tmp_path / "c*.nc"))
    assert recipe.output_folder() == tmp_path / "there"
    assert (recipe.output.replace, recipe.engine.workers, recipe.engine.memory) == (True, 2, "1 GB")


@pytest.mark.parametrize(("family", "code"), [
    (GridcarbError, 1), (UnknownWordError, 2), (RecipeError, 2), (UnitsError, 3), (InputError, 3), (OutputError, 4),
    (BudgetError, 5), (BlockError, 6),
])
def test_errors_are_plain_lines_and_a_code(stage, family, code):
    stage.failure = family("the water is too salty", where="a.nc: so", mend="write `reading: ...`")
    result = call("run", "demo.yaml", "--quiet")
    assert result.exit_code == code
    assert result.stdout == ""
    assert "the water is too salty" in result.stderr
    assert "Traceback" not in result.stderr
    assert f"\n    {code}    " in call("--help").stdout


def test_an_error_is_where_what_and_how(stage):
    stage.failure = InputError("the water is too salty", where="a.nc: so", mend="write `reading: ...`")
    result = call("run", "demo.yaml", "--quiet")
    assert result.stderr.splitlines() == ["a.nc: so", "the water is too salty", "to mend it: write `reading: ...`"]


def test_errors_as_json(stage, tmp_path):
    stage.failure = InputError("too salty", where="a.nc: so", mend="rinse")
    result = call("run", "demo.yaml", "--json")
    assert (result.exit_code, result.stdout) == (3, "")
    assert json.loads(result.stderr) == {
        "error": {"kind": "InputError", "where": "a.nc: so", "what": "too salty", "mend": "rinse", "exit_code": 3},
    }
    (tmp_path / "demo.yaml").write_text("recipe: 1\ntitel: x\n")
    result = call("plan", "demo.yaml", "--json")
    faults = json.loads(result.stderr)["error"]["faults"]
    what, mend = "there is no key 'titel' in a recipe", "did you mean 'title'?"
    assert {"line": 2, "key": "titel", "what": what, "mend": mend} in faults


def test_all_faults_of_a_recipe_are_printed(stage, tmp_path):
    (tmp_path / "demo.yaml").write_text(RECIPE.replace("ph_total_scale", "ph_totl") + "engine: {workers: 0}\n")
    result = call("run", "demo.yaml")
    assert result.exit_code == 2
    assert "demo.yaml:3: chemistry.fields[0]" in result.stderr
    assert "demo.yaml:5: engine.workers" in result.stderr
    assert not stage.recipes


def test_ctrl_c(stage):
    stage.failure = KeyboardInterrupt()
    result = call("run", "demo.yaml", "--quiet")
    assert result.exit_code == 130
    assert result.stderr == "stopped by Ctrl-C; only a complete result bears its final name\n"


@pytest.mark.parametrize("words", [["run", "demo.yaml", "--debug"], ["--debug", "run", "demo.yaml"]])
def test_what_nobody_foresaw(stage, words):
    stage.failure = ZeroDivisionError("division by zero")
    plain = call("run", "demo.yaml", "--quiet")
    assert plain.exit_code == 1
    assert "ZeroDivisionError: division by zero" in plain.stderr
    assert "--debug" in plain.stderr
    assert "Traceback" not in plain.stderr
    assert "Traceback" in call(*words).stderr


def test_a_missing_recipe(stage):
    result = call("run", "dem.yaml")
    assert result.exit_code == 2
    assert "did you mean 'demo.yaml'?" in result.stderr


def test_fields_lists_the_whole_catalogue():
    shown = call("fields").stdout
    listed = [line.split()[0] for line in shown.splitlines() if line.startswith("  ")]
    assert set(FIELDS) <= set(listed)
    assert [entry["key"] for entry in json.loads(call("fields", "--json").stdout)] == list(FIELDS)


@pytest.mark.parametrize("key", list(FIELDS))
def test_each_field_is_told_in_full(key):
    shown = " ".join(call("fields", key).stdout.split())
    assert FIELDS[key].long_name in shown
    record = json.loads(call("fields", key, "--json").stdout)
    assert record["units"] == FIELDS[key].units
    assert len(record["references"]) == len(FIELDS[key].citations)


def test_an_unknown_field_is_met_with_a_suggestion():
    result = call("fields", "ph_totl_scale")
    assert result.exit_code == 2
    assert "did you mean 'ph_total_scale'" in result.stderr


def test_keys_lists_every_key_of_a_recipe():
    assert json.loads(call("keys", "--json").stdout) == [row.__dict__ for row in reference()]
    shown = call("keys", "output").stdout
    assert "output.folder  text, must be given" in shown
    assert "output.zarr_format  2 | 3, default 3" in shown
    assert "inputs" not in shown
    assert "figures[map].depth" in call("keys", "figures").stdout
    result = call("keys", "ouput")
    assert (result.exit_code, "'output'" in result.stderr) == (2, True)


@pytest.mark.parametrize("words", [["run"], ["run", "demo.yaml", "--workers", "many"], ["swim"]])
def test_a_wrong_command_line_ends_with_two(words):
    assert call(*words).exit_code == 2


def test_help_and_version():
    for words in (["--help"], ["run", "--help"], ["plan", "-h"], ["fields", "--help"], ["keys", "--help"], ["--version"]):
        assert call(*words).exit_code == 0
    told = call("--help").stdout
    assert "gridcarb run recipes/first_look.yaml" in told
    assert "9    audit --strict" in told
    assert "130  stopped by Ctrl-C" in told
    assert "143  stopped by SIGTERM" in told


def test_the_command_is_light_to_import():
    heavy = ["numpy", "numba", "xarray", "dask", "netCDF4", "zarr", "gsw", "matplotlib", "pydantic", "rich", "ruamel.yaml"]
    code = "import sys, gridcarb.cli.main; print([name for name in sys.argv[1:] if name in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code, *heavy], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
