"""The audit: what lies in the files, how it is understood, what is assumed and what stops, in words and numbers."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.recipe import Recipe
from gridcarb.run.contents import alike, audit_data
from gridcarb.run.findings import LEVELS, Finding, Level, worst
from gridcarb.run.inspection import Inspection, inspect
from gridcarb.run.plan import draft
from gridcarb.run.report import Report, Rows, Section
from gridcarb.run.starter import starter_recipe
from gridcarb.sources import InputsSettings
from gridcarb.sources.survey import FileSurvey, VariableSurvey
from gridcarb.write.disk import sized

_TITLES: Mapping[Level, str] = {
    "fine": "Fine", "assumed": "Assumed (each can be stated in the recipe)",
    "stop": "Stop (nothing is computed before this is mended)",
}


@dataclass(frozen=True, eq=False)
class Audit:
    """Everything an audit found, with the sections of the recipe that name the inputs and say how to read them."""

    inspection: Inspection
    findings: tuple[Finding, ...]
    inputs: InputsSettings
    reading: ReadingSettings
    base: Path

    @property
    def worst(self) -> Level:
        """The worst level of all findings."""
        return worst(self.findings)

    def report(self) -> Report:
        """The audit for people and for machines."""
        sections = [Section("What lies in the files", list(_content_rows(self.inspection.survey.files)))]
        for level in LEVELS:
            rows = [row for finding in self.findings if finding.level == level for row in _rows(finding)]
            sections.append(Section(_TITLES[level], rows))
        sections.append(Section("In short", [(self.worst, _in_short(self.findings))]))
        data = audit_data(self.inspection.survey, self.findings)
        return Report([section for section in sections if section.rows], (), data)

    def starter(self, path: Path) -> str:
        """The text of a recipe for these inputs, to be kept at `path`."""
        stated = {name: section.model_dump(mode="json", exclude_unset=True)
                  for name, section in (("inputs", self.inputs), ("reading", self.reading))}
        return starter_recipe(stated, self.base, self.findings, path)


def audit_files(files: Sequence[str]) -> Audit:
    """Audit files, globs or stores, relative to the working directory, as a recipe would take them that says no more."""
    inputs, reading, base = InputsSettings(files=tuple(files)), ReadingSettings(), Path.cwd()
    seen = inspect(inputs, base, reading)
    return Audit(seen, seen.findings, inputs, reading, base)


def audit_recipe(recipe: Recipe) -> Audit:
    """Audit the inputs of a recipe with what it says of them, and whether its figures, memory and result can be."""
    found = draft(recipe)
    return Audit(found.inspection, found.findings, recipe.inputs, recipe.reading, recipe.base)


def _content_rows(files: Sequence[FileSurvey]) -> Rows:
    """How many files, every field with the roles it can play, and what describes the grid."""
    rows: Rows = []
    if files:
        sizes = [file.record.size for file in files if file.record]
        broken = len(files) - len(sizes)
        rows.append(("files", f"{len(sizes)}, {sized(sum(sizes))}" + (f"; {broken} cannot be read" if broken else "")))
    aside: dict[str, list[str]] = {"coordinate": [], "bounds": []}
    variables = sorted(alike(files), key=lambda each: (not each[1].taken_as, each[1].part != "field"))
    for holders, variable in variables:
        if variable.part in aside and not variable.chances:
            aside[variable.part].append(variable.name)
        else:
            rows.append((variable.name, _variable_words(variable, len(holders))))
    titles = {"coordinate": "coordinates", "bounds": "bounds"}
    return rows + [(titles[part], ", ".join(dict.fromkeys(names))) for part, names in aside.items() if names]


def _variable_words(variable: VariableSurvey, files: int) -> str:
    size = " x ".join(f"{dim} {size}" for dim, size in variable.dims.items()) or "scalar"
    place = f", in {files} files" if files > 1 else ""
    chances = "; ".join(
        f"{chance.role} ({chance.how})" if chance.taken else f"could be {chance.role}, not taken: {chance.why}"
        for chance in variable.chances
    )
    said = chances or f"no role: {variable.why_none}"
    return f"{size}, {variable.units or 'no units'}{place}: {said}"


def _rows(finding: Finding) -> Rows:
    first, *rest = finding.lines()
    return [(finding.subject, first), *(("", line) for line in rest)]


def _in_short(findings: Sequence[Finding]) -> str:
    counts = {level: sum(finding.level == level for finding in findings) for level in LEVELS}
    ending = {
        "fine": "a run can begin", "assumed": "a run can begin; state what was assumed to make sure of it",
        "stop": "a run would be refused",
    }[worst(findings)]
    return f"{counts['stop']} stop, {counts['assumed']} assumed, {counts['fine']} fine: {ending}"
