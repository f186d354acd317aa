"""Forms of files: NetCDF of every age, groups, Zarr of either format, split by variable, by year or by both."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Literal

import numpy as np
import xarray as xr

from synthetic_grids.scene import Scene, tracers

NetcdfForm = Literal["NETCDF3_CLASSIC", "NETCDF3_64BIT", "NETCDF4_CLASSIC", "NETCDF4"]
Splitting = Literal["whole", "variable", "year", "both"]


def write_netcdf(dataset: xr.Dataset, path: Path, form: NetcdfForm = "NETCDF4", group: str | None = None) -> Path:
    """Write a NetCDF file as the dataset stands, uncompressed; fill values only where the attributes have one."""
    encoding = {str(name): {"_FillValue": None} for name, variable in dataset.variables.items()
                if "_FillValue" not in variable.attrs}
    dataset.to_netcdf(path, engine="netcdf4", format=form, group=group, encoding=encoding)
    return path


def write_zarr(dataset: xr.Dataset, path: Path, zarr_format: Literal[2, 3] = 3) -> Path:
    """Write a Zarr store; fill values of the attributes become those of the arrays, NaN that of the other floats."""
    plain = dataset.copy()
    encoding: dict[str, dict[str, object]] = {}
    for name, variable in plain.variables.items():
        attributes = dict(variable.attrs)
        fill = attributes.pop("_FillValue", None)
        encoding[str(name)] = {"_FillValue": fill}
        plain[name].attrs = attributes
    plain.to_zarr(path, mode="w", zarr_format=zarr_format, consolidated=zarr_format == 2, encoding=encoding)
    return path


def split(scene: Scene, by: Splitting = "whole") -> dict[str, xr.Dataset]:
    """The dataset of a scene in parts by stem: everything, a tracer each, a year each, or a tracer and year each."""
    parts = {"ocean": scene.dataset}
    if by in ("variable", "both"):
        names = tracers(scene.dataset)
        parts = {name: scene.dataset.drop_vars([other for other in names if other != name]) for name in names}
    if by in ("year", "both"):
        years = np.floor(np.atleast_1d(scene.times.year.values)).astype(int)
        parts = {
            f"{stem}_{year}": part.isel(time=np.flatnonzero(years == year))
            for stem, part in parts.items() for year in np.unique(years)
        }
    return parts


Writer = Callable[[xr.Dataset, Path], Path]

WRITERS: dict[str, tuple[str, Writer]] = {
    "netcdf3_classic": (".nc", lambda dataset, path: write_netcdf(dataset, path, "NETCDF3_CLASSIC")),
    "netcdf3_64bit": (".nc", lambda dataset, path: write_netcdf(dataset, path, "NETCDF3_64BIT")),
    "netcdf4_classic": (".nc", lambda dataset, path: write_netcdf(dataset, path, "NETCDF4_CLASSIC")),
    "netcdf4": (".nc", write_netcdf),
    "netcdf4_group": (".nc", lambda dataset, path: write_netcdf(dataset, path, "NETCDF4", "ocean/model")),
    "zarr2": (".zarr", lambda dataset, path: write_zarr(dataset, path, 2)),
    "zarr3": (".zarr", lambda dataset, path: write_zarr(dataset, path, 3)),
}
"""Suffix and writer by form."""


def write_scene(scene: Scene, folder: Path, form: str = "netcdf4", by: Splitting = "whole") -> list[Path]:
    """Write a scene into a folder in a form of `WRITERS`, whole or split; gives the paths in order."""
    suffix, writer = WRITERS[form]
    return [writer(part, folder / f"{stem}{suffix}") for stem, part in split(scene, by).items()]
