"""The command `gridcarb`. Light to import: what is heavy is imported by the command that needs it."""

from __future__ import annotations

import click

from gridcarb.cli.audit import audit
from gridcarb.cli.listings import fields, keys
from gridcarb.cli.results import status, verify
from gridcarb.cli.terminal import Door, debug_option, exit_codes
from gridcarb.cli.work import plan, run
from gridcarb.held_memory import share_one_heap

_SETTINGS = {"help_option_names": ["-h", "--help"], "max_content_width": 100}


@click.group(cls=Door, epilog=exit_codes(), context_settings=_SETTINGS)
@click.version_option(package_name="gridcarb", prog_name="gridcarb", message="%(prog)s %(version)s")
@debug_option
def main() -> None:
    """Marine carbonate chemistry on gridded ocean data.

    A recipe names the files and the fields wanted; gridcarb computes them cell by cell and writes Zarr, NetCDF and maps.

    \b
    gridcarb audit 'model/*.nc'               what lies in files, and how it would be read
    gridcarb plan recipes/first_look.yaml     what would be done, from headers only
    gridcarb run recipes/first_look.yaml      do it
    gridcarb status results/first_look        how a run stands
    gridcarb verify results/first_look        whether a result is as it was written
    gridcarb fields                           what can be computed
    gridcarb keys                             what a recipe may say
    """
    share_one_heap()


for command in (run, plan, audit, status, verify, fields, keys):
    main.add_command(command)
