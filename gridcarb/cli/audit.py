"""`gridcarb audit`: everything about files, or about the inputs of a recipe, before anything is spent."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from gridcarb.cli import faces, show
from gridcarb.cli.terminal import ASSUMED, debug_option, json_option, quiet_option, terminal
from gridcarb.errors import InputError, OutputError, UnknownWordError

if TYPE_CHECKING:
    from gridcarb.cli.faces import Audit

_RECIPES = (".yaml", ".yml")


@click.command()
@click.argument("files", nargs=-1, required=True, metavar="FILES...|RECIPE")
@click.option("--input", "inputs", multiple=True, metavar="PATH", help=(
    "With a recipe: a file, a glob in quotes, or a Zarr store to look at instead of its `inputs: files`."))
@click.option("--recipe-out", "place", type=click.Path(path_type=Path), metavar="FILE", help=(
    "Write a recipe for what was found: ready to edit, what was assumed stated, what is open as questions."))
@click.option("--strict", is_flag=True, help=f"Exit code {ASSUMED} if anything was assumed.")
@quiet_option
@json_option
@debug_option
def audit(files: tuple[str, ...], inputs: tuple[str, ...], place: Path | None, strict: bool) -> None:
    """Tell what lies in FILES, or in the inputs of RECIPE, and how it would be read.

    Every variable and the role it can play; grid, levels and times; units, kinds of temperature and salinity, density,
    masks; how the files are laid out. Each finding is fine, assumed (with the line that states it) or a stop (with the
    cure). Only headers and small samples are read.

    \b
    gridcarb audit 'model/*.nc' --recipe-out my_recipe.yaml
    gridcarb audit my_recipe.yaml

    Exit code 3 if there is a stop, else 0.
    """
    if place is not None and place.exists():
        raise OutputError("there is a file of that name already", where=str(place), mend="give --recipe-out another name")
    found = _audit(files, inputs)
    shown = found.report()
    if terminal().as_json:
        show.document(shown.as_dict())
    elif not terminal().quiet:
        show.report(shown)
    if place is not None:
        _write(place, found.starter(place))
    worst = found.worst
    code = InputError.exit_code if worst == "stop" else ASSUMED if strict and worst == "assumed" else 0
    click.get_current_context().exit(code)


def _audit(files: tuple[str, ...], inputs: tuple[str, ...]) -> Audit:
    from gridcarb.recipe import load

    if not any(name.lower().endswith(_RECIPES) for name in files):
        return faces.audit_files([*files, *inputs])
    if len(files) > 1:
        raise UnknownWordError("a recipe is audited alone", where=" ".join(files[:3]),
                               mend="give one recipe (and --input PATH for other files), or files alone")
    return faces.audit_recipe(load(Path(files[0]), inputs=inputs))


def _write(place: Path, text: str) -> None:
    try:
        place.write_text(text, encoding="utf-8")
    except OSError as error:
        raise OutputError(f"the recipe cannot be written ({error.strerror})", where=str(place),
                          mend="give --recipe-out a file in a folder that is there and may be written") from error
    click.echo(f"a recipe to begin with: {place}", err=True)
