"""A finished result is held against its ledger: what is damaged is found, named and mended, and nothing else touched."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest
import xarray as xr

from gridcarb.errors import GridcarbError, OutputError
from gridcarb.recipe import check
from gridcarb.run import charter as charters
from gridcarb.run import conduct, prepare
from gridcarb.run.mending import verify
from gridcarb.write.ledger import LEDGER, Ledger


@pytest.fixture(scope="module")
def original(tmp_path_factory, ocean, save_ocean) -> Path:
    """A folder with an input and the result of its nine blocks: store (format 3), NetCDF file and a map."""
    folder = tmp_path_factory.mktemp("verified")
    save_ocean(ocean(), folder / "ocean.nc", time=1, lat=3)
    conduct(prepare(_recipe(folder)), Quiet())
    return folder


class Quiet:
    def __getattr__(self, name: str) -> Callable[..., None]:
        return lambda *_, **__: None


def _recipe(place: Path, **output):
    return check(json.dumps({
        "recipe": 1, "inputs": {"files": str(place / "ocean.nc")}, "reading": {"density": "1026 kg m-3"},
        "chemistry": {"fields": ["ph_total_scale", "aragonite_saturation"]},
        "engine": {"workers": 1, "block": {"time": 1, "cells": 24}},
        "output": {"folder": str(place / "result"), "chunks": {"time": 1, "cells": 24}, **output},
        "figures": [{"kind": "map", "field": "ph_total_scale", "depth": 0}],
    }))


@pytest.fixture
def result(original, tmp_path) -> Path:
    """A copy of the result to do harm to; it has been moved, and is still the result of the same input."""
    return Path(shutil.copytree(original / "result", tmp_path / "moved"))


def contents(folder: Path) -> dict[str, bytes]:
    return {str(path.relative_to(folder)): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def flip(path: Path, at: float = 0.5) -> Path:
    content = bytearray(path.read_bytes())
    content[int(at * (len(content) - 1))] ^= 1
    path.write_bytes(content)
    return path


def chunks(result: Path, field: str) -> list[Path]:
    return sorted((result / "fields.zarr" / field).glob("c.*"))


def test_a_whole_result_is_found_whole_and_made_again_to_the_last_bit(result):
    before = contents(result)
    verdict = verify(result, Quiet(), sample=9)
    assert verdict.damages == []
    assert verdict.again == list(range(1, 10))
    assert (verdict.blocks, verdict.chunks, verdict.not_again) == (9, 27, [])
    assert verdict.as_dict()["whole"] is True
    assert json.loads(json.dumps(verdict.as_dict())) == verdict.as_dict()
    assert contents(result) == before


def test_every_byte_of_a_chunk_counts(result):
    """Some bytes of a compressed chunk change no number; they are found all the same."""
    chunk = chunks(result, "ph_total_scale")[4]
    whole = chunk.read_bytes()
    for at in [*range(40), len(whole) // 2, len(whole) - 1]:
        changed = bytearray(whole)
        changed[at] ^= 1
        chunk.write_bytes(changed)
        damages = verify(result, Quiet(), sample=0).damages
        assert [each.place for each in damages] == [str(chunk.relative_to(result))], at


def cut_out_a_chunk(result: Path) -> tuple[str, str]:
    chunk = chunks(result, "aragonite_saturation")[3]
    chunk.unlink()
    return "chunk", str(chunk.relative_to(result))


def flip_in_a_chunk(result: Path) -> tuple[str, str]:
    return "chunk", str(flip(chunks(result, "ph_total_scale")[-1]).relative_to(result))


def cut_a_chunk_short(result: Path) -> tuple[str, str]:
    chunk = chunks(result, "solution_status")[0]
    chunk.write_bytes(chunk.read_bytes()[:-3])
    return "chunk", str(chunk.relative_to(result))


def flip_in_a_coordinate(result: Path) -> tuple[str, str]:
    return "frame", str(flip(result / "fields.zarr" / "lat" / "c.0").relative_to(result))


def break_the_metadata(result: Path) -> tuple[str, str]:
    (result / "fields.zarr" / "ph_total_scale" / "zarr.json").write_text("{")
    return "frame", "fields.zarr/ph_total_scale/zarr.json"


def lose_a_marker(result: Path) -> tuple[str, str]:
    Ledger(result / LEDGER).place(6).unlink()
    return "marker", "ledger/0000/0000006.json"


def break_a_marker(result: Path) -> tuple[str, str]:
    flip(Ledger(result / LEDGER).place(2))
    return "marker", "ledger/0000/0000002.json"


def flip_in_the_file(result: Path) -> tuple[str, str]:
    return "file", str(flip(result / "fields.nc", 0.97).relative_to(result))


def lose_the_file(result: Path) -> tuple[str, str]:
    (result / "fields.nc").unlink()
    return "file", "fields.nc"


def flip_in_a_figure(result: Path) -> tuple[str, str]:
    return "file", str(flip(next((result / "figures").iterdir())).relative_to(result))


@pytest.mark.parametrize("harm", [
    cut_out_a_chunk, flip_in_a_chunk, cut_a_chunk_short, flip_in_a_coordinate, break_the_metadata, lose_a_marker,
    break_a_marker, flip_in_the_file, lose_the_file, flip_in_a_figure,
])  # fmt: skip
def test_damage_is_named_and_mended_and_nothing_else_is_touched(result, harm):
    before = contents(result)
    kind, place = harm(result)
    found = verify(result, Quiet(), sample=0).damages
    assert (kind, place) in {(each.kind, each.place) for each in found}
    harmed = contents(result)
    seen = {path: path.stat().st_mtime_ns for path in result.rglob("*") if path.is_file()}
    verdict = verify(result, Quiet(), sample=0, repair=True)
    assert verdict.damages == []
    assert set(map(str, found)) <= set(map(str, verdict.mended))
    after = contents(result)
    bookkeeping = {"journal.json", "ledger/charter.json"}
    # A marker that is made again tells other seconds; all else is what it was before the harm, byte for byte.
    again = {name for name in after if name.startswith("ledger/0000/")}
    assert {name: after[name] for name in after if name not in bookkeeping | again} == {
        name: before[name] for name in before if name not in bookkeeping | again}  # fmt: skip
    written = {str(path.relative_to(result)) for path in result.rglob("*") if path.is_file()
               and seen.get(path) != path.stat().st_mtime_ns} - bookkeeping - again  # fmt: skip
    assert written == ({place} if kind != "marker" else set()), "just what was harmed was written"
    assert harmed != before
    told = json.loads((result / "journal.json").read_text())["repairs"]
    assert len(told) == 1
    assert any(place in line for line in told[0]["mended"])
    assert not (result.parent / "moved.lock").exists()
    assert verify(result, Quiet(), sample=9).damages == []


def test_the_block_field_and_chunk_are_named(result):
    flip(chunks(result, "aragonite_saturation")[4])
    (damage,) = verify(result, Quiet(), sample=0).damages
    assert (damage.kind, damage.block, damage.field) == ("chunk", 5, "aragonite_saturation")
    assert damage.place.startswith("fields.zarr/aragonite_saturation/c.1.0.")
    assert str(damage) == "block 5: aragonite_saturation: is not as it was written"


def test_a_file_with_other_numbers_than_the_store_says_which(result):
    import netCDF4

    with netCDF4.Dataset(result / "fields.nc", "a") as file:
        file["ph_total_scale"][2, 0, 5, :] = 7.0
    found = verify(result, Quiet(), sample=0).damages
    assert {(each.place, each.block, each.field) for each in found} == {
        ("fields.nc", 9, "ph_total_scale"), ("fields.nc", 0, "")}  # fmt: skip


def test_numbers_that_another_making_does_not_give_are_found_and_mended(result, original):
    """A store and a ledger that agree may both be wrong: as when memory failed while they were written."""
    ledger = Ledger(result / LEDGER)
    chunk, other = chunks(result, "ph_total_scale")[3:5]
    marker, stranger = ledger.get(3), ledger.get(4)
    shutil.copyfile(other, chunk)
    (result / "fields.nc").unlink()
    swapped = {part: {**getattr(marker, part), "ph_total_scale": getattr(stranger, part)["ph_total_scale"]}
               for part in ("values", "chunks")}  # fmt: skip
    ledger.put(replace(marker, **swapped))
    assert [each.kind for each in verify(result, Quiet(), sample=0).damages] == ["file"]
    found = verify(result, Quiet(), sample=9).damages
    assert ("numbers", 4, "ph_total_scale") in {(each.kind, each.block, each.field) for each in found}
    assert verify(result, Quiet(), sample=9, repair=True).damages == []
    for name in ("fields.nc", str(chunk.relative_to(result))):
        assert (result / name).read_bytes() == (original / "result" / name).read_bytes()


def test_without_the_inputs_or_the_program_the_bytes_are_still_verified(result, original, monkeypatch):
    flip(chunks(result, "ph_total_scale")[0])
    now = charters.numeric_versions()
    with monkeypatch.context() as patch:
        patch.setattr(charters, "numeric_versions", lambda: {**now, "gsw": "0.1"})
        verdict = verify(result, Quiet(), repair=True)
    assert verdict.not_again == [f"program: gsw was {now['gsw']}, is 0.1"]
    aside = (original / "ocean.nc").rename(original / "aside.nc")
    try:
        verdict = verify(result, Quiet(), repair=True)
    finally:
        aside.rename(original / "ocean.nc")
    assert "ocean.nc" in verdict.not_again[0]
    assert (len(verdict.damages), verdict.mended, verdict.again) == (1, [], [])


def test_a_result_without_its_store_is_verified_by_its_file(original, tmp_path):
    settings = _recipe(original, folder=str(tmp_path / "file_only"), zarr=False)
    result = conduct(prepare(settings), Quiet()).written["NetCDF file"].parent
    assert verify(result, Quiet(), sample=1).damages == []
    flip(result / "fields.nc", 0.97)
    verdict = verify(result, Quiet(), sample=1, repair=True)
    assert {each.place for each in verdict.damages} == {"fields.nc"}
    assert verdict.mended == []


def test_what_is_no_finished_result_is_refused(tmp_path):
    with pytest.raises(OutputError, match="there is no such result"):
        verify(tmp_path / "none", Quiet())
    (tmp_path / "half.partial").mkdir()
    with pytest.raises(OutputError, match="an interrupted run has left part of it"):
        verify(tmp_path / "half", Quiet())
    (tmp_path / "old").mkdir()
    with pytest.raises(OutputError, match="it has no ledger"):
        verify(tmp_path / "old", Quiet())


def test_a_damaged_charter_is_said(result):
    flip(result / "ledger" / "charter.json")
    with pytest.raises(OutputError, match="its ledger cannot be read"):
        verify(result, Quiet())


def test_one_of_several_files_is_named_and_made_again(tmp_path, original):
    shutil.copyfile(original / "ocean.nc", tmp_path / "ocean.nc")
    written = conduct(prepare(_recipe(tmp_path, netcdf_files="by month")), Quiet()).written
    result = tmp_path / "result"
    assert written["NetCDF files"] == result / "netcdf"
    names = sorted(path.name for path in (result / "netcdf").iterdir())
    assert names == ["fields_2010-01.nc", "fields_2010-02.nc", "fields_2010-03.nc"]
    assert not (result / "fields.nc").exists()
    before = contents(result / "netcdf")
    assert verify(result, Quiet(), sample=0).damages == []
    flip(result / "netcdf" / names[1], 0.9)
    (result / "netcdf" / names[2]).unlink()
    assert [each.place for each in verify(result, Quiet(), sample=0).damages] == [f"netcdf/{name}" for name in names[1:]]
    assert verify(result, Quiet(), sample=0, repair=True).damages == []
    assert contents(result / "netcdf").keys() == before.keys()
    assert verify(result, Quiet(), sample=0).damages == []


def test_files_by_period_want_times_that_can_be_dated(tmp_path, original):
    with xr.open_dataset(original / "ocean.nc", decode_cf=False) as dataset:
        dataset.load()
    dataset["time"].attrs = {"axis": "T", "standard_name": "time", "units": "years gone by"}
    dataset.to_netcdf(tmp_path / "ocean.nc")
    with pytest.raises(GridcarbError) as caught:
        prepare(_recipe(tmp_path, netcdf_files="by year"))
    told = " ".join(map(str, (caught.value, *caught.value.others)))
    assert "output.netcdf_files" in told
    assert "`netcdf_files: one`" in told
