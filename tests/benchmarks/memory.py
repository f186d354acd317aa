"""Peak resident memory of `gridcarb run` in its default configuration, beside what its plan projects.

    python -m tests.benchmarks.memory [long] [zarr] [netcdf] [processes] [--steps N] [--rows N] [--levels N] [--months N]

`long` holds a run of N steps of a 1 degree grid against one of 10 N. `zarr` and `netcdf` run a quarter-degree map of 75
levels, in chunks of whole water columns and in deflated layers of the whole map. `processes` does `long` with processes.
All write the store, the NetCDF file and a map. The default is all but `processes`.

The peak is that of the largest process of a run, as the system keeps it. `bound` is what the plan allows: the program, and
a block for each worker of that process.
"""

from __future__ import annotations

import argparse
import itertools
import json
import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cache
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import xarray as xr
import zarr

from synthetic_grids import grids
from synthetic_grids.clothes import FILL, Clothes, dress

COARSE = (45, 60)
"""Rows and columns the invented ocean is sampled on."""

FIELDS = ("ph_total_scale", "co2_partial_pressure", "carbonate_ion", "aragonite_saturation")
FIGURES = ({"kind": "map", "field": "aragonite_saturation", "depth": 100, "time": "first"},)

_TO_BYTES = 1 if sys.platform == "darwin" else 1024
"""From the system's unit of resident memory."""

_PEAK = """
import resource, subprocess, sys
code = subprocess.run(sys.argv[1:], stdout=sys.stderr).returncode
print(resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss)
sys.exit(code)
"""
"""A small process between: a child begins its account with what its parent has resident."""


@dataclass(frozen=True)
class Layout:
    """A grid of the invented ocean, and the chunks of its input.

    rows : rows of the map that are there, about the equator.
    whole : rows from pole to pole.
    chunk : levels, rows and columns of a chunk; its time is one step.
    """

    steps: int
    levels: int
    rows: int
    columns: int
    whole: int
    chunk: tuple[int, int, int]

    @property
    def shape(self) -> tuple[int, int, int, int]:
        return self.steps, self.levels, self.rows, self.columns

    @property
    def south(self) -> int:
        """The first row that is there."""
        return (self.whole - self.rows) // 2

    def axes(self) -> xr.Dataset:
        """Coordinates with their attributes; time in months of thirty days."""
        map_, depth = grids.rectilinear(self.whole, self.columns), _levels(self.levels)
        here = map_.merge(depth).isel(lat=slice(self.south, self.south + self.rows)).reset_coords(drop=True)
        months = xr.Variable("time", 15.0 + 30.0 * np.arange(self.steps), {
            "units": "days since 0001-01-01", "calendar": "360_day", "standard_name": "time", "axis": "T"})  # fmt: skip
        return here.drop_vars("bnds", errors="ignore").assign_coords(time=months)

    def piece(self, values: np.ndarray, place: tuple[slice, slice, slice]) -> np.ndarray:
        """A piece of one month, each cell that of the coarse grid about it."""
        levels, rows, columns = (np.arange(part.start, part.stop) for part in place)
        north = (rows + self.south) * COARSE[0] // self.whole
        east = columns * COARSE[1] // self.columns
        return values[np.ix_(levels, north, east)]

    def pieces(self) -> list[tuple[slice, slice, slice]]:
        """The places of the chunks of one month."""
        cuts = [[slice(start, min(start + length, size)) for start in range(0, size, length)]
                for size, length in zip(self.shape[1:], self.chunk, strict=True)]  # fmt: skip
        return list(itertools.product(*cuts))


ONE_DEGREE = Layout(steps=12, levels=30, rows=180, columns=360, whole=180, chunk=(30, 60, 120))
QUARTER_DEGREE = Layout(steps=1, levels=75, rows=1080, columns=1440, whole=1080, chunk=(75, 135, 180))


def _levels(count: int) -> xr.Dataset:
    """Depths down to 5600 m, wider apart the deeper."""
    return grids.levels(5600.0 * np.linspace(0.0, 1.0, count + 1) ** 2)


@cache
def coarse_month(levels: int) -> xr.Dataset:
    """One month on the coarse grid, in the clothes of a model."""
    map_, depth, year = grids.rectilinear(*COARSE), _levels(levels), xr.DataArray(2010.0)
    truth = grids.sample(map_["lon"], map_["lat"], depth["lev"], year)
    return dress(truth, depth["lev"], map_["lat"], Clothes(salinity="practical"))


def write_zarr(path: Path, layout: Layout) -> Path:
    """A store, chunk by chunk; its first month is written, the others are hard links."""
    month = coarse_month(layout.levels)
    layout.axes().to_zarr(path, mode="w", consolidated=False, encoding={"time": {"chunks": (layout.steps,)}})
    group = zarr.open_group(path, mode="r+")
    for name, variable in month.data_vars.items():
        field = group.create_array(
            str(name), shape=layout.shape, chunks=(1, *layout.chunk), dtype="f4", fill_value=FILL,
            dimension_names=("time", "lev", "lat", "lon"), attributes=_attributes(variable),
        )
        for place in layout.pieces():
            field[(0, *place)] = layout.piece(variable.values, place)
        first = path / str(name) / "c" / "0"
        files = [file for file in first.rglob("*") if file.is_file()]
        for step in range(1, layout.steps):
            for file in files:
                link = first.with_name(str(step)) / file.relative_to(first)
                link.parent.mkdir(parents=True, exist_ok=True)
                os.link(file, link)
    return path


