"""Text to data with lines: whatever is written, the answer is data or faults."""

from __future__ import annotations

import pytest

from gridcarb.recipe.text import dotted, parse


def test_data_and_lines():
    parsed = parse("# a comment\nrecipe: 1\ninputs:\n  files:\n    - a.nc\n    - b.nc\n  dic: {variable: dissic}\n")
    assert parsed.data == {"recipe": 1, "inputs": {"files": ["a.nc", "b.nc"], "dic": {"variable": "dissic"}}}
    assert not parsed.faults
    assert parsed.lines[("recipe",)] == 2
    assert parsed.lines["inputs", "files"] == 4
    assert parsed.lines["inputs", "files", 1] == 6
    assert parsed.lines["inputs", "dic", "variable"] == 7


def test_the_line_of_what_is_not_written_is_that_of_its_surroundings():
    parsed = parse("recipe: 1\n\noutput:\n  netcdf: true\n")
    assert parsed.line(("output", "folder")) == 3
    assert parsed.line(("chemistry", "fields")) == 1


@pytest.mark.parametrize(("written", "value"), [
    ("12", 12), ("010", 10), ("0x1F", 31), ("-3", -3), ("1_000", 1000), ("1e-3", 1e-3), ("2.5", 2.5),
    ("true", True), ("False", False), ("yes", "yes"), ("~", None), ("", None), ("2005-07-16", "2005-07-16"),
    ("'7'", "7"), ("1026 kg m-3", "1026 kg m-3"), ("[1, x]", [1, "x"]),
])
def test_values(written, value):
    parsed = parse(f"key: {written}\n")
    assert parsed.data == {"key": value}
    assert type(parsed.data["key"]) is type(value)


def test_an_alias_repeats_what_it_names():
    assert parse("a: &x [1, 2]\nb: *x\n").data == {"a": [1, 2], "b": [1, 2]}


@pytest.mark.parametrize(("text", "line", "words"), [
    ("", 1, "empty"),
    ("# nothing but a comment\n", 1, "empty"),
    ("- a\n- b\n", 1, "keys and values"),
    ("just words", 1, "keys and values"),
    ("recipe: 1\n\tinputs: 2\n", 2, "tab"),
    ("inputs:\n\tfiles: a.nc\n", 2, "tab"),
    ("a: b: c\n", 1, "colon"),
    ("recipe: 1\ntitle\ninputs: 2\n", 3, "colon"),
    ("recipe: 1\ntitle: 'unclosed\nmore: 1\n", 2, "quotation mark"),
    ("recipe: 1\nfields: [a, b\n", 2, "bracket"),
    ("recipe: 1\nmap: {a: 1\n", 2, "bracket"),
    ("files: *.nc\n", 1, "'*'"),
    ("files: *all\n", 1, "'*'"),
    ("a: 1\n---\nb: 2\n", 2, "second recipe"),
    ("a: @x\n", 1, "'@'"),
    ("a: 1\nb: \x07\n", 2, "character"),
    ("a: !!python/object:os.system x\n", 1, "tag"),
    ("a: 1\nb: !own x\n", 2, "tag"),
    ("a: 1\nb: 2\na: 3\n", 3, "written twice, first on line 1"),
    ("a: 1\n? [b]\n: 2\n", 2, "one word"),
    ("a: 1\nb: .nan\n", 2, "number"),
    ("a: -.inf\n", 1, "number"),
    ("a: !!int many\n", 1, "number"),
    ("a: &x [*x]\n", 1, "nested deeper"),
])
def test_faults_have_their_line(text, line, words):
    faults = parse(text).faults
    assert [fault.line for fault in faults] == [line]
    assert words in faults[0].what
    assert faults[0].mend


def test_a_repeated_key_keeps_the_first_value():
    parsed = parse("output:\n  folder: one\n  folder: two\n")
    assert parsed.data == {"output": {"folder": "one"}}
    assert parsed.faults[0].key == "output.folder"


def test_an_alias_bomb_is_refused_early():
    lines = ["a0: &a0 [x, x, x, x, x, x, x, x, x]"]
    lines += [f"a{n}: &a{n} [{', '.join([f'*a{n - 1}'] * 9)}]" for n in range(1, 9)]
    parsed = parse("\n".join(lines))
    assert len(parsed.faults) == 1
    assert "larger" in parsed.faults[0].what


def test_deep_brackets_are_a_fault_not_a_crash():
    assert parse("a: " + "[" * 5000).faults


def test_dotted():
    assert dotted(("figures", 0, "depth")) == "figures[0].depth"
    assert dotted(()) == ""
