"""A run from recipe to result: what it leaves, what its journal says, and that cutting it otherwise changes no bit."""

from __future__ import annotations

import hashlib
import json
import platform
import signal
import threading
from importlib.metadata import version
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

import gridcarb.run.task as tasks
from gridcarb import speciate
from gridcarb.citations import CITATIONS
from gridcarb.errors import BlockError, InputError
from gridcarb.run import conduct, derived, prepare
from gridcarb.run.stopping import Terminated, ends_tidily


def journal(folder: Path) -> dict:
    return json.loads((folder / "journal.json").read_text(encoding="utf-8"))


def opened(store: Path) -> xr.Dataset:
    return xr.open_zarr(store, consolidated=False, chunks=None)


def test_a_complete_result_and_nothing_beside_it(recipe, watcher, tmp_path) -> None:
    plan = prepare(recipe(output={"netcdf": True}, figures=[{"kind": "map", "field": "ph_total_scale", "depth": 0}]))
    outcome = conduct(plan, watcher)
    assert [path.name for path in tmp_path.iterdir()] == ["result"]
    assert set(outcome.written) == {"Zarr store", "NetCDF file", "figure 1", "journal"}
    assert all(path.exists() and path.is_relative_to(tmp_path / "result") for path in outcome.written.values())
    assert watcher.total == (len(plan.layout), 1080)
    assert sum(watcher.done) == 1080
    assert len(watcher.done) == len(plan.layout)


def test_the_numbers_are_those_of_the_array_face(recipe, watcher, ocean, save_ocean, tmp_path) -> None:
    """In-situ temperature, practical salinity, amounts per mass at the surface: nothing is left to convert."""
    ds = ocean(5, 7, 2, (0.0, 1e-9), temperature="in situ", tracer_units="umol kg-1").isel(lev=0, drop=True)
    path = save_ocean(ds.drop_vars("lev_bnds", errors="ignore"), tmp_path / "surface.nc")
    output = {"precision": "float64"}
    words = {"reading": {"density": None, "depth": "surface"}, "chemistry": {"fields": "all"}, "output": output}
    outcome = conduct(prepare(recipe(path, **words)), watcher)
    given = {role: np.where(ds[name] > 1e19, np.nan, ds[name].astype("f8")) for role, name in {
        "temperature": "thetao", "salinity": "so", "dic": "dissic", "alkalinity": "talk", "phosphate": "po4",
        "silicate": "si"}.items()}  # fmt: skip
    expected = speciate(**given)
    with opened(outcome.written["Zarr store"]) as found:
        assert np.isfinite(found["ph_total_scale"].values).any()
        for key, values in expected.items():
            np.testing.assert_array_equal(found[key].values, values, err_msg=key)


def test_the_journal_tells_how_to_make_it_again(recipe, watcher, ocean_file, tmp_path) -> None:
    made = recipe(engine={"block": {"time": 1, "cells": 24}, "memory": "1 GB"})
    outcome = conduct(prepare(made), watcher)
    told = journal(tmp_path / "result")
    assert told["state"] == "complete"
    assert told["begun"] <= told["ended"]
    assert told["recipe"] == {"path": None, "sha256": hashlib.sha256(made.text.encode()).hexdigest(), "text": made.text}
    stat = ocean_file.stat()
    head = hashlib.sha256(ocean_file.read_bytes()[:65536]).hexdigest()
    assert told["files"] == [
        {"path": str(ocean_file), "bytes": stat.st_size, "mtime_ns": stat.st_mtime_ns, "fingerprint": head}
    ]
    assert told["versions"]["python"] == platform.python_version()
    assert told["versions"]["zarr"] == version("zarr")
    assert told["versions"]["gridcarb"] == version("gridcarb")
    block = {"time": 1, "cells": 24}
    assert told["engine"] == {"kind": "threads", "workers": 2, "memory": "1 GB", "block": block, "retries": 1}
    assert told["plan"]["blocks"]["count"] == 9
    assert told["plan"]["notices"] == [notice.as_dict() for notice in outcome.notices]
    assert told["written"] == ["fields.zarr"]
    assert {"store", "getting ready", "blocks", "blocks: read", "blocks: solve", "blocks: write"} <= set(told["seconds"])
    assert all(spent >= 0 for spent in told["seconds"].values())


def test_the_journal_names_the_constants_and_who_says_so(recipe, watcher, tmp_path) -> None:
    conduct(prepare(recipe(chemistry={"constants": "practice2022", "fields": ["ph_total_scale"]})), watcher)
    told = journal(tmp_path / "result")["constants"]
    assert told["key"] == "practice2022"
    used = {key for keys in told["from"].values() for key in keys}
    assert set(told["citations"]) == used
    assert all(told["citations"][key] == CITATIONS[key].text for key in used)
    assert set(told["valid_for"]) == {"temperature", "salinity"}


