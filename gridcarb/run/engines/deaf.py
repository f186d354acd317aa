"""For worker processes of our own: a Ctrl-C reaches everything the terminal started, but it is the run that ends them."""

from __future__ import annotations

import signal


def dask_setup(_: object) -> None:
    """Called by dask in each worker process when it starts."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
