"""Unknown fields, sets and keys: refused with their line, and with the word that was probably meant."""

from __future__ import annotations

import re

import pytest

WORDS: dict[str, tuple[dict, str, str, str]] = {
    "field": ({"chemistry": {"fields": ["ph_total_scal"]}}, "chemistry.fields[0]", "ph_total_scale", "ph_total_scal"),
    "set": ({"chemistry": {"constants": "guide2077"}}, "chemistry.constants", "guide2007", "guide2077"),
    "key": ({"reading": {"temprature": "potential"}}, "reading.temprature", "temperature", "temprature"),
    "section": ({"redaing": {"temperature": "potential"}}, "redaing", "reading", "redaing"),
    "word": ({"reading": {"salinity": "practica"}}, "reading.salinity", "practical", "practica"),
    "role": ({"reading": {"units": {"dics": "umol kg-1"}}}, "reading.units", "dic", "dics"),
    "figure": ({"figures": [{"kind": "mapp", "field": "ph_total_scale"}]}, "figures[0].kind", "map", "mapp"),
    "field of a figure": ({"figures": [{"kind": "map", "field": "ph_totl_scale"}]}, "figures[0].field", "ph_total_scale",
                          "ph_totl_scale"),
}


@pytest.mark.parametrize("case", WORDS)
def test_unknown_words(bench, ocean, case: str) -> None:
    words, key, meant, wrong = WORDS[case]
    bench.put(ocean())
    bench.say(words)
    told = bench.refusal(2)
    line, place = re.fullmatch(rf"{re.escape(str(bench.recipe))}:(\d+): (.*)", told.where).groups()
    assert place == key
    assert wrong in bench.recipe.read_text().splitlines()[int(line) - 1] or "units" in place
    assert wrong in told.what
    assert f"'{meant}'" in told.mend
    bench.words = _corrected(bench.words, wrong, meant)
    bench.success()


def _corrected(words, wrong: str, meant: str):
    """The same recipe with one word put right."""
    if isinstance(words, dict):
        return {meant if key == wrong else key: _corrected(value, wrong, meant) for key, value in words.items()}
    if isinstance(words, list):
        return [_corrected(value, wrong, meant) for value in words]
    return meant if words == wrong else words


def test_all_faults_at_once(bench, ocean) -> None:
    bench.put(ocean())
    bench.say({"chemistry": {"fields": ["ph"], "constants": "x"}, "output": {"netcdf": "perhaps"}, "colour": "blue"})
    ended = bench.run()
    assert ended.exit_code == 2
    assert "4 faults" in ended.stderr
    assert not bench.result.exists()
