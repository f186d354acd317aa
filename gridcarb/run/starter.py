"""A recipe to begin with: the inputs found, what was assumed stated, and what is open as questions to answer."""

from __future__ import annotations

import glob
import io
import os
import re
import textwrap
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from ruamel.yaml import YAML

from gridcarb.recipe.text import parse
from gridcarb.run.findings import Finding

_HEAD = """\
# Written by `gridcarb audit` for the files it was shown. Look it through, answer the questions, then
#
#     gridcarb plan {name}      what would be done
#     gridcarb run {name}
#
# `gridcarb keys` lists every key with its meaning, `gridcarb fields` every field.

recipe: 1
title: Marine carbonate system
"""

_TAIL = """
chemistry:
  constants: guide2007
  fields: [ph_total_scale, co2_partial_pressure, carbonate_ion, aragonite_saturation]

output:
  folder: {stem}_result
  netcdf: true

# figures:
#   - {{kind: map, field: aragonite_saturation, depth: 0, time: first}}
"""

_LINE = re.compile(r"`((?:inputs|reading): \{[^`]*\})`")
"""A line to write, as the cures name it."""

_MANY = 8
"""More files of one folder than this are named by a glob, if it means just them."""


@dataclass
class _Section:
    """Keys with values, the comment above each, and the questions left."""

    values: dict[str, object]
    comments: dict[str, list[str]] = field(default_factory=dict)
    questions: list[tuple[str, str]] = field(default_factory=list)

    def lines(self, name: str) -> Iterator[str]:
        yield f"{name}:" if self.values else f"{name}: {{}}"
        for key, value in self.values.items():
            yield from _comment(self.comments.get(key, ()))
            yield f"  {key}: {_flow(value)}"
        for text, line in self.questions:
            yield from _comment([text if text == "or" else f"QUESTION: {text}"])
            yield f"  # {line}"


def starter_recipe(stated: Mapping[str, Mapping[str, Any]], base: Path, findings: Sequence[Finding], path: Path) -> str:
    """The text of a recipe that loads as it stands, and runs if nothing that was found is a stop.

    Parameters
    ----------
    stated : the sections `inputs` and `reading` as far as they are stated already, as plain data.
    base : the folder their relative paths start from.
    path : where the recipe will lie.
    """
    folder = Path(os.path.abspath(path)).parent
    sections = {"inputs": _Section(_moved(stated["inputs"], base, folder)), "reading": _Section(dict(stated["reading"]))}
    for finding in findings:
        if finding.level == "assumed":
            _state(sections, finding)
        elif finding.level == "stop":
            _ask(sections, finding)
    body = "\n\n".join("\n".join(section.lines(name)) for name, section in sections.items())
    return f"{_HEAD.format(name=path.name)}\n{body}\n{_TAIL.format(stem=path.stem)}"


def _state(sections: Mapping[str, _Section], finding: Finding) -> None:
    """Write what was assumed as if it had been stated; a key that is taken keeps its value."""
    for name, key, value in _entries(finding.cure):
        section = sections[name]
        told = section.values.setdefault(key, value)
        if isinstance(told, dict) and isinstance(value, dict):
            told |= {inner: each for inner, each in value.items() if inner not in told}
        section.comments.setdefault(key, []).append(f"assumed: {finding.text}")


def _ask(sections: Mapping[str, _Section], finding: Finding) -> None:
    entries = [entry for line in _LINE.findall(finding.cure) for entry in _entries(line)]
    text = f"{finding.text} ({finding.where})" if finding.where else finding.text
    asked: set[str] = set()
    for name, key, value in entries:
        sections[name].questions.append(("or" if name in asked else text, f"{key}: {_flow(value)}"))
        asked.add(name)
    if not entries:
        sections["inputs"].questions.append((text, finding.cure))


def _entries(line: str) -> list[tuple[str, str, Any]]:
    """Section, key and value of a line such as ``reading: {density: 1025 kg m-3}``; none if it is no such line."""
    data = parse(line).data or {}
    return [
        (name, str(key), value) for name, inner in data.items() if name in ("inputs", "reading") and isinstance(inner, dict)
        for key, value in inner.items() if value is not None
    ]


def _moved(inputs: Mapping[str, Any], base: Path, folder: Path) -> dict[str, object]:
    """The section `inputs` with its relative paths told from another folder."""
    found: dict[str, object] = {}
    for key, value in inputs.items():
        if key == "files":
            found[key] = [_from(pattern, base, folder) for pattern in _folded(value, base)]
        else:
            found[key] = _moved(value, base, folder) if isinstance(value, Mapping) else value
    return found


def _from(pattern: str, base: Path, folder: Path) -> str:
    kept = "://" in pattern or os.path.isabs(pattern) or pattern.startswith("~")
    return pattern if kept else os.path.relpath(base / pattern, folder)


def _folded(patterns: Sequence[str], base: Path) -> Sequence[str]:
    """Many files of one folder as a glob, where it means just them."""
    folders = {os.path.dirname(pattern) for pattern in patterns}
    endings = {os.path.splitext(pattern)[1] for pattern in patterns}
    if len(patterns) <= _MANY or len(folders) != 1 or len(endings) != 1:
        return patterns
    one = os.path.join(folders.pop(), f"*{endings.pop()}")
    meant = {os.path.abspath(base / pattern) for pattern in patterns}
    return [one] if set(glob.glob(str(base / one))) == meant else patterns


def _comment(texts: Sequence[str]) -> Iterator[str]:
    for text in texts:
        yield from textwrap.wrap(text, 110, initial_indent="  # ", subsequent_indent="  #   ", break_on_hyphens=False)


def _flow(value: object) -> str:
    """A value on one line of YAML."""
    yaml, stream = YAML(typ="safe", pure=True), io.StringIO()
    yaml.default_flow_style, yaml.width = True, 100_000
    yaml.dump({"key": value}, stream)
    return stream.getvalue().strip().removeprefix("{key: ").removesuffix("}")