def write_netcdf(path: Path, layout: Layout) -> Path:
    """A deflated NetCDF-4 file, chunk by chunk; every month is written."""
    month, axes = coarse_month(layout.levels), layout.axes()
    with netCDF4.Dataset(path, "w") as file:
        for dim, size in zip(("time", "lev", "lat", "lon"), layout.shape, strict=True):
            file.createDimension(dim, size)
            file.createVariable(dim, "f8", (dim,))[:] = axes[dim].values
            file[dim].setncatts({key: value for key, value in axes[dim].attrs.items() if key != "bounds"})
        for name, variable in month.data_vars.items():
            field = file.createVariable(str(name), "f4", ("time", "lev", "lat", "lon"), fill_value=FILL,
                                        chunksizes=(1, *layout.chunk), compression="zlib", complevel=1)  # fmt: skip
            field.setncatts(_attributes(variable))
            for step, place in itertools.product(range(layout.steps), layout.pieces()):
                field[(step, *place)] = layout.piece(variable.values, place)
    return path


def _attributes(variable: xr.DataArray) -> dict[str, Any]:
    attrs = {str(key): value for key, value in variable.attrs.items() if key != "_FillValue"}
    return {key: value.item() if isinstance(value, np.generic) else value for key, value in attrs.items()}


@dataclass(frozen=True)
class Measured:
    """What a run took.

    peak : most bytes its largest process had resident.
    blocks, projected, program, kept, workers : of its plan; bytes of one block, of the program, of chunks that are kept.
    """

    peak: int
    blocks: int
    projected: int
    program: int
    kept: int
    workers: int
    seconds: float

    @property
    def bound(self) -> int:
        """The most bytes the plan allows one process."""
        return self.program + self.kept + self.workers * self.projected


def measured(source: Path, folder: Path, *words: str, **sections: Mapping[str, Any]) -> Measured:
    """One run of a recipe in a process of its own, default configuration but for `sections` and the `words` behind it."""
    recipe = folder / f"{source.stem}.yaml"
    recipe.write_text(json.dumps({
        "recipe": 1, "inputs": {"files": str(source)}, "reading": {"density": "1026 kg m-3"},
        "chemistry": {"fields": FIELDS}, "output": {"folder": str(folder / "result"), "replace": True}, "figures": FIGURES,
        **sections,
    }))  # fmt: skip
    gridcarb = [sys.executable, "-c", "from gridcarb.cli.main import main; main()"]
    plan = json.loads(_output([*gridcarb, "plan", str(recipe), "--json", *words]))
    begun = time.perf_counter()
    peak = peak_of([*gridcarb, "run", str(recipe), "--quiet", *words])
    seconds = time.perf_counter() - begun
    memory = plan["memory"]
    alone = "processes" in words
    return Measured(peak, plan["blocks"]["count"], memory["projected_per_task"], memory["program"],
                    memory["kept_per_process"], 1 if alone else memory["workers"], seconds)  # fmt: skip


def peak_of(command: list[str]) -> int:
    """Most bytes a command, or any process it has started and waited for, had resident."""
    return int(_output([sys.executable, "-c", _PEAK, *command])) * _TO_BYTES


def _output(command: list[str]) -> str:
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout[-2000:] + done.stderr[-4000:]
    return done.stdout


def report(name: str, layout: Layout, found: Measured) -> None:
    """One row of the table."""
    grid = " x ".join(map(str, layout.shape))
    print(f"{name:10s} {grid:>22s} {found.blocks:7,} {found.peak / 1e6:9.0f} {found.projected / 1e6:10.0f} "
          f"{found.bound / 1e6:9.0f} {found.seconds:8.0f}", flush=True)  # fmt: skip


def growth(name: str, folder: Path, steps: int, *words: str) -> None:
    """Rows of N and 10 N steps, and by how much the peak grew."""
    peaks = []
    for count in (steps, 10 * steps):
        layout = replace(ONE_DEGREE, steps=count)
        found = measured(write_zarr(folder / f"{name}_{count}.zarr", layout), folder, *words)
        report(name, layout, found)
        peaks.append(found.peak)
    print(f"{name:10s} ten times the steps: {peaks[1] / peaks[0] - 1:+.1%}")


def main() -> None:
    """Print the table."""
    ask = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    ask.add_argument("what", nargs="*", choices=["long", "zarr", "netcdf", "processes"], default=["long", "zarr", "netcdf"])
    ask.add_argument("--steps", type=int, default=ONE_DEGREE.steps)
    for key in ("rows", "levels", "months"):
        ask.add_argument(f"--{key}", type=int, default=getattr(QUARTER_DEGREE, "steps" if key == "months" else key))
    told = ask.parse_args()
    quarter = replace(QUARTER_DEGREE, steps=told.months, levels=told.levels, rows=told.rows)
    print("input       time, levels, y, x     blocks   peak MB   block MB  bound MB  seconds")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        if "long" in told.what:
            growth("long", folder, told.steps)
        if "processes" in told.what:
            growth("processes", folder, told.steps, "--engine", "processes")
        if "zarr" in told.what:
            columns = replace(quarter, chunk=(told.levels, *QUARTER_DEGREE.chunk[1:]))
            report("zarr", columns, measured(write_zarr(folder / "quarter.zarr", columns), folder))
        if "netcdf" in told.what:
            layers = replace(quarter, chunk=(1, told.rows, quarter.columns))
            report("netcdf", layers, measured(write_netcdf(folder / "quarter.nc", layers), folder))


if __name__ == "__main__":
    main()
