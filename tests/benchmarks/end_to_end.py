"""Wall time of a whole run beside a dask pipeline that only copies as many bytes in and out.

    python -m tests.benchmarks.end_to_end [STEPS] [zarr|netcdf] [potential]

Both read the same six inputs from the same store or file and write eight fields as float32 into a Zarr store of the same
chunks and codec, on all cores, turn and turn about; medians are told. The water is the invented ocean on a 1 degree grid
with 30 levels, in-situ temperature, practical salinity and amounts per mass: what is measured is the way of the bytes and
the chemistry. `potential` dresses it as models do, with TEOS-10 and a density to pay for.
"""

from __future__ import annotations

import shutil
import statistics
import sys
import tempfile
import time
from pathlib import Path

import dask
import numpy as np
import xarray as xr

from gridcarb.cli.progress import watcher
from gridcarb.held_memory import share_one_heap
from gridcarb.recipe import check
from gridcarb.run import conduct, prepare
from synthetic_grids import grids
from synthetic_grids.clothes import Clothes, dress

FIELDS = (
    "ph_total_scale", "aqueous_co2", "bicarbonate_ion", "carbonate_ion", "co2_fugacity", "calcite_saturation",
    "aragonite_saturation", "revelle_factor",
)  # fmt: skip
ROUNDS = 5
EDGES = np.concatenate([np.arange(0, 200, 20.0), np.linspace(200, 5600, 21)])


def ocean(folder: Path, steps: int, form: str, clothes: Clothes) -> Path:
    """The input: one year's months, repeated to so many steps."""
    grid, depth, months = grids.rectilinear(180, 360), grids.levels(EDGES), grids.months(2010, 2010, "noleap")
    truth = grids.sample(grid["lon"], grid["lat"], depth["lev"], months["year"][:1])
    one = dress(truth, depth["lev"], grid["lat"], clothes).astype(np.float32, keep_attrs=True)
    for name in one.data_vars:
        one[name].encoding.clear()
    whole = xr.concat([one] * steps, "time", data_vars="all")
    axis = xr.DataArray(np.arange(steps) + 0.5, dims="time", attrs={
        "units": "days since 2000-01-01", "calendar": "noleap", "standard_name": "time", "axis": "T"})  # fmt: skip
    whole = whole.assign_coords(grid.coords).assign_coords(depth.coords).assign_coords(time=axis)
    place = folder / f"ocean.{'zarr' if form == 'zarr' else 'nc'}"
    chunks = {str(name): (1, *whole[name].shape[1:]) for name in whole.data_vars}
    if form == "zarr":
        whole.to_zarr(place, encoding={name: {"chunks": size} for name, size in chunks.items()}, consolidated=False)
    else:
        whole.to_netcdf(place, encoding={n: {"chunksizes": c, "zlib": True, "complevel": 1} for n, c in chunks.items()})
    return place


def seconds_of_run(source: Path, folder: Path) -> float:
    """The run as a user starts it, from recipe to store; no NetCDF export, no figures."""
    recipe = check(
        f"recipe: 1\ninputs: {{files: {source}}}\nreading: {{salinity: practical, density: 1026 kg m-3}}\n"
        f"chemistry: {{fields: [{', '.join(FIELDS)}]}}\n"
        f"output: {{folder: {folder / 'run'}, netcdf: false, replace: true}}\n"
    )
    begun = time.perf_counter()
    conduct(prepare(recipe), watcher(quiet=True))
    return time.perf_counter() - begun


def seconds_of_copy(source: Path, folder: Path) -> float:
    """Six inputs read, eight written, in the chunks and with the codec of the run's store."""
    target = folder / "copy.zarr"
    shutil.rmtree(target, ignore_errors=True)
    model = xr.open_zarr(folder / "run" / "fields.zarr", consolidated=False)
    encoding = {key: {name: model[key].encoding[name] for name in ("chunks", "compressors")} for key in FIELDS}
    begun = time.perf_counter()
    engine = "zarr" if source.suffix == ".zarr" else "netcdf4"
    opened = xr.open_dataset(source, engine=engine, chunks={}, **({"consolidated": False} if engine == "zarr" else {}))
    names = [str(name) for name in opened.data_vars if opened[name].ndim == 4][:6]
    copies = xr.Dataset({key: opened[names[place % 6]].drop_attrs() for place, key in enumerate(FIELDS)})
    for key in FIELDS:
        copies[key].encoding.clear()
    with dask.config.set(scheduler="threads"):
        copies.to_zarr(target, encoding=encoding, consolidated=False, safe_chunks=False)
    return time.perf_counter() - begun


def main() -> None:
    """Measure and print."""
    share_one_heap()  # as the command does
    steps = int(sys.argv[1]) if len(sys.argv) > 1 else 12
    form = sys.argv[2] if len(sys.argv) > 2 else "zarr"
    clothes = Clothes(precision="float32") if "potential" in sys.argv else Clothes(
        temperature="in situ", tracer_units="umol kg-1", precision="float32")  # fmt: skip
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        source = ocean(folder, steps, form, clothes)
        seconds_of_run(source, folder)
        pairs = [(seconds_of_run(source, folder), seconds_of_copy(source, folder)) for _ in range(ROUNDS)]
    cells = steps * 30 * 180 * 360
    runs, copies = zip(*pairs, strict=True)
    for words, times in (("gridcarb run", runs), ("copying only", copies)):
        typical = statistics.median(times)
        print(f"{words:14s} {typical:7.2f} s   {cells / typical / 1e6:6.2f} million cells/s")
    ratios = [run / copy for run, copy in pairs]
    print(f"ratio          {statistics.median(ratios):7.2f}   (lowest {min(ratios):.2f}, highest {max(ratios):.2f})")


if __name__ == "__main__":
    main()
