"""`gridcarb run` and `gridcarb plan`."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import click

from gridcarb.cli import faces, progress, show
from gridcarb.cli.terminal import debug_option, json_option, quiet_option, terminal

if TYPE_CHECKING:
    from gridcarb.recipe import Recipe
    from gridcarb.run.watching import Watcher

Command = TypeVar("Command", bound=Callable[..., Any])

_SPOKEN = (
    click.argument("recipe", type=click.Path(path_type=Path)),
    click.option("--input", "inputs", multiple=True, metavar="PATH", help=(
        "A file, a glob in quotes, or a Zarr store to read instead of the recipe's `inputs: files`; "
        "may be given several times. Relative to the working directory.")),
    click.option("--result", "folder", metavar="FOLDER", help=(
        "The result folder, instead of the recipe's `output: folder`. Relative to the working directory.")),
    click.option("--replace", is_flag=True, help="Replace a result of that name once the new one is complete."),
    click.option("--engine", metavar="KIND", help=(
        "Who does the blocks: threads, processes, hosts, queue, or the address of a dask scheduler (tcp://host:8786).")),
    click.option("--workers", type=int, metavar="N", help="Blocks computed at the same time."),
    click.option("--memory", metavar="TEXT", help="Memory all workers share, such as '2 GB'."),
    quiet_option,
    json_option,
    debug_option,
)


def _spoken(command: Command) -> Command:
    """The argument and the options that run and plan share, so that a plan can be made of just what will be run."""
    for decorate in reversed(_SPOKEN):
        command = decorate(command)
    return command


@click.command()
@_spoken
@click.option("--rehearse", type=click.IntRange(min=1), is_flag=False, flag_value=3, metavar="[N]", help=(
    "Do N blocks of the run aside (3 if no number is given; write it after RECIPE) and tell from them the core-hours, "
    "hours and bytes of the whole."))
def plan(*, rehearse: int | None, **words: Any) -> None:
    """Show what RECIPE would do, without doing it.

    Reads headers only: which files and variables are taken and how they are understood, blocks, bytes in and out, memory
    for each worker. The checks are those of a run, so a plan without an error is a run that can begin.
    With --quiet only the exit code tells.

    \b
    gridcarb plan my_recipe.yaml --rehearse     # a minute or so more: what the run will cost
    """
    prepared = faces.prepare(_recipe(**words))
    if rehearse is None:
        _tell(prepared.report())
        return
    watcher = _watcher()
    try:
        rehearsal = faces.rehearse(prepared, watcher, rehearse)
    finally:
        watcher.stop()
    _tell(rehearsal.report())


@click.command()
@_spoken
@click.option("--resume", is_flag=True, help="Go on where an interrupted run of this recipe ended.")
@click.option("--anew", is_flag=True, help="Begin again, even if an interrupted run has left finished blocks.")
def run(*, resume: bool, anew: bool, **words: Any) -> None:
    """Do what RECIPE says.

    \b
    gridcarb run recipes/first_look.yaml
    gridcarb run global_state.yaml --input 'model/*.nc' --result results/model

    The result folder appears when the run is complete, never before. What an interrupted run has finished is kept beside
    it, and --resume does only the rest.
    """
    if resume and anew:
        raise click.UsageError("--resume and --anew exclude each other")
    prepared = faces.prepare(_recipe(**words))
    watcher = _watcher()
    try:
        outcome = faces.conduct(prepared, watcher, "resume" if resume else "anew" if anew else "new")
    finally:
        watcher.stop()
    _tell(outcome.summary())


def _watcher() -> Watcher:
    wishes = terminal()
    return progress.watcher(quiet=wishes.quiet or wishes.as_json)  # a machine reads standard error too


def _recipe(recipe: Path, **words: Any) -> Recipe:
    from gridcarb.recipe import load

    return load(recipe, **words)


def _tell(shown: faces.Report) -> None:
    if terminal().as_json:
        show.document(shown.as_dict())
    elif not terminal().quiet:
        show.report(shown)
