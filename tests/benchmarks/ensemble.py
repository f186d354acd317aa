"""What a full-resolution ensemble would cost, as `gridcarb plan --rehearse` tells it.

    python -m tests.benchmarks.ensemble [--blocks N] [--readme]

The input is a quarter-degree ocean on disk: 1440 x 1080 cells, 75 levels, 150 years of months, a Zarr store in chunks of a
month, the whole column and 135 x 180 columns. One month of the invented ocean is written, in model clothes; all other
months are links to it, so that the store takes the room of one. The plan is made and rehearsed by the command, and the
table is printed; `--readme` puts it into the README as well. It needs an idle machine and a few minutes.

What it cannot show: reading is from memory, for one month is soon there, and the invented ocean is smoother than a model's,
so its bytes are rather few.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
import tempfile
from collections.abc import Mapping
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
import zarr

from synthetic_grids import grids
from synthetic_grids.clothes import FILL, Clothes, dress
from tests.benchmarks.end_to_end import FIELDS

ROWS, COLUMNS, YEARS, MEMBERS = 1080, 1440, (1950, 2099), 10
CHUNK = (1, 75, 135, 180)
EDGES = np.concatenate([np.linspace(0, 200, 21)[:-1], np.geomspace(200, 6000, 56)])
CORES = (2, 16, 64, 256)
README = Path(__file__).parents[2] / "README.md"
START = "<!-- ensemble: written by `python -m tests.benchmarks.ensemble --readme` -->\n"
END = "<!-- end of ensemble -->"


def ocean(folder: Path, rows: int = ROWS, columns: int = COLUMNS, years: tuple[int, int] = YEARS) -> Path:
    """The store: `rows` x `columns`, 75 levels, the months of these years, of which only the first lies there."""
    grid, depth, months = grids.rectilinear(rows, columns), grids.levels(EDGES), grids.months(*years, "noleap")
    place = folder / "ocean.zarr"
    group = zarr.open_group(place, mode="w-", zarr_format=3)
    for name, variable in grid.merge(depth).merge(months[["time", "time_bnds"]]).variables.items():
        made = group.create_array(str(name), shape=variable.shape, dtype=variable.dtype, chunks=variable.shape,
                                  dimension_names=variable.dims, attributes=variable.attrs)
        made[...] = variable.values

    def dressed(rows: slice, columns: slice) -> xr.Dataset:
        latitude, longitude = grid["lat"][rows], grid["lon"][columns]
        truth = grids.sample(longitude, latitude, depth["lev"], months["year"][:1])
        return dress(truth, depth["lev"], latitude, Clothes())

    fill = float(np.float32(FILL))  # to the bit what a field of single precision holds
    shape, one = (months.sizes["time"], depth.sizes["lev"], rows, columns), dressed(slice(1), slice(1))
    for name, field in one.data_vars.items():
        attributes = {key: value for key, value in field.attrs.items() if key not in ("_FillValue", "missing_value")}
        group.create_array(str(name), shape=shape, dtype="f4", chunks=CHUNK, fill_value=fill, dimension_names=field.dims,
                           attributes={**attributes, "missing_value": fill})

    def put(corner: tuple[int, int]) -> None:
        box = tuple(slice(at, at + length) for at, length in zip(corner, CHUNK[2:], strict=True))
        for name, field in dressed(*box).data_vars.items():
            group[str(name)][(slice(1), slice(None), *box)] = field.values

    corners = [(row, column) for row in range(0, rows, CHUNK[2]) for column in range(0, columns, CHUNK[3])]
    with ThreadPoolExecutor(os.cpu_count()) as pool:
        list(pool.map(put, corners))
    for name in one.data_vars:
        chunks = place / str(name) / "c"
        for step in range(1, shape[0]):
            (chunks / str(step)).symlink_to("0", target_is_directory=True)
    return place


def rehearsed(folder: Path, source: Path, blocks: int) -> dict[str, Any]:
    """What the command tells of it."""
    recipe = folder / "ensemble.yaml"
    recipe.write_text(
        f"recipe: 1\ninputs: {{files: {source}}}\nreading: {{salinity: practical, density: 1026 kg m-3}}\n"
        f"chemistry: {{fields: [{', '.join(FIELDS)}]}}\noutput: {{folder: result}}\n"
    )
    command = [str(Path(sys.executable).with_name("gridcarb")), "plan", str(recipe), "--rehearse", str(blocks), "--json"]
    told: dict[str, Any] = json.loads(subprocess.run(command, stdout=subprocess.PIPE, text=True, check=True).stdout)
    return told


def table(told: Mapping[str, Any]) -> str:
    """One member and the ensemble as the rows of a table, from what the plan tells of one member."""
    cost = told["cost"]
    cells, hours = float(np.prod(list(told["grid"]["sizes"].values()))), cost["core_hours"]
    rate, low, high = (cost["cells_per_second"][end] / 1e6 for end in ("likely", "lowest", "highest"))
    rows = {
        "cells": ("", cells), "core-hours": ("", hours["likely"]),
        **{f"hours on {cores} cores": ("", hours["likely"] / cores) for cores in CORES},
        "bytes in, compressed": ("B", cost["bytes_in"]), "bytes out, compressed": ("B", cost["store_bytes"]["likely"]),
        "files out": ("", cost["files"]), "NetCDF copy, if wanted": ("B", cost["netcdf_bytes"]["likely"]),
        "core-hours of that copy": ("", cost["netcdf_hours"]["likely"]),
    }  # fmt: skip
    shares = ", ".join(f"{leg} {share:.0%}" for leg, share in cost["shares"].items())
    lines = [f"| {rate:.3g} million cells/s of one core ({low:.3g} to {high:.3g}) | one member | {MEMBERS} members |",
             "|---|---|---|"]  # fmt: skip
    lines += [f"| {name} | {_words(each, unit)} | {_words(MEMBERS * each, unit)} |" for name, (unit, each) in rows.items()]
    measured = f"Measured on {len(cost['blocks'])} blocks; {cost['wet_share']:.0%} of their cells were water."
    spent = f"Spent on {shares};\nthe core computed for {cost['busy_share']:.0%} of the time, else it waited."
    return "\n".join([*lines, "", measured, spent, ""])


def _words(amount: float, unit: str) -> str:
    """Three figures: `2.1e11` for the very many, `1.35 TB` for bytes."""
    if unit:
        return next(f"{amount / size:.3g} {name}" for size, name in ((1e12, "TB"), (1e9, "GB"), (1e6, "MB"), (1, "B"))
                    if amount >= size)
    mantissa, _, exponent = f"{amount:.2e}".partition("e")
    rounded = float(f"{amount:.3g}")
    return f"{mantissa}e{int(exponent)}" if amount >= 1e7 else f"{rounded:,.0f}" if amount >= 1000 else f"{rounded:g}"


def main() -> None:
    """Make the ocean, have it rehearsed, print the table."""
    asked = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    asked.add_argument("--blocks", type=int, default=12)
    asked.add_argument("--readme", action="store_true")
    words = asked.parse_args()
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        told = table(rehearsed(folder, ocean(folder), words.blocks))
    print(told)
    if words.readme:
        text = README.read_text()
        README.write_text(text.split(START)[0] + START + told + END + text.split(END)[1])


if __name__ == "__main__":
    main()
