"""Recipes from files: paths, overrides, origin, the listing of keys."""

from __future__ import annotations

import hashlib
import pickle
from pathlib import Path

import pytest

from gridcarb.chemistry.constants import CONSTANTS
from gridcarb.errors import RecipeError
from gridcarb.fields import FIELDS, ROLES
from gridcarb.figures import FIGURES
from gridcarb.recipe import Recipe, check, load, reference
from gridcarb.write.settings import OutputSettings

TEXT = """\
recipe: 1
inputs: {files: [../grids/*.nc, more.nc], dic: dissic}
chemistry: {fields: [ph_total_scale]}
output: {folder: ../results/first}
"""


@pytest.fixture
def path(tmp_path, monkeypatch):
    folder = tmp_path / "recipes"
    folder.mkdir()
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    monkeypatch.chdir(elsewhere)
    recipe = folder / "first.yaml"
    recipe.write_text(TEXT)
    return recipe


def test_paths_are_relative_to_the_recipe(path, tmp_path):
    recipe = load(path)
    assert recipe.path == path
    assert recipe.base == path.parent
    assert recipe.inputs.files == ("../grids/*.nc", "more.nc")
    assert recipe.inputs.role("dic").variable == "dissic"
    assert recipe.output_folder() == tmp_path / "results" / "first"
    assert recipe.text == TEXT
    assert recipe.digest == hashlib.sha256(TEXT.encode()).hexdigest()


def test_a_relative_path_to_the_recipe_gives_an_absolute_base(path, monkeypatch):
    recipe = load(Path("../recipes/first.yaml"))
    monkeypatch.chdir("/")
    assert recipe.base == path.parent
    assert recipe.output_folder() == path.parent.parent / "results" / "first"


def test_the_home_folder(path, monkeypatch, tmp_path):
    monkeypatch.setenv("HOME", str(tmp_path / "home"))
    path.write_text(TEXT.replace("../results/first", "~/first"))
    assert load(path).output_folder() == tmp_path / "home" / "first"


def test_the_command_line_goes_first_and_is_relative_to_the_working_directory(path, tmp_path):
    here = tmp_path / "elsewhere"
    recipe = load(path, inputs=["*.nc", "memory://store.zarr"], folder="out", replace=True, workers=3, memory="1.5 GiB")
    assert recipe.inputs.files == (str(here / "*.nc"), "memory://store.zarr")
    assert recipe.inputs.role("dic").variable == "dissic"
    assert recipe.output_folder() == here / "out"
    assert recipe.output.replace is True
    assert recipe.engine.workers == 3
    assert recipe.engine.memory_bytes == 3 * 2**29


def test_inputs_and_folder_may_come_from_the_command_line_alone(path):
    path.write_text("recipe: 1\nchemistry: {fields: all}\noutput:\n")
    with pytest.raises(RecipeError) as caught:
        load(path)
    assert {fault.key for fault in caught.value.faults} == {"inputs.files", "output"}
    assert load(path, inputs=["a.nc"], folder="out").output.folder.endswith("out")


def test_roles_with_files_of_their_own_need_no_shared_ones(path):
    own = ", ".join(f"{role}: {{files: {role}.nc}}" for role in ROLES[:4])
    path.write_text(TEXT.replace("files: [../grids/*.nc, more.nc], dic: dissic", own))
    assert load(path).inputs.files == ()
    path.write_text(path.read_text().replace("dic: {files: dic.nc}", "dic: dissic"))
    with pytest.raises(RecipeError, match="no files are named for dic"):
        load(path)


def test_a_wrong_word_of_the_command_line_has_no_line(path):
    with pytest.raises(RecipeError) as caught:
        load(path, memory="much", workers=0)
    faults = {fault.key: fault for fault in caught.value.faults}
    assert set(faults) == {"engine.memory (from the command line)", "engine.workers (from the command line)"}
    assert {fault.line for fault in faults.values()} == {0}


