"""Processes that tests start and watch, and a small ocean on disk for them to work on."""

from __future__ import annotations

import re
import signal
import subprocess
import time
from dataclasses import dataclass
from pathlib import Path

from synthetic_grids import grids
from synthetic_grids.clothes import Clothes, dress

COMMAND_LINE = """
import signal
signal.signal(signal.SIGINT, signal.default_int_handler)  # which a shell may have switched off for background jobs
from gridcarb.cli.main import main
main()
"""


def write_small_ocean(path: Path, rows: int, columns: int) -> Path:
    """Six months on rows x columns of 5 levels."""
    grid, depth = grids.rectilinear(rows, columns), grids.levels((0.0, 20.0, 100.0, 500.0, 2000.0, 5000.0))
    time_axis = grids.months(2010, 2010, "noleap").isel(time=slice(6))
    truth = grids.sample(grid["lon"], grid["lat"], depth["lev"], time_axis["year"])
    dressed = dress(truth, depth["lev"], grid["lat"], Clothes(salinity="practical")).drop_vars("year", errors="ignore")
    whole = dressed.assign_coords(grid.merge(depth).merge(time_axis[["time"]]).coords)
    whole.to_netcdf(path, engine="netcdf4", encoding={name: {"_FillValue": None} for name in whole.coords})
    return path


@dataclass
class Watched:
    """A process with what it has said so far.

    patience : seconds after which a process that does not do what is waited for has failed the test.
    """

    process: subprocess.Popen[str]
    log: Path
    patience: float

    @property
    def said(self) -> str:
        return self.log.read_text()

    def wait_for(self, pattern: str) -> None:
        """Wait until it has said something that matches; fail if it ends or takes too long."""
        until = time.monotonic() + self.patience
        while not re.search(pattern, self.said):
            assert self.process.poll() is None, f"ended before it said {pattern!r}:\n{self.said}"
            assert time.monotonic() < until, f"never said {pattern!r}:\n{self.said}"
            time.sleep(0.01)

    def wait(self) -> int:
        """The exit code."""
        return self.process.wait(self.patience)

    def end(self, number: int = signal.SIGKILL) -> int:
        """Send a signal to this process, if it still lives; its exit code."""
        if self.process.poll() is None:
            self.process.send_signal(number)
        return self.wait()
