"""Invented inputs: a small ocean whose every number tells where it lies."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from gridcarb.sources import Collection, InputsSettings, gather
from gridcarb.sources.handles import close_all

STANDARD_NAMES = {
    "thetao": ("sea_water_potential_temperature", "degC"),
    "so": ("sea_water_practical_salinity", "1"),
    "dissic": ("mole_concentration_of_dissolved_inorganic_carbon_in_sea_water", "mol m-3"),
    "talk": ("sea_water_alkalinity_expressed_as_mole_equivalent", "mol m-3"),
    "po4": ("mole_concentration_of_phosphate_in_sea_water", "mol m-3"),
}
FORMATS: dict[str, Any] = {"nc3": "NETCDF3_CLASSIC", "nc4": "NETCDF4"}
Ocean = Callable[..., xr.Dataset]


@pytest.fixture(autouse=True)
def _nothing_stays_open() -> Iterator[None]:
    yield
    close_all()


@pytest.fixture(scope="session")
def ocean() -> Ocean:
    """Build a dataset: `ocean(names=..., dims=..., times=..., units=..., calendar=..., bounds=...)`."""
    return _ocean


def _ocean(
    names: Sequence[str] = tuple(STANDARD_NAMES), *, dims: Sequence[str] = ("time", "lev", "lat", "lon"),
    times: Sequence[float] = (15.5, 45.0, 74.5), units: str = "days since 2000-01-01", calendar: str = "standard",
    bounds: bool = False, **sizes: int,
) -> xr.Dataset:
    lengths = {"time": len(times), "lev": 3, "lat": 4, "lon": 5} | sizes
    lengths = {dim: lengths[dim] for dim in dims}
    count = lengths.get
    words = {
        "time": {"units": units, "calendar": calendar, "standard_name": "time"},
        "lev": {"units": "m", "positive": "down", "standard_name": "depth"},
        "lat": {"units": "degrees_north", "standard_name": "latitude"},
        "lon": {"units": "degrees_east", "standard_name": "longitude"},
    }
    numbers = {
        "time": np.asarray(times), "lev": 10.0 * np.arange(count("lev", 0)),
        "lat": np.linspace(-60, 60, count("lat", 0)), "lon": np.linspace(5, 355, count("lon", 0)),
    }
    coords = {dim: (dim, numbers[dim], words[dim]) for dim in words}
    fields = {}
    for place, name in enumerate(names):
        standard_name, unit = STANDARD_NAMES[name]
        cells = np.arange(float(np.prod(list(lengths.values())))).reshape(list(lengths.values())) + 1000 * place
        if "time" in dims:
            axis = list(dims).index("time")
            cells += np.expand_dims(1e4 * np.asarray(times), tuple(n for n in range(len(dims)) if n != axis))
        fields[name] = (tuple(dims), cells, {"standard_name": standard_name, "units": unit})
    ds = xr.Dataset(fields, {dim: coords[dim] for dim in dims}, {"title": "invented", "institution": "none"})
    if bounds:
        ds["time"].attrs["bounds"] = "time_bnds"
        edges = np.array([[t - 15, t + 15] for t in times])
        ds["time_bnds"] = (("time", "nv"), edges)
    return ds


@pytest.fixture(scope="session")
def save() -> Callable[..., Path]:
    """Write a dataset as it is: `save(ds, path, form)`; forms: nc4, nc3, zarr2, zarr3."""
    return _save


def _save(ds: xr.Dataset, path: Path, form: str = "nc4", **encoding: Any) -> Path:
    ds = ds.copy()
    for name in ds.variables:
        ds[name].encoding = {**ds[name].encoding, **encoding.get(str(name), {})}
        if form.startswith("nc"):
            ds[name].encoding.setdefault("_FillValue", None)
    if form.startswith("zarr"):
        ds.to_zarr(path, zarr_format=int(form[-1]), consolidated=False)
    else:
        # A file that is still open for reading cannot be written over, but it can be replaced.
        path.unlink(missing_ok=True)
        unlimited = ["time"] if "time" in ds.dims else []
        ds.to_netcdf(path, format=FORMATS[form], engine="netcdf4", unlimited_dims=unlimited)
    return path


@pytest.fixture(scope="session")
def gathered() -> Callable[..., Collection]:
    """Gather with the words of a recipe: `gathered(folder, files=..., salinity=..., ...)`."""
    return lambda folder, **words: gather(InputsSettings(**words), folder)
