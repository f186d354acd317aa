"""One chunk of the input is damaged where neither headers nor samples show it: its blocks fail, all others are done.

Whoever puts back the bytes goes on with --resume and gets the bytes of a run that nothing happened to.
"""

from __future__ import annotations

import json
import os
import zlib
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from click.testing import CliRunner, Result

from gridcarb.cli.main import main
from gridcarb.recipe import load
from gridcarb.run import prepare
from gridcarb.sources import close_all
from gridcarb.write.ledger import LEDGER, Ledger
from tests.faults.test_resumed import assert_same_files, store_files
from tests.processes import write_small_ocean

SMALL = {"engine": {"workers": 2, "block": {"time": 1, "cells": 400}}}
"""A dozen blocks; which of them a chunk is read for is asked of the plan."""

CHUNK = {"time": 1, "lev": 5, "lat": 10, "lon": 40}
DAMAGED = {"time": 3, "lev": 0, "lat": 1, "lon": 0}
"""The chunk that is damaged, counted in chunks: the northern half of the fourth month."""

NAME = "talk"

HEAD = 2**16
"""Bytes at the beginning of a file that count as its fingerprint: who mends those begins anew."""


@pytest.fixture(autouse=True)
def _one_date(monkeypatch: pytest.MonkeyPatch) -> Iterator[None]:
    """Runs that are compared tell the same date in the history of their store."""
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1800000000")
    yield
    close_all()


def call(*words: object) -> Result:
    """A command as if in a process of its own: nothing is open yet."""
    close_all()
    return CliRunner().invoke(main, [str(word) for word in words])


def zarr_store(ocean: xr.Dataset, folder: Path) -> tuple[Path, Path, slice]:
    """The input, the file of the damaged chunk, and where in it the chunk lies."""
    store = folder / "ocean.zarr"
    ocean.chunk(CHUNK).to_zarr(store, consolidated=False, zarr_format=3)
    file = store.joinpath(NAME, "c", *map(str, DAMAGED.values()))
    return store, file, slice(0, file.stat().st_size)


def netcdf_file(ocean: xr.Dataset, folder: Path) -> tuple[Path, Path, slice]:
    """As `zarr_store`; the place of the chunk is found by inflating whatever looks like the beginning of one."""
    path = folder / "ocean.nc"
    packed = {"zlib": True, "shuffle": False, "chunksizes": tuple(CHUNK.values())}
    fields = [str(name) for name, field in ocean.data_vars.items() if field.ndim == len(CHUNK)]
    ocean.to_netcdf(path, engine="netcdf4", encoding=dict.fromkeys(fields, packed))
    here = {dim: slice(place * CHUNK[dim], (place + 1) * CHUNK[dim]) for dim, place in DAMAGED.items()}
    wanted, content = ocean[NAME].isel(here).values.tobytes(), path.read_bytes()
    start = -1
    while (start := content.index(b"\x78", start + 1)) >= 0:
        stream = zlib.decompressobj()
        try:
            if stream.decompress(content[start:]) == wanted:
                assert start > HEAD
                return path, path, slice(start, len(content) - len(stream.unused_data))
        except zlib.error:
            continue
    raise AssertionError("the chunk was not found")


@pytest.fixture(scope="module")
def ocean(tmp_path_factory: pytest.TempPathFactory) -> xr.Dataset:
    """Six months on 20 x 40 columns of 5 levels, numbers and attributes as they lie in a file."""
    path = write_small_ocean(tmp_path_factory.mktemp("ocean") / "ocean.nc", 20, 40)
    with xr.open_dataset(path, decode_cf=False) as found:
        return found.load().drop_encoding()


@pytest.fixture(params=[zarr_store, netcdf_file], ids=["zarr", "netcdf"])
def source(request: pytest.FixtureRequest, ocean: xr.Dataset, tmp_path: Path) -> tuple[Path, Path, slice]:
    found: tuple[Path, Path, slice] = request.param(ocean, tmp_path)
    return found


def damage(file: Path, chunk: slice) -> None:
    """A chunk that is a file of its own is cut in the middle, one inside a file has its second half made junk."""
    content, middle = file.read_bytes(), (chunk.start + chunk.stop) // 2
    junk = np.random.default_rng(4).bytes(chunk.stop - middle) if chunk.stop < len(content) else b""
    file.write_bytes(content[:middle] + junk + content[chunk.stop :])


def blocks_of_the_chunk(recipe: Path) -> set[int]:
    """The blocks, counted from 1, that the damaged chunk is read for, by the plan."""
    layout = prepare(load(recipe)).layout
    lowest = {dim: place * CHUNK[dim] for dim, place in DAMAGED.items()}
    return {
        number + 1 for number, region in enumerate(layout.regions())
        if all(part.start < lowest[dim] + CHUNK[dim] and lowest[dim] < part.stop for dim, part in region.items())
    }


def events(folder: Path) -> list[dict]:
    return [json.loads(line) for line in (folder / "events.jsonl").read_text().splitlines()]


def test_a_damaged_chunk_is_recorded_and_the_others_complete(place: Callable, source: tuple, tmp_path: Path) -> None:
    path, file, chunk = source
    whole = place(tmp_path / "whole", path, **SMALL)
    assert call("run", whole.recipe, "--quiet").exit_code == 0
    content, stat = file.read_bytes(), file.stat()

    damage(file, chunk)
    os.utime(file, ns=(stat.st_atime_ns, stat.st_mtime_ns))  # as when a disk rots: the time of the file stays
    here = place(files=path, **SMALL)
    wanted = blocks_of_the_chunk(here.recipe)
    assert call("plan", here.recipe, "--quiet").exit_code == 0, "headers and samples are sound"
    ended = call("run", here.recipe)
    assert ended.exit_code == 6
    assert "Traceback" not in ended.stderr
    told = events(here.partial)
    blocks = told[0]["blocks"]
    assert 0 < len(wanted) < blocks / 3
    assert f"{len(wanted)} of {blocks} blocks could not be done" in ended.stderr
    for number in wanted:
        assert f"{path}: {NAME} (block {number} of {blocks})" in ended.stderr
    assert "damaged or cut short" in ended.stderr
    assert not here.result.exists()
    assert here.journal(here.partial)["state"] == "failed"

    assert {each["block"] for each in told if each["event"] == "failed"} == wanted
    assert {each["block"] for each in told if each["event"] == "done"} == set(range(1, blocks + 1)) - wanted
    ledger = Ledger(here.partial / LEDGER)
    assert {number + 1 for number, _ in ledger.blocks()} == set(range(1, blocks + 1)) - wanted
    assert {number + 1 for number in ledger.failures()} == wanted
    begun = len(told)

    file.write_bytes(content)
    if path.is_file():
        refused = call("run", here.recipe, "--resume")
        assert refused.exit_code == 4
        assert f"input: {path} was last changed" in refused.stderr
        assert ledger.count() == blocks - len(wanted), "nothing that was done is lost"
        os.utime(file, ns=(stat.st_atime_ns, stat.st_mtime_ns))  # as a copy that keeps the times
    again = call("run", here.recipe, "--resume")
    assert again.exit_code == 0, again.output
    assert {each["block"] for each in events(here.result)[begun:] if each["event"] == "done"} == wanted
    assert_same_files(store_files(here.result), store_files(whole.result))
    assert here.journal(here.result)["state"] == "complete"
