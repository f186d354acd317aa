"""The README is true: its Python runs, its table of fields is the catalogue, its recipe is accepted."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

import gridcarb
from gridcarb.recipe import check

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text()
START, END = "<!-- fields: written from the catalogue; a test holds them together -->\n", "<!-- end of fields -->"


def blocks(language: str) -> list[str]:
    return re.findall(rf"```{language}\n(.*?)```", README, flags=re.DOTALL)


def fields_table() -> str:
    """Run this file as a script to write the table into the README."""
    lines = ["| key | units | what | CF standard name |", "|---|---|---|---|"]
    for field in gridcarb.FIELDS.values():
        if field.part != "input":
            by_volume = f"{field.volume_standard_name} (per volume)" if field.volume_standard_name else "none"
            name = field.standard_name or by_volume
            lines.append(f"| `{field.key}` | {field.units} | {field.long_name} | {name} |")
    return "\n".join(lines) + "\n"


@pytest.mark.parametrize("source", blocks("python"), ids=["speciate", "derive"])
def test_python_of_the_readme_runs(
    source: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(ROOT)
    exec(compile(source, "README.md", "exec"), {})
    assert re.fullmatch(r"(8\.\d{3}|0\.\d\d to [34]\.\d\d)\n", capsys.readouterr().out)


@pytest.mark.parametrize("source", blocks("yaml"))
def test_recipe_of_the_readme_is_accepted(source: str) -> None:
    assert check(source, "README.md").chemistry.fields == ("ph_total_scale", "aragonite_saturation")


def test_table_of_fields_is_the_catalogue() -> None:
    assert README.split(START)[1].split(END)[0] == fields_table()


def test_first_screen_holds_the_two_commands() -> None:
    first = README.splitlines()[:30]
    assert "    python -m pip install . && gridcarb run recipes/first_look.yaml" in first
    assert "    python -m pip install '.[test]' && python -m pytest" in first


if __name__ == "__main__":
    head, rest = README.split(START)
    (ROOT / "README.md").write_text(head + START + fields_table() + END + rest.split(END)[1])