def test_status_and_masked_cells_are_counted(recipe, watcher, tmp_path) -> None:
    outcome = conduct(prepare(recipe()), watcher)
    told = journal(tmp_path / "result")
    ranges = told["products"]["ranges"]
    with opened(outcome.written["Zarr store"]) as found:
        status, ph = found["solution_status"].values, found["ph_total_scale"].values
    counts = {word: int((status == value).sum()) for value, word in enumerate(ranges["solution_status"])}
    assert ranges["solution_status"] == counts == outcome.status_counts
    assert np.isnan(ph).sum() == counts["missing_input"]
    assert np.nanmin(ph) == pytest.approx(ranges["ph_total_scale"]["minimum"])
    assert sum(counts.values()) == 1080
    assert min(counts["missing_input"], counts["solved"]) > 0
    assert sum(told["masked_cells"].values()) > 0


def test_the_summary_is_strict_json(recipe, watcher) -> None:
    outcome = conduct(prepare(recipe(output={"netcdf": True})), watcher)
    told = outcome.summary().as_dict()
    assert json.loads(json.dumps(told, allow_nan=False)) == told
    assert told["written"] == {name: str(path) for name, path in outcome.written.items()}
    rows = {label: value for section in outcome.summary().sections for label, value in section.rows}
    solved = outcome.status_counts["solved"] + outcome.status_counts["outside_validity"]
    assert rows["cells solved"] == f"{solved:,} of 1,080"
    assert "fields.nc" in rows["in Python"]


@pytest.mark.parametrize(("precision", "zarr_format"), [("float32", 3), ("float64", 3), ("float32", 2), ("float64", 2)])
def test_precision_and_format_of_the_store(recipe, watcher, precision, zarr_format) -> None:
    outcome = conduct(prepare(recipe(output={"precision": precision, "zarr_format": zarr_format})), watcher)
    store = outcome.written["Zarr store"]
    assert (store / ("zarr.json" if zarr_format == 3 else ".zgroup")).is_file()
    with opened(store) as found:
        assert found["ph_total_scale"].dtype == precision
        assert found["solution_status"].dtype == np.int8
        assert found["ph_total_scale"].attrs["units"] == "1"
        assert found.attrs["title"] == outcome.plan.recipe.title


def test_only_what_is_asked_for_is_kept(recipe, watcher, tmp_path) -> None:
    outcome = conduct(prepare(recipe(output={"zarr": False, "netcdf": True})), watcher)
    assert sorted(path.name for path in (tmp_path / "result").iterdir()) == [
        "events.jsonl", "fields.nc", "journal.json", "ledger"]
    assert set(outcome.written) == {"NetCDF file", "journal"}
    with xr.open_dataset(outcome.written["NetCDF file"]) as found:
        assert np.isfinite(found["aragonite_saturation"]).any()


def test_amounts_per_volume_are_those_per_mass_times_density(recipe, watcher, tmp_path) -> None:
    chemistry, precision = {"fields": ["carbonate_ion", "ph_total_scale"]}, {"precision": "float64"}
    stores = {}
    for amounts in ("per mass", "per volume"):
        output = {**precision, "amounts": amounts, "folder": str(tmp_path / amounts)}
        stores[amounts] = conduct(prepare(recipe(chemistry=chemistry, output=output)), watcher).written["Zarr store"]
    with opened(stores["per mass"]) as mass, opened(stores["per volume"]) as volume:
        expected = mass["carbonate_ion"].values * (1026.0 * 1e-6)
        np.testing.assert_array_equal(volume["carbonate_ion"].values, expected)
        np.testing.assert_array_equal(volume["ph_total_scale"].values, mass["ph_total_scale"].values)
        assert volume["carbonate_ion"].attrs["units"] == "mol m-3"


@pytest.mark.parametrize("density", ["1030 kg m-3", "in situ"])
def test_input_per_mass_becomes_output_per_volume(recipe, watcher, ocean, save_ocean, tmp_path, density) -> None:
    path = save_ocean(ocean(4, 6, 1, tracer_units="umol kg-1"), tmp_path / "mass.nc")
    stores = {}
    for amounts in ("per mass", "per volume"):
        output = {"precision": "float64", "amounts": amounts, "folder": str(tmp_path / amounts)}
        plan = prepare(recipe(path, reading={"density": density}, chemistry={"fields": ["carbonate_ion"]}, output=output))
        stores[amounts] = conduct(plan, watcher).written["Zarr store"]
    with opened(stores["per mass"]) as mass, opened(stores["per volume"]) as volume:
        ratio = (volume["carbonate_ion"] / mass["carbonate_ion"]).values * 1e6
    ratio = ratio[np.isfinite(ratio)]
    assert ratio.size
    if density == "in situ":
        assert 1000 < ratio.min() < 1027 < ratio.max() < 1060
    else:
        np.testing.assert_allclose(ratio, 1030.0, rtol=1e-14)


