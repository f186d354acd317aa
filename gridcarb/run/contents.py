"""What lies in the files, told as plain data with the findings: for machines and for the journal."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from gridcarb.run.findings import LEVELS, Finding, worst
from gridcarb.sources.survey import FileSurvey, Survey, VariableSurvey


def audit_data(survey: Survey, findings: Sequence[Finding]) -> dict[str, object]:
    """An audit as plain data."""
    return {
        "worst": worst(findings),
        "counts": {level: sum(finding.level == level for finding in findings) for level in LEVELS},
        "findings": [finding.as_dict() for finding in findings],
        "variables": [_record(files, variable) for files, variable in alike(survey.files)],
        "files": len(survey.files),
    }


def alike(files: Sequence[FileSurvey]) -> Iterator[tuple[list[FileSurvey], VariableSurvey]]:
    """Variables that are the same in several files, once with all their files; lengths may differ."""
    groups: dict[tuple[object, ...], list[tuple[FileSurvey, VariableSurvey]]] = {}
    for file in files:
        for variable in file.variables:
            key = (variable.name, tuple(variable.dims), variable.dtype, variable.units, variable.taken_as)
            groups.setdefault(key, []).append((file, variable))
    for group in groups.values():
        yield [file for file, _ in group], group[0][1]


def _record(files: Sequence[FileSurvey], variable: VariableSurvey) -> dict[str, object]:
    return {
        "name": variable.name, "files": len(files), "first_file": files[0].path, "dims": dict(variable.dims),
        "dtype": variable.dtype, "units": variable.units, "standard_name": variable.standard_name,
        "chunks": list(variable.chunks) if variable.chunks else None, "compression": variable.compression,
        "part": variable.part,
        "roles": [{"role": each.role, "how": each.how, "taken": each.taken, "why": each.why} for each in variable.chances],
        "why_none": variable.why_none,
    }