def test_the_digest_follows_what_makes_the_result(path):
    plain = load(path).digest
    assert load(path, replace=True, workers=5, memory="1 GB").digest == plain
    others = [load(path, inputs=["a.nc"]), load(path, inputs=["b.nc"]), load(path, folder="x")]
    assert len({plain, *(recipe.digest for recipe in others)}) == 4


def test_a_recipe_survives_pickling_with_its_origin(path):
    recipe = load(path)
    again = pickle.loads(pickle.dumps(recipe))
    assert again == recipe
    assert (again.digest, again.base, again.path) == (recipe.digest, recipe.base, recipe.path)


@pytest.mark.parametrize(("name", "content", "what", "mend"), [
    ("frist.yaml", None, "no such recipe", "'first.yaml'"),
    (".", None, "a folder", "first.yaml"),
    ("data.nc", b"\x89HDF\r\n\x1a\n\xff\xfe", "not a text file", "--input"),
])
def test_what_is_not_a_recipe(path, name, content, what, mend):
    wrong = path.parent / name
    if content:
        wrong.write_bytes(content)
    with pytest.raises(RecipeError) as caught:
        load(wrong)
    (fault,) = caught.value.faults
    assert what in fault.what
    assert mend in fault.mend
    assert caught.value.where == str(wrong)


def test_a_byte_order_mark_is_no_fault(path):
    path.write_bytes(b"\xef\xbb\xbf" + TEXT.encode())
    assert load(path).recipe == 1


def test_inputs_may_be_asked_for_as_they_were_understood():
    recipe = check(TEXT.replace("[ph_total_scale]", "[sea_pressure, ph_total_scale]"))
    assert recipe.chemistry.fields == ("sea_pressure", "ph_total_scale")


def test_all_means_every_derived_field():
    recipe = check(TEXT.replace("[ph_total_scale]", "all"))
    assert recipe.chemistry.fields == tuple(key for key, field in FIELDS.items() if field.part == "derived")
    assert check(TEXT.replace("[ph_total_scale]", "co2_fugacity")).chemistry.fields == ("co2_fugacity",)


@pytest.mark.parametrize("key", list(CONSTANTS))
def test_every_set_of_constants_can_be_named(key):
    assert check(TEXT.replace("{fields:", f"{{constants: {key}, fields:")).chemistry.constants == key


@pytest.mark.parametrize(("words", "size"), [
    ("2 GB", 2 * 10**9), ("512MiB", 2**29), ("1.5 kB", 1500), ("1 TB", 10**12), ("2 gb", 2 * 10**9), ("64 KiB", 2**16),
])
def test_memory(words, size):
    assert check(TEXT + f"engine: {{memory: {words}}}\n").engine.memory_bytes == size


def test_figures_take_the_settings_of_their_kind():
    recipe = check(TEXT + "figures:\n- {kind: map, field: ph_total_scale, time: 2005-07-16}\n")
    (figure,) = recipe.figures
    assert type(figure) is FIGURES["map"].settings
    assert recipe.model_dump()["figures"][0]["field"] == "ph_total_scale"


def test_the_status_is_always_there_to_be_drawn():
    assert check(TEXT + "figures: [{kind: map, field: solution_status}]\n").figures


def test_empty_sections_are_left_out():
    recipe = check(TEXT + "reading:\nfigures:\nengine:\n")
    assert recipe.figures == ()
    assert recipe.engine.workers is None


def test_the_listing_tells_every_key_with_its_meaning():
    rows = {row.key: row for row in reference()}
    assert all(row.description for row in rows.values()), [key for key, row in rows.items() if not row.description]
    assert set(Recipe.model_fields) <= set(rows)
    assert rows["output.folder"].required
    assert rows["output.precision"].default == OutputSettings(folder="x").precision
    assert rows["output.netcdf"].type == "true or false"
    assert rows["reading.temperature"].type == "in situ | potential | conservative"
    assert rows["inputs.files"].type == "list of text"
    assert rows["figures[map].depth"].type == "number"
    assert rows["figures[map].region"].type == "list of 4 x number"
    assert rows["figures[map].time"].type == "text | whole number"
