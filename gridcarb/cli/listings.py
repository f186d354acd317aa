"""`gridcarb fields` and `gridcarb keys`: what can be asked for, and with which words."""

from __future__ import annotations

from dataclasses import asdict
from itertools import groupby
from typing import TYPE_CHECKING

import click

from gridcarb.cli import show
from gridcarb.cli.terminal import debug_option, json_option, terminal
from gridcarb.errors import UnknownWordError, did_you_mean

if TYPE_CHECKING:
    from gridcarb.fields import Field
    from gridcarb.recipe import Row

_PARTS = {"input": "Read from your files, or following from them", "derived": "Computed", "status": "Told beside them"}


@click.command()
@click.argument("key", required=False)
@json_option
@debug_option
def fields(key: str | None) -> None:
    """List the catalogue of fields, or tell all about the field KEY.

    \b
    gridcarb fields
    gridcarb fields aragonite_saturation
    """
    import gridcarb.chemistry  # noqa: F401  puts the derived fields into the catalogue
    from gridcarb.fields import FIELDS

    if key is not None:
        field = FIELDS[key]
        if terminal().as_json:
            show.document(_record(field))
        else:
            show.heading(field.key)
            show.table(_portrait(field))
    elif terminal().as_json:
        show.document([_record(field) for field in FIELDS.values()])
    else:
        for part, title in _PARTS.items():
            show.heading(title)
            show.table([(f.key, f.units, f.long_name) for f in FIELDS.values() if f.part == part])


def _record(field: Field) -> dict[str, object]:
    return {name: value for name, value in asdict(field).items() if name != "ink"} | {
        "references": _references(field), "flags": dict(field.flags),
    }


def _references(field: Field) -> list[str]:
    from gridcarb.citations import CITATIONS

    cited = (CITATIONS[key] for key in field.citations)
    return [f"{citation.text} doi:{citation.doi}" if citation.doi else citation.text for citation in cited]


def _portrait(field: Field) -> list[tuple[str, str]]:
    low, high = field.sane_range
    rows = [
        ("name", field.long_name), ("units", field.units), ("CF standard name", field.standard_name or "none in the table"),
        ("scale", field.scale or ""), ("one value for each", field.extent), ("usual range", f"{low:g} to {high:g}"),
        ("note", field.comment), ("values", ", ".join(f"{value} {word}" for value, word in field.flags)),
    ]
    return [row for row in rows if row[1]] + [("source", text) for text in _references(field)]


@click.command()
@click.argument("section", required=False)
@json_option
@debug_option
def keys(section: str | None) -> None:
    """List every key a recipe may hold, or those of one SECTION.

    \b
    gridcarb keys
    gridcarb keys output
    """
    from gridcarb.recipe import reference

    rows = list(reference())
    if section is not None:
        chosen = [row for row in rows if row.key == section or row.key.startswith((f"{section}.", f"{section}["))]
        if not chosen:
            mend = did_you_mean(section, [row.key for row in rows])
            raise UnknownWordError(f"there is no section or key '{section}' in a recipe", mend=mend)
        rows = chosen
    if terminal().as_json:
        show.document([asdict(row) for row in rows])
        return
    for _, group in groupby(rows, key=lambda row: row.key.split(".")[0].split("[")[0]):
        click.echo()
        for row in group:
            click.echo(click.style(row.key, bold=True) + f"  {_value(row)}")
            show.paragraph(row.description, "      ")


def _value(row: Row) -> str:
    if row.required:
        return f"{row.type}, must be given"
    return f"{row.type}, default {row.default}" if row.default else row.type
