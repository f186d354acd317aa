"""`gridcarb status` and `gridcarb verify`: how a run stands, and whether a result is as it was written."""

from __future__ import annotations

from pathlib import Path

import click

from gridcarb.cli import faces, progress, show
from gridcarb.cli.terminal import debug_option, json_option, quiet_option, terminal
from gridcarb.errors import DamageError


@click.command()
@click.argument("result", type=click.Path(path_type=Path))
@json_option
@debug_option
def status(result: Path) -> None:
    """Tell how the run of RESULT stands: running, interrupted, failed or complete; what is done, how fast, what is left.

    It reads what lies on the disk and disturbs nobody.
    """
    _tell(faces.status(result).report())


@click.command()
@click.argument("result", type=click.Path(path_type=Path))
@click.option("--sample", type=click.IntRange(min=0), default=3, show_default=True, metavar="N", help=(
    "Blocks made again from the inputs and compared to the last bit."))
@click.option("--repair", is_flag=True, help="Make again what is damaged, and just that.")
@quiet_option
@json_option
@debug_option
def verify(result: Path, sample: int, repair: bool) -> None:
    """Hold a finished RESULT against what was noted when it was written.

    Every block must be there, every chunk and file byte for byte as it was written, the NetCDF file equal to the store; a
    sample is made again from the inputs. What is damaged is told exactly.
    """
    wishes = terminal()
    watcher = progress.watcher(quiet=wishes.quiet or wishes.as_json)
    try:
        verdict = faces.verify(result, watcher, sample=sample, repair=repair)
    finally:
        watcher.stop()
    _tell(verdict.report())
    if verdict.damages:
        count, first = len(verdict.damages), verdict.damages[0]
        told = f"{count:,} things are not as they were written, first" if count > 1 else "one thing is not as written"
        raise DamageError(f"{told}: {first.place}: {first}", where=str(result), mend=_mend(verdict, result, repair=repair))


def _mend(verdict: faces.Verdict, result: Path, *, repair: bool) -> str:
    if verdict.not_again:
        return f"it cannot be made again here: {'; '.join(verdict.not_again)}. Restore that, or run the recipe anew"
    if repair:
        return "what is left cannot be mended from the inputs; run the recipe again with --replace"
    return f"gridcarb verify {result} --repair"


def _tell(shown: faces.Report) -> None:
    if terminal().as_json:
        show.document(shown.as_dict())
    elif not terminal().quiet:
        show.report(shown)
