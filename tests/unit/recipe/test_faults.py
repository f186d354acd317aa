"""Every kind of fault: its line, its key, what is wrong, how to mend it; all of them at once."""

from __future__ import annotations

import contextlib
import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.errors import Fault, RecipeError
from gridcarb.recipe import check, reference

GOOD = """\
recipe: 1
title: First look at the invented ocean
inputs:
  files: ../grids/*.nc
  temperature: {variable: thetao}
reading:
  temperature: potential
chemistry:
  constants: guide2007
  fields: [ph_total_scale, aragonite_saturation]
output:
  folder: ../results/first
figures:
  - {kind: map, field: ph_total_scale, depth: 0}
engine:
  workers: 2
"""

JARGON = re.compile(r"pydantic|_type\b|_error\b|https?:|\bdict\b|\btuple\b|\bstr\b|\bint\b|validator|Input should", re.I)


def faults_of(text: str) -> tuple[Fault, ...]:
    with pytest.raises(RecipeError) as caught:
        check(text, "demo.yaml")
    return caught.value.faults


def changed(old: str, new: str) -> str:
    assert GOOD.count(old) == 1
    return GOOD.replace(old, new)


@pytest.mark.parametrize(("old", "new", "line", "key", "what", "mend"), [
    ("recipe: 1\n", "", 1, "recipe", "missing", "write `recipe: ...`"),
    ("recipe: 1", "recipe: 2", 1, "recipe", "2 is not accepted", "accepted: 1"),
    ("title:", "titel:", 2, "titel", "no key 'titel' in a recipe", "did you mean 'title'?"),
    ("title: First look at the invented ocean", "title: 2024", 2, "title", "2024 is not text", 'quotes: "2024"'),
    ("title: First look at the invented ocean", "title: true", 2, "title", "true is not text", 'quotes: "true"'),
    ("title: First look at the invented ocean", "workers: 3", 2, "workers", "no key 'workers'", "`engine.workers`"),
    ("  files: ../grids/*.nc\n", "", 3, "inputs.files", "no files", "--input"),
    ("  files: ../grids/*.nc", "  files: 3", 4, "inputs.files", "3 is not a list", "brackets"),
    ("  files: ../grids/*.nc", "  files:\n    - a.nc\n    - 3", 6, "inputs.files[1]", "3 is not text", "quotes"),
    ("{variable: thetao}", "{variabel: thetao}", 5, "inputs.temperature.variabel", "no key", "'variable'"),
    ("{variable: thetao}", "7", 5, "inputs.temperature", "7 is not a section", "files, variable"),
    ("temperature: potential", "temperature: potental", 7, "reading.temperature", "'potental' is not", "mean 'potential'"),
    ("temperature: potential", "density: heavy", 7, "reading.density", "'heavy' cannot be understood", "density: "),
    ("temperature: potential", "mask_difference: 2", 7, "reading.mask_difference", "at most 1", "mask_difference: "),
    ("temperature: potential", "mask_difference: -1", 7, "reading.mask_difference", "at least 0", "mask_difference: "),
    ("temperature: potential", "mask_difference: few", 7, "reading.mask_difference", "'few' is not a number", "mask_"),
    ("temperature: potential", "units: [mol m-3]", 7, "reading.units", "a list is not a section", "units: "),
    ("temperature: potential", "units: {dic: [1]}", 7, "reading.units.dic", "a list is not text", "units: "),
    ("guide2007", "guide2070", 9, "chemistry.constants", "no set of constants 'guide2070'", "'guide2007'"),
    ("[ph_total_scale,", "[ph_total_scal, ph_total_scale,", 10, "chemistry.fields[0]", "no field", "'ph_total_scale'"),
    ("[ph_total_scale,", "[ph_total_scale, ph_total_scale,", 10, "chemistry.fields", "more than once", "once"),
    ("  fields: [ph_total_scale, aragonite_saturation]\n", "", 8, "chemistry.fields", "missing in chemistry", "'all'"),
    ("  folder: ../results/first", "  netcdf: false", 11, "output.folder", "missing in output", "write `folder: ...`"),
    ("  folder: ../results/first", "  folder:", 12, "output.folder", "nothing is written", "write text"),
    ("  folder: ../results/first", "  folder: .", 12, "output.folder", "holds the recipe", "folder of the result's own"),
    ("  folder: ../results/first", "  folder: ..", 12, "output.folder", "holds the recipe", "folder of the result's own"),
    ("  folder: ../results/first", "  folder: x\n  netcdf: maybe", 13, "output.netcdf", "not true or false", "netcdf: "),
    ("  folder: ../results/first", "  folder: x\n  zarr_format: 4", 13, "output.zarr_format", "4 is not accepted", "2, 3"),
    ("  folder: ../results/first", "  folder: x\n  attributes: {a: []}", 13, "output.attributes.a", "or a number", "attr"),
    ("kind: map, ", "", 14, "figures[0]", "kind of figure is missing", "one of: map"),
    ("kind: map", "kind: mapp", 14, "figures[0].kind", "no figure 'mapp'", "'map'"),
    ("  - {kind: map, field: ph_total_scale, depth: 0}", "  - map", 14, "figures[0]", "'map' is not a section", "figures"),
    ("  - {kind: map, field: ph_total_scale, depth: 0}", "  kind: map", 13, "figures", "not a list", "- "),
    ("depth: 0", "depht: 0", 14, "figures[0].depht", "no key 'depht' in figures[0]", "'depth'"),
    ("depth: 0", "depth: deep", 14, "figures[0].depth", "'deep' is not a number", "depth: "),
    ("depth: 0", "time: [1]", 14, "figures[0].time", "a list is not text or a whole number", "time: "),
    ("depth: 0", "title: ''", 14, "figures[0].title", "'' is too short", "title: "),
    ("depth: 0", "region: [1, 2]", 14, "figures[0].region", "too few", "region: "),
    ("depth: 0", "region: [1, 2, 3, 4, 5]", 14, "figures[0].region", "at most 4", "region: "),
    ("depth: 0", "region: [1, 2, 30, 4]", 14, "figures[0].region", "south < north", "region: "),
    ("field: ph_total_scale, ", "field: co2_fugacity, ", 14, "figures[0].field", "not computed", "add co2_fugacity"),
    ("field: ph_total_scale, ", "field: ph_totalscale, ", 14, "figures[0].field", "not a field of", "'ph_total_scale'"),
    ("workers: 2", "workers: 0", 16, "engine.workers", "at least 1", "workers: "),
    ("workers: 2", "workers: 1.5", 16, "engine.workers", "1.5 is not a whole number", "workers: "),
    ("workers: 2", "workers: true", 16, "engine.workers", "true is not a whole number", "workers: "),
    ("workers: 2", "memory: much", 16, "engine.memory", "'much' cannot be understood", "memory: "),
    ("workers: 2", "block: {time: 0}", 16, "engine.block.time", "at least 1", "time: "),
])
def test_each_kind_of_fault(*, old, new, line, key, what, mend):
    faults = faults_of(changed(old, new))
    assert [(fault.line, fault.key) for fault in faults] == [(line, key)]
    assert what in faults[0].what
    assert mend in faults[0].mend


