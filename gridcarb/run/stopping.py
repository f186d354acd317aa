"""Being asked to stop: SIGTERM ends a run as tidily as Ctrl-C does."""

from __future__ import annotations

import signal
import threading
from collections.abc import Iterator
from contextlib import contextmanager


class Terminated(SystemExit):
    """The process was asked to end by SIGTERM; it leaves with the exit code shells know for that, 143."""

    def __init__(self) -> None:
        super().__init__(128 + signal.SIGTERM)


@contextmanager
def ends_tidily() -> Iterator[None]:
    """Within, SIGTERM raises `Terminated` in the main thread.

    Nothing changes outside the main thread, or where the caller handles SIGTERM already.
    """
    in_charge = threading.current_thread() is threading.main_thread()
    if not in_charge or signal.getsignal(signal.SIGTERM) is not signal.SIG_DFL:
        yield
        return
    signal.signal(signal.SIGTERM, _stop)
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, signal.SIG_DFL)


def why_it_ended(error: BaseException) -> str:
    """What ended a run, in words."""
    if isinstance(error, Terminated):
        return "stopped by SIGTERM"
    if isinstance(error, KeyboardInterrupt):
        return "stopped by Ctrl-C"
    return str(error)


def _stop(*_: object) -> None:
    raise Terminated
