"""What must hold between sections of a recipe; looked at in the plain data, so that it is told with all other faults."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any

from gridcarb.errors import Fault, did_you_mean
from gridcarb.fields import FIELDS, REQUIRED_ROLES
from gridcarb.recipe.model import derived_fields, resolved
from gridcarb.recipe.text import KeyPath, Parsed, dotted

Finding = tuple[KeyPath, str, str]


def disagreements(parsed: Parsed, base: Path) -> list[Fault]:
    """Faults that concern two sections, or a section and the place of the recipe."""
    data = parsed.data or {}
    findings = [*_no_files(data), *_uncomputed_figures(data), *_folder_in_the_way(data, base)]
    return [Fault(parsed.line(path), dotted(path), what, mend) for path, what, mend in findings]


def _no_files(data: Mapping[str, Any]) -> Iterator[Finding]:
    inputs = data.get("inputs") or {}
    if not isinstance(inputs, Mapping) or inputs.get("files"):
        return
    own = [role for role in REQUIRED_ROLES if isinstance(inputs.get(role), Mapping) and inputs[role].get("files")]
    lacking = [role for role in REQUIRED_ROLES if role not in own]
    if lacking:
        yield ("inputs", "files"), f"no files are named for {', '.join(lacking)}", (
            "write `files: ...` under `inputs`, or give the files on the command line: --input PATH"
        )


def _uncomputed_figures(data: Mapping[str, Any]) -> Iterator[Finding]:
    chemistry = data.get("chemistry")
    wanted = chemistry.get("fields") if isinstance(chemistry, Mapping) else None
    computed = derived_fields() if wanted == "all" else [wanted] if isinstance(wanted, str) else wanted
    always = {key for key, field in FIELDS.items() if field.part == "status"}
    figures = data.get("figures")
    if not isinstance(computed, Sequence) or not isinstance(figures, list):
        return
    for number, figure in enumerate(figures):
        key = figure.get("field") if isinstance(figure, Mapping) else None
        if not isinstance(key, str) or key in computed or key in always:
            continue
        place = ("figures", number, "field")
        if key in derived_fields():
            yield place, f"'{key}' is drawn but not computed", f"add {key} to `fields` of `chemistry`"
        else:
            known = [word for word in computed if isinstance(word, str)]
            yield place, f"'{key}' is not a field of the result", did_you_mean(key, known)


def _folder_in_the_way(data: Mapping[str, Any], base: Path) -> Iterator[Finding]:
    """A result takes its folder's place as a whole, so that folder must hold nothing else."""
    output = data.get("output")
    folder = output.get("folder") if isinstance(output, Mapping) else None
    if isinstance(folder, str):
        target = resolved(folder, base)
        if target == base or target in base.parents:
            yield ("output", "folder"), f"the result folder would be {target}, which holds the recipe", (
                "name a folder of the result's own, such as `folder: results/first`"
            )
