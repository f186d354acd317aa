"""The audit takes seconds whatever the size: two thousand files, and one of fifty gigabytes that holds next to nothing.

The seconds of the processor are printed (`pytest -s`), not asserted: machines differ.
"""

from __future__ import annotations

import json
import os
import struct
import subprocess
import sys
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

pytestmark = pytest.mark.scale

FILES = 2000
_MARK = 123456.75
"""The time of the first file, and its bounds a day about it: found among its bytes and replaced in the copies."""

_AUDIT = """
import resource, sys
resource.setrlimit(resource.RLIMIT_NOFILE, ({limit}, {limit}))
from gridcarb.cli.main import main
sys.argv = ["gridcarb", "audit", "--json", {target!r}]
main()
"""


def audited(target: str, limit: int) -> dict:
    """The audit from a process of its own that may hold `limit` files open."""
    begun = _spent()
    program = _AUDIT.format(limit=limit, target=target)
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout[-3000:] + done.stderr[-3000:]
    print(f"{_spent() - begun:.1f} s of the processor")
    return json.loads(done.stdout)


def _spent() -> float:
    """Processor seconds of all processes started from here that are over."""
    times = os.times()
    return times.children_user + times.children_system


def test_two_thousand_files_with_a_hundred_open(ocean, save_ocean, tmp_path) -> None:
    first = ocean(4, 6, 1)
    numbers = (_MARK - 1.25, _MARK, _MARK + 1.25)
    first["time"] = ("time", np.array([numbers[1]]), first["time"].attrs)
    first["time_bnds"] = (("time", "bnds"), np.array([[numbers[0], numbers[2]]]), first["time_bnds"].attrs)
    data = save_ocean(first, tmp_path / "first.nc").read_bytes()
    (tmp_path / "first.nc").unlink()
    assert all(data.count(struct.pack("<d", number)) == 1 for number in numbers)
    for day in range(FILES):
        copy = data
        for number in numbers:
            copy = copy.replace(struct.pack("<d", number), struct.pack("<d", number - _MARK + 1.25 + 2.5 * day))
        (tmp_path / f"day{day:04}.nc").write_bytes(copy)
    found = audited(str(tmp_path / "*.nc"), limit=100)
    assert found["files"] == FILES
    (said,) = (row["text"] for row in found["findings"] if row["subject"] == "time")
    assert f"{FILES} steps" in said


def test_fifty_gigabytes(ocean, tmp_path) -> None:
    """Six roles on 250 x 35 x 500 x 500 in single precision; water at the first time and level only, land elsewhere."""
    model = ocean(4, 6, 1)
    place, shape = tmp_path / "huge.nc", {"time": 250, "lev": 35, "lat": 500, "lon": 500}
    with netCDF4.Dataset(place, "w") as file:
        for dim, size in shape.items():
            file.createDimension(dim, size)
        axes = {"time": np.arange(250.0), "lev": np.linspace(5, 4000, 35), "lat": np.linspace(-80, 80, 500),
                "lon": np.linspace(0.36, 359.64, 500)}
        for name, values in axes.items():
            variable = file.createVariable(name, "f8", (name,))
            variable.setncatts({key: value for key, value in model[name].attrs.items() if key != "bounds"})
            variable[:] = values
        for name in ("thetao", "so", "dissic", "talk", "po4", "si"):
            field = file.createVariable(name, "f4", tuple(shape), chunksizes=(1, 1, 500, 500), fill_value=1e20)
            attrs = xr.Variable(model[name].dims, model[name], model[name].attrs).attrs
            field.setncatts({key: value for key, value in attrs.items() if key not in ("_FillValue", "cell_measures")})
            field[0, 0] = float(np.nanmedian(np.where(model[name] < 1e10, model[name], np.nan)))
    assert 6 * 4 * np.prod(list(shape.values()), dtype=np.int64) > 50e9
    assert place.stat().st_size < 50e6
    found = audited(str(place), limit=100)
    assert {row["subject"] for row in found["findings"]} >= {"grid", "time", "density", "chunks"}


def test_a_huge_file_of_nothing_is_refused_in_time(tmp_path: Path) -> None:
    """No water anywhere in 50 GB: the search for it is bounded."""
    place = tmp_path / "empty.nc"
    with netCDF4.Dataset(place, "w") as file:
        for dim, size, units in (("lev", 60, "m"), ("lat", 6000, "degrees_north"), ("lon", 6000, "degrees_east")):
            file.createDimension(dim, size)
            file.createVariable(dim, "f8", (dim,))[:] = np.linspace(0, 80, size)
            file[dim].units = units
        file["lev"].positive = "down"
        names = {"thetao": "degC", "so": "0.001", "dissic": "mol m-3", "talk": "mol m-3", "po4": "mol m-3", "si": "mol m-3"}
        for name, units in names.items():
            file.createVariable(name, "f4", ("lev", "lat", "lon"), chunksizes=(1, 600, 600), fill_value=1e20).units = units
    begun = _spent()
    program = "from gridcarb.run import audit_files; a = audit_files([%r]); print(*(f.text for f in a.findings), sep='\\n')"
    done = subprocess.run([sys.executable, "-c", program % str(place)], capture_output=True, text=True, check=True)
    assert "no cell in the first 12 million of the first time step" in done.stdout
    assert _spent() - begun < 15