def bytes_of(store) -> dict[str, bytes]:
    """All files but the one on top, whose history tells when the run was."""
    return {str(path.relative_to(store)): path.read_bytes() for path in store.glob("*/**/*") if path.is_file()}


def test_blocks_and_workers_change_no_byte(recipe, watcher, ocean, save_ocean, tmp_path) -> None:
    """Every cut of the work leaves the same files, land, status and coordinates included."""
    path = save_ocean(ocean(4, 4, 2), tmp_path / "ocean.nc", time=1, lat=2)
    ways = [{"workers": 1}, {"workers": 3, "block": {"time": 1, "cells": 1}}, {"workers": 2, "memory": "8.02 MB"},
            {"workers": 2, "block": {"time": 2, "cells": 3}}, {"workers": 2, "block": {"time": 2, "cells": 8}}]
    stores, counts = [], set()
    for number, engine in enumerate(ways):
        output = {"folder": str(tmp_path / str(number)), "precision": "float64", "chunks": {"time": 1, "cells": 1}}
        chemistry = {"fields": ["ph_total_scale", "co2_fugacity", "revelle_factor"]}
        plan = prepare(recipe(path, chemistry=chemistry, reading={"density": "in situ"}, output=output, engine=engine))
        counts.add(len(plan.layout))
        stores.append(conduct(plan, watcher).written["Zarr store"])
    assert len(counts) == len(ways)
    assert all(bytes_of(other) == bytes_of(stores[0]) for other in stores[1:])
    with opened(stores[0]) as whole:
        assert np.isfinite(whole["ph_total_scale"]).sum() > 50


def test_one_task_a_block_each_solved_once(recipe, watcher, monkeypatch) -> None:
    solved, lock = [], threading.Lock()
    solve = tasks.solve

    def counting(clothed, *words):
        with lock:
            solved.append(dict(clothed.sizes))
        return solve(clothed, *words)

    monkeypatch.setattr(tasks, "solve", counting)
    plan = prepare(recipe(engine={"block": {"time": 1, "cells": 24}}, chemistry={"fields": "all"}))
    conduct(plan, watcher)
    assert len(solved) == len(plan.layout) == 9
    assert all(sizes["lev"] == 5 for sizes in solved)


@pytest.mark.parametrize("shape", ["no time", "one column", "cells", "one cell"])
def test_grids_of_other_shapes(recipe, watcher, ocean, save_ocean, tmp_path, shape) -> None:
    ds = ocean(6, 8, 1).reset_coords(drop=True)
    if shape == "no time":
        ds = ds.isel(time=0, drop=True)
    elif shape == "cells":
        wide = ds.drop_vars(["lat", "lon"]).stack(cell=("lat", "lon"), create_index=False)
        lat, lon = (part.ravel() for part in np.meshgrid(ds["lat"], ds["lon"], indexing="ij"))
        ds = wide.assign(lat=("cell", lat, ds["lat"].attrs), lon=("cell", lon, ds["lon"].attrs))
        for name in wide.data_vars:
            ds[name].attrs["coordinates"] = "lat lon"
    else:
        place = {"time": 0, "lat": 2, "lon": int(np.flatnonzero((ds["thetao"][0, 0, 2] < 1e19).values)[0])}
        ds = ds.isel(place if shape == "one column" else {**place, "lev": 0})
    path = save_ocean(ds, tmp_path / "other.nc")
    outcome = conduct(prepare(recipe(path)), watcher)
    with opened(outcome.written["Zarr store"]) as found:
        assert dict(found["ph_total_scale"].sizes) == dict(ds["thetao"].sizes)
        assert np.isfinite(found["ph_total_scale"]).any()
        assert ((ds["thetao"].values < 1e19) == np.isfinite(found["ph_total_scale"].values)).all()


def test_a_failing_block_is_named_and_the_journal_says_why(recipe, watcher, monkeypatch, tmp_path) -> None:
    def fail(*_: object) -> None:
        raise ZeroDivisionError("by hand")

    monkeypatch.setattr(tasks, "write_block", fail)
    plan = prepare(recipe(engine={"workers": 1, "block": {"time": 1, "cells": 24}}))
    with pytest.raises(BlockError, match="ZeroDivisionError: by hand") as caught:
        conduct(plan, watcher)
    assert caught.value.what == "9 of 9 blocks could not be done"
    assert all(" of 9: {'time': slice(" in other.where for other in caught.value.others)
    told = journal(tmp_path / "result.partial")
    assert told["state"] == "failed"
    assert told["error"]["kind"] == "BlockError"
    assert "by hand" in told["error"]["text"]
    assert told["plan"]["title"] == plan.recipe.title
    assert [path.name for path in tmp_path.iterdir()] == ["result.partial"]
    assert str(tmp_path / "result.partial") in watcher.messages[-1]


