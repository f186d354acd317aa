"""Small pieces of the invented ocean on disk, recipes for them, and a watcher that remembers."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from gridcarb.recipe import Recipe, check
from gridcarb.sources import close_all
from synthetic_grids import grids
from synthetic_grids.clothes import Clothes, dress

EDGES = (0.0, 20.0, 100.0, 500.0, 2000.0, 5000.0)


class Memory:
    """A watcher that remembers what it was told."""

    def __init__(self) -> None:
        self.total: tuple[int, int] | None = None
        self.done: list[int] = []
        self.messages: list[str] = []
        self.failed: list[str] = []

    def start(self, total_blocks: int, cells: int) -> None:
        self.total = (total_blocks, cells)

    def block_done(self, cells: int, note: str = "") -> None:
        self.done.append(cells)

    def block_failed(self, note: str) -> None:
        self.failed.append(note)

    def strength(self, workers: int, resident: int) -> None:
        assert workers > 0
        assert resident > 1_000_000

    def message(self, text: str) -> None:
        self.messages.append(text)

    def stop(self) -> None:
        pass


def build(rows: int = 6, columns: int = 12, steps: int = 3, edges: tuple[float, ...] = EDGES, **clothes: Any) -> xr.Dataset:
    """The invented ocean on (time, lev, lat, lon) as float32 model variables with fill values, land included."""
    grid, depth, time = grids.rectilinear(rows, columns), grids.levels(edges), grids.months(2010, 2010, "noleap")
    time = time.isel(time=slice(steps))
    truth = grids.sample(grid["lon"], grid["lat"], depth["lev"], time["year"])
    worn = {"salinity": "practical", **clothes}
    dressed = dress(truth, depth["lev"], grid["lat"], Clothes(**worn)).drop_vars("year", errors="ignore")
    return dressed.assign_coords(grid.merge(depth).merge(time[["time", "time_bnds"]]).coords)


def save(dataset: xr.Dataset, path: Path, **chunks: int) -> Path:
    """Write `dataset` as it stands; fields in chunks of these lengths where given."""
    encoding: dict[str, dict[str, Any]] = {name: {"_FillValue": None} for name in dataset.variables
                                           if "_FillValue" not in dataset[name].attrs}
    if chunks:
        for name in dataset.data_vars:
            shape = tuple(min(size, chunks.get(str(dim), size)) for dim, size in dataset[name].sizes.items())
            encoding.setdefault(name, {})["chunksizes"] = shape
    dataset.to_netcdf(path, engine="netcdf4", encoding=encoding)
    return path


@pytest.fixture(autouse=True)
def _nothing_stays_open() -> Iterator[None]:
    yield
    close_all()


@pytest.fixture(scope="session")
def ocean() -> Callable[..., xr.Dataset]:
    return build


@pytest.fixture(scope="session")
def save_ocean() -> Callable[..., Path]:
    return save


@pytest.fixture(scope="session")
def ocean_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """One file of 3 months on 6 x 12 columns of 5 levels."""
    return save(build(), tmp_path_factory.mktemp("ocean") / "ocean.nc", time=1, lat=3)


@pytest.fixture
def recipe(tmp_path: Path, ocean_file: Path) -> Callable[..., Recipe]:
    """Make a recipe: `recipe(files=..., output={...}, engine={...}, ...)`; the rest is the least that runs."""

    def make(files: Path = ocean_file, **sections: Any) -> Recipe:
        base: dict[str, Any] = {
            "recipe": 1, "inputs": {"files": str(files)}, "reading": {"density": "1026 kg m-3"},
            "chemistry": {"fields": ["ph_total_scale", "aragonite_saturation"]}, "engine": {"workers": 2},
            "output": {"folder": str(tmp_path / "result"), "netcdf": False},
        }
        for section, words in sections.items():
            base[section] = {**base.get(section, {}), **words} if isinstance(words, dict) else words
        if base["engine"].get("block"):  # of such a small grid the planner would make one chunk
            base["output"].setdefault("chunks", base["engine"]["block"])
        return check(json.dumps(base))

    return make


@pytest.fixture
def watcher() -> Memory:
    return Memory()


@pytest.fixture(scope="session")
def same_bits() -> Callable[[Path, Path], bool]:
    """Whether two stores hold the same arrays, to the last bit of every number."""

    def compare(one: Path, other: Path) -> bool:
        with xr.open_zarr(one, decode_cf=False, consolidated=False, chunks=None) as left, \
                xr.open_zarr(other, decode_cf=False, consolidated=False, chunks=None) as right:
            if set(left.variables) != set(right.variables):
                return False
            return all(_bits(left[name].values) == _bits(right[name].values) for name in left.variables)

    return compare


def _bits(values: np.ndarray[Any, Any]) -> tuple[object, ...]:
    return values.dtype.str, values.shape, values.tobytes()
