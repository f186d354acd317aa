"""The door every command goes through: errors become three lines and an exit code, never a traceback."""

from __future__ import annotations

import signal
import traceback
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, TypeVar

import click

from gridcarb.cli import show
from gridcarb.errors import GridcarbError

ASSUMED = 9
"""Of `audit --strict` when something was assumed."""

INTERRUPTED = 128 + signal.SIGINT
TERMINATED = 128 + signal.SIGTERM
Command = TypeVar("Command", bound=Callable[..., Any])


@dataclass
class Terminal:
    """How the user wants to be spoken to; set by the options, read by the commands and the door."""

    as_json: bool = False
    quiet: bool = False
    debug: bool = False


def terminal() -> Terminal:
    """The wishes of the user who called the present command."""
    return click.get_current_context().find_root().ensure_object(Terminal)


class Door(click.Group):
    """A group of commands that turns what goes wrong into words."""

    def invoke(self, ctx: click.Context) -> Any:
        """Run the command; what gridcarb raises ends in its exit code."""
        try:
            return super().invoke(ctx)
        except (click.ClickException, click.exceptions.Exit, click.Abort, BrokenPipeError):
            raise
        except KeyboardInterrupt:
            _trace()
            click.echo("stopped by Ctrl-C; only a complete result bears its final name", err=True)
            code = INTERRUPTED
        except GridcarbError as error:
            _trace()
            show.error(error, as_json=terminal().as_json)
            code = error.exit_code
        except Exception as error:
            _trace()
            unforeseen = GridcarbError(
                f"gridcarb failed in a way it did not foresee ({type(error).__name__}: {error})",
                mend="run the same with --debug to see where, and report it",
            )
            show.error(unforeseen, as_json=terminal().as_json)
            code = unforeseen.exit_code
        ctx.exit(code)


def _trace() -> None:
    if terminal().debug:
        click.echo(traceback.format_exc(), err=True)


def _wish(name: str) -> Callable[[click.Context, click.Parameter, bool], None]:
    def note(ctx: click.Context, parameter: click.Parameter, value: bool) -> None:
        if value:
            setattr(ctx.find_root().ensure_object(Terminal), name, True)

    return note


def _option(flag: str, name: str, text: str) -> Callable[[Command], Command]:
    return click.option(flag, is_flag=True, expose_value=False, callback=_wish(name), help=text)


json_option = _option("--json", "as_json", "One JSON document on standard output; errors as JSON on standard error.")
quiet_option = _option("--quiet", "quiet", "Print nothing but errors.")
debug_option = _option("--debug", "debug", "Show where in the program an error arose.")


def exit_codes() -> str:
    """The exit codes, read off the error classes."""
    meanings: dict[int, list[str]] = {}
    for family in GridcarbError.__subclasses__():
        line = (family.__doc__ or "").strip().partition("\n")[0].rstrip(".").partition(";")[0]
        meanings.setdefault(family.exit_code, []).append(line[:1].lower() + line[1:])
    lines = ["0    all is well", f"{GridcarbError.exit_code}    anything not listed here"]
    for code, words in sorted(meanings.items()):
        lines += [f"{code}    {words[0]}", *(f"     or {word}" for word in words[1:])]
    lines.append(f"{ASSUMED}    audit --strict: something was assumed")
    lines += [f"{INTERRUPTED}  stopped by Ctrl-C", f"{TERMINATED}  stopped by SIGTERM"]
    return "\b\nExit codes:\n" + "\n".join(f"  {line}" for line in lines)
