"""The attributes of a result: what the CF and ACDD conventions ask for, from the catalogue and the grid."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from datetime import UTC, datetime
from importlib.metadata import version
from typing import Any

import xarray as xr

from gridcarb.axes import Axes
from gridcarb.citations import CITATIONS
from gridcarb.errors import OutputError
from gridcarb.fields import Field
from gridcarb.write.coordinates import auxiliary
from gridcarb.write.coverage import geospatial, time_coverage
from gridcarb.write.pointers import names_in

_OF_THE_GRID = ("cell_measures", "grid_mapping", "mesh", "location")
"""What the inputs, all on one grid, say of that grid: it holds for every field, even if only one of them says so."""

_KEPT = ("institution", "project", "license", "acknowledgement", "geography", "source_id", "experiment_id", "variant_label",
         "featureType")
"""Global attributes of the input that hold for what is computed from it as well."""

_OURS = ("Conventions", "history")
"""Global attributes no recipe may set: they must be true."""


def global_attributes(
    *, title: str, template: xr.Dataset, axes: Axes, fields: Sequence[Field], now: datetime,
    citations: Iterable[str] = (), notes: Iterable[str] = (), own: Mapping[str, str | float | int] | None = None,
) -> dict[str, object]:
    """The global attributes of a result, in the terms of CF 1.11 and ACDD 1.3.

    Parameters
    ----------
    title : of the recipe.
    template : the input: attrs of its first file, coords loaded and raw.
    now : time of writing, aware of its zone.
    citations : keys of what was used beyond the fields' own citations: the constants.
    notes : notices and decisions, one sentence each; they become the comment.
    own : attributes from the recipe; they win, except over `Conventions` and `history`.
    """
    refused = [key for key in _OURS if key in (own or {})]
    if refused:
        raise OutputError(
            f"the attribute '{refused[0]}' is written by gridcarb and cannot be set", where="output: attributes",
            mend=f"leave '{refused[0]}' out of `output: {{attributes: ...}}` in the recipe",
        )
    program = f"gridcarb {version('gridcarb')}"
    inherited = inherited_attributes(template)
    found: dict[str, object] = {
        "Conventions": "CF-1.11, ACDD-1.3" + (", UGRID-1.0" if "mesh" in inherited else ""),
        "title": title,
        "summary": "Computed cell by cell from gridded temperature, salinity, dissolved inorganic carbon and total "
                   f"alkalinity: {'; '.join(field.long_name for field in fields if field.part != 'status')}.",
        "keywords": ", ".join(["ocean", "marine carbonate system", *_keywords(fields)]),
        "source": "; computed from: ".join([program, *_text(template.attrs, "source")]),
        "history": "\n".join([*_text(template.attrs, "history"), f"{_utc(now)}: {program} computed {_keys(fields)}"]),
        "references": "; ".join(_references(fields, citations)),
        "comment": " ".join(notes),
        "date_created": _utc(now),
        "standard_name_vocabulary": "CF Standard Name Table v93",
        "external_variables": " ".join(_external(inherited, template)),
        **{key: template.attrs[key] for key in _KEPT if key in template.attrs},
        **geospatial(template, axes),
        **time_coverage(template, axes),
        **(own or {}),
    }
    return {key: value for key, value in found.items() if value != ""}


def inherited_attributes(template: xr.Dataset) -> dict[str, str]:
    """What the data variables of `template` say of their grid without contradiction, and of their cells all alike."""
    found = {}
    for key in ("cell_methods", *_OF_THE_GRID):
        values = {str(variable.attrs.get(key, "")) for variable in template.data_vars.values()}
        if key in _OF_THE_GRID:
            values.discard("")
        if len(values) == 1 and "" not in values:
            found[key] = values.pop()
    return _on_a_known_mesh(found, template)


def _on_a_known_mesh(inherited: dict[str, str], template: xr.Dataset) -> dict[str, str]:
    """`mesh` and `location` mean nothing without each other and without the topology."""
    if "location" in inherited and inherited.get("mesh") in template.coords:
        return inherited
    return {key: value for key, value in inherited.items() if key not in ("mesh", "location")}


def field_attributes(
    field: Field, dims: Sequence[str], coordinates: Mapping[str, xr.Variable], inherited: Mapping[str, str],
    status: str | None,
) -> dict[str, object]:
    """The attributes of `field` in a file: the catalogue's, and how it hangs together with the other variables.

    status : the key of the status field beside it, if there is one.
    """
    found = field.attributes()
    if status not in (None, field.key):
        found["ancillary_variables"] = status
    measured = names_in("cell_measures", inherited.get("cell_measures", ""))
    names = [name for name in auxiliary(dims, coordinates) if name not in measured]
    if names:
        found["coordinates"] = " ".join(names)
    mapping = inherited.get("grid_mapping", "")
    if mapping and coordinates.keys() >= set(names_in("grid_mapping", mapping)):
        found["grid_mapping"] = mapping
    measures = _measures(inherited.get("cell_measures", ""), field, dims, coordinates)
    if measures:
        found["cell_measures"] = measures
    found |= {key: inherited[key] for key in ("mesh", "location") if key in inherited}
    return found | _methods(field, inherited.get("cell_methods", ""), dims, coordinates)


def _measures(text: str, field: Field, dims: Sequence[str], coordinates: Mapping[str, xr.Variable]) -> str:
    """The cell measures that fit `field`; one in another file (an external variable) is taken to fit if its kind does."""
    def fits(measure: str, name: str) -> bool:
        if name in coordinates:
            return set(coordinates[name].dims) <= set(dims)
        return measure == "area" or field.extent == "cell"

    pairs = re.findall(r"(\w+):\s*(\S+)", text)
    return " ".join(f"{measure}: {name}" for measure, name in pairs if fits(measure, name))


def _external(inherited: Mapping[str, str], template: xr.Dataset) -> list[str]:
    """Cell measures which the inputs name and do not hold."""
    return [name for name in names_in("cell_measures", inherited.get("cell_measures", "")) if name not in template.coords]


def _methods(field: Field, text: str, dims: Sequence[str], coordinates: Mapping[str, xr.Variable]) -> dict[str, object]:
    """The cell methods of the inputs, if every name in them is known to the field, and what they mean for it."""
    if not text or field.part == "status":
        return {}
    axes = re.findall(r"(\w+):", re.sub(r"\([^)]*\)", "", text))
    known = {"area", *dims, *(name for name in coordinates if not coordinates[name].dims)}
    if not set(axes) <= known:
        return {}
    found: dict[str, object] = {"cell_methods": text}
    if field.part == "derived" and re.search(r"\b(?!area\b)\w+:\s*(mean|sum)\b", text):
        said = "Computed from inputs averaged as in cell_methods: the value of the mean state, not the mean of the values."
        found["comment"] = " ".join([*_text(field.attributes(), "comment"), said])
    return found


def _text(attrs: Mapping[Any, object], key: str) -> list[str]:
    """The attribute as a list of one text, or of none where it is missing or empty."""
    value = str(attrs.get(key, "")).strip()
    return [value] if value else []


def _keys(fields: Sequence[Field]) -> str:
    return ", ".join(field.key for field in fields)


def _keywords(fields: Sequence[Field]) -> list[str]:
    return [field.standard_name or field.long_name.replace(",", "") for field in fields if field.part != "status"]


def _references(fields: Sequence[Field], citations: Iterable[str]) -> list[str]:
    keys = dict.fromkeys([*citations, *(key for field in fields for key in field.citations)])
    return [" ".join([CITATIONS[key].text, *([f"https://doi.org/{CITATIONS[key].doi}"] if CITATIONS[key].doi else [])])
            for key in keys]


def _utc(now: datetime) -> str:
    return now.astimezone(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