@pytest.mark.parametrize(("wrong", "key"), [
    ("output: {netcdf: maybe}", "output.netcdf"), ("reading: {density: heavy}", "reading.density"),
    ("engine: {block: {time: 0}}", "engine.block.time"), ("figures: [{kind: map, depth: deep}]", "figures[map].depth"),
])
def test_the_mend_speaks_with_the_declaration(wrong, key):
    description = next(row.description for row in reference() if row.key == key)
    assert any(fault.mend.endswith(f": {description}") for fault in faults_of(f"recipe: 1\n{wrong}\n"))


def test_sections_that_must_be_there():
    faults = faults_of("recipe: 1\n")
    assert {fault.key for fault in faults} == {"inputs.files", "chemistry", "output"}
    assert "with at least: fields" in next(fault.mend for fault in faults if fault.key == "chemistry")


def test_an_emptied_section_is_told_at_its_line():
    (fault,) = faults_of(changed("  folder: ../results/first\n", "  # folder: x\n"))
    assert (fault.line, fault.key) == (11, "output")


def test_all_faults_at_once_by_line():
    text = GOOD
    for old, new in [
        ("title:", "titel:"), ("potential", "potental"), ("guide2007", "guide"), ("[ph_total_scale,", "[ph_total,"),
        ("  folder: ../results/first", "  folder: 5\n  folder: 6"), ("depth: 0", "depth: deep"),
        ("workers: 2", "workers: 0"),
    ]:
        text = text.replace(old, new)
    faults = faults_of(text)
    assert [(fault.line, fault.key) for fault in faults] == [
        (2, "titel"), (7, "reading.temperature"), (9, "chemistry.constants"), (10, "chemistry.fields[0]"),
        (12, "output.folder"), (13, "output.folder"), (15, "figures[0].depth"), (15, "figures[0].field"),
        (17, "engine.workers"),
    ]


def test_the_error_reads_as_place_fault_and_cure():
    with pytest.raises(RecipeError) as caught:
        check(changed("title:", "titel:"), "demo.yaml")
    assert str(caught.value).splitlines() == [
        "the recipe has one fault", "demo.yaml:2: titel", "    there is no key 'titel' in a recipe",
        "    to mend it: did you mean 'title'?",
    ]
    assert caught.value.exit_code == 2


KEYS = [row.key for row in reference() if row.type != "section" and "[" not in row.key]
VALUES = st.sampled_from(
    ["", "x", "1", "-1", "0.5", "true", "[]", "[1]", "[[x]]", "{}", "{a: 1}", "{a: [1]}", "'2 GB'", "1e400"],
)


@settings(deadline=None)
@given(st.dictionaries(st.sampled_from(KEYS), VALUES, min_size=1, max_size=8))
def test_no_fault_speaks_the_language_of_the_checker(wrong):
    tree: dict = {}
    for key, value in wrong.items():
        node = tree
        *sections, name = key.split(".")
        for section in sections:
            node = node.setdefault(section, {})
        node[name] = value
    with pytest.raises(RecipeError) as caught:
        check(_flow(tree))
    for fault in caught.value.faults:
        assert fault.what
        assert fault.mend
        assert not JARGON.search(fault.what), fault
        assert "is not accepted here" not in fault.what or "accepted: " in fault.mend


def _flow(tree: dict | str) -> str:
    if isinstance(tree, str):
        return tree
    return "{" + ", ".join(f"{key}: {_flow(value)}" for key, value in tree.items()) + "}"


@settings(deadline=None)
@given(st.one_of(
    st.text(), st.text(alphabet="ab:-[]{}'\"#&*!|>%@\n\t ?,.0\\"),
    st.lists(st.sampled_from(GOOD.splitlines()), max_size=20).map("\n".join),
))
def test_any_text_is_a_recipe_or_a_recipe_error(text):
    with contextlib.suppress(RecipeError):
        check(text)