def test_too_little_memory_is_told_with_what_helps(recipe, watcher, monkeypatch) -> None:
    def fail(*_: object) -> None:
        raise MemoryError("no room for an array")

    monkeypatch.setattr(tasks, "clothe", fail)
    with pytest.raises(BlockError, match="no room") as caught:
        conduct(prepare(recipe()), watcher)
    assert "fewer `workers`" in caught.value.others[0].mend


def test_the_next_run_says_what_it_removed(recipe, watcher, tmp_path) -> None:
    (tmp_path / "result.partial").mkdir()
    (tmp_path / "result.partial" / "half").write_text("of a result")
    outcome = conduct(prepare(recipe()), watcher)
    assert "partial_removed" in {notice.code for notice in outcome.notices}
    assert "partial_removed" in {notice["code"] for notice in journal(tmp_path / "result")["plan"]["notices"]}
    assert "partial_removed" in {notice["code"] for notice in outcome.summary().as_dict()["notices"]}
    assert not (tmp_path / "result.partial").exists()


def test_a_grid_without_one_computable_cell_is_refused(recipe, watcher, monkeypatch, tmp_path) -> None:
    clothe = tasks.clothe
    monkeypatch.setattr(tasks, "clothe", lambda raw, understanding: clothe(raw, understanding).assign(dic=np.nan))
    with pytest.raises(InputError, match="no cell could be computed: 1,080 missing_input"):
        conduct(prepare(recipe()), watcher)
    assert not (tmp_path / "result").exists()


@pytest.mark.parametrize("how", ["touched", "gone"])
def test_an_input_that_changes_under_the_run_is_noticed(
    recipe, watcher, ocean, save_ocean, tmp_path, monkeypatch, how
) -> None:
    path = save_ocean(ocean(4, 6, 1), tmp_path / "moving.nc")
    plan = prepare(recipe(path))
    write_block = tasks.write_block

    def meddle(*words):
        path.unlink() if how == "gone" else path.touch()
        return write_block(*words)

    monkeypatch.setattr(tasks, "write_block", meddle)
    with pytest.raises(InputError, match="changed or moved") as caught:
        conduct(plan, watcher)
    assert caught.value.where == str(path)
    assert not (tmp_path / "result").exists()


def test_an_earlier_result_outlives_a_failure(recipe, watcher, monkeypatch, tmp_path) -> None:
    conduct(prepare(recipe()), watcher)
    before = {path: path.read_bytes() for path in (tmp_path / "result").rglob("*") if path.is_file()}

    def fail(*_: object, **__: object) -> None:
        raise InputError("no export")

    monkeypatch.setattr(derived, "export", fail)
    with pytest.raises(InputError, match="no export"):
        conduct(prepare(recipe(output={"replace": True, "netcdf": True})), watcher)
    assert {path: path.read_bytes() for path in (tmp_path / "result").rglob("*") if path.is_file()} == before


def test_sigterm_ends_tidily_and_its_handler_is_put_back(recipe, watcher, monkeypatch, tmp_path) -> None:
    before = signal.getsignal(signal.SIGTERM)
    monkeypatch.setattr(derived, "export", lambda *_, **__: signal.raise_signal(signal.SIGTERM))
    with pytest.raises(Terminated) as caught:
        conduct(prepare(recipe(output={"netcdf": True})), watcher)
    assert caught.value.code == 143
    assert signal.getsignal(signal.SIGTERM) == before
    told = journal(tmp_path / "result.partial")
    assert (told["state"], told["error"]["text"]) == ("interrupted", "stopped by SIGTERM")
    assert "stopped by SIGTERM" in watcher.messages
    assert not (tmp_path / "result.lock").exists()


def test_a_caller_who_handles_sigterm_keeps_his_handler() -> None:
    heard: list[int] = []
    before = signal.signal(signal.SIGTERM, lambda number, _: heard.append(number))
    try:
        with ends_tidily():
            signal.raise_signal(signal.SIGTERM)
    finally:
        signal.signal(signal.SIGTERM, before)
    assert heard == [signal.SIGTERM]


def test_a_run_in_another_thread_works(recipe, watcher, tmp_path) -> None:
    failures: list[BaseException] = []

    def run() -> None:
        try:
            conduct(prepare(recipe()), watcher)
        except BaseException as error:
            failures.append(error)

    thread = threading.Thread(target=run)
    thread.start()
    thread.join()
    assert failures == []
    assert journal(tmp_path / "result")["state"] == "complete"
