"""Laying words out: reports, listings and errors, for people or (as JSON) for machines."""

from __future__ import annotations

import json
import shutil
import textwrap
from collections.abc import Iterable, Sequence

import click

from gridcarb.cli.faces import Report
from gridcarb.errors import GridcarbError, Notice, RecipeError

INDENT = "  "


def document(content: object) -> None:
    """One JSON document on standard output."""
    click.echo(json.dumps(content, indent=2, ensure_ascii=False, allow_nan=False))


def report(shown: Report) -> None:
    """A report: its sections, then what was assumed for the user."""
    for section in shown.sections:
        heading(section.title)
        table(section.rows)
    if shown.notices:
        heading("Decided for you (each can be stated in the recipe)")
        for notice in shown.notices:
            _notice(notice)


def heading(title: str) -> None:
    """A title with an empty line above it."""
    click.echo()
    click.secho(title, bold=True)


def table(rows: Iterable[Sequence[str]]) -> None:
    """Rows of equally many cells in columns; the last column is wrapped to the width of the terminal."""
    lines = list(rows)
    widths = [max(map(len, column)) for column in zip(*lines, strict=True)][:-1]
    for *cells, last in lines:
        start = INDENT + "".join(cell.ljust(width + 2) for cell, width in zip(cells, widths, strict=True))
        click.echo(_wrapped(last, start, " " * len(start)) or start.rstrip())


def paragraph(text: str, indent: str = INDENT) -> None:
    """A text wrapped to the width of the terminal."""
    click.echo(_wrapped(text, indent, indent))


def error(fault: GridcarbError, *, as_json: bool) -> None:
    """An error on standard error: where, what, how to mend it; every fault of a recipe."""
    if not as_json:
        click.echo(str(fault), err=True)
        return
    content = _fault(fault)
    if fault.others:
        content["others"] = [_fault(other) for other in fault.others]
    click.echo(json.dumps({"error": content}, indent=2, ensure_ascii=False), err=True)


def _fault(fault: GridcarbError) -> dict[str, object]:
    content: dict[str, object] = {
        "kind": type(fault).__name__, "where": fault.where, "what": fault.what, "mend": fault.mend,
        "exit_code": fault.exit_code,
    }
    if isinstance(fault, RecipeError):
        content["faults"] = [
            {"line": each.line, "key": each.key, "what": each.what, "mend": each.mend} for each in fault.faults
        ]
    return content


def _notice(notice: Notice) -> None:
    click.echo(_wrapped(notice.text, f"{INDENT}- ", f"{INDENT}  "))
    if notice.state:
        click.echo(f"{INDENT}    to state it: {notice.state}")


def _wrapped(text: str, first: str, rest: str) -> str:
    width = min(max(shutil.get_terminal_size((100, 24)).columns, 60), 120)
    return textwrap.fill(
        text, max(width, len(rest) + 20), initial_indent=first, subsequent_indent=rest,
        break_long_words=False, break_on_hyphens=False,
    )
