"""The audit finds everything at once, each with its cure; plan and run go through the same door."""

from __future__ import annotations

import json
import pickle
import re
from dataclasses import replace
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import Faults, GridcarbError, InputError, RecipeError
from gridcarb.recipe import check, load
from gridcarb.run import audit_files, audit_recipe, conduct, prepare
from gridcarb.run.findings import Finding, worst
from gridcarb.run.layout_in_files import chunk_findings
from gridcarb.sources import ArraySource, InputsSettings, RoleSource, Segment, gather
from synthetic_grids.kinds import KINDS


def stops(audit) -> list[Finding]:
    return [finding for finding in audit.findings if finding.level == "stop"]


def of(audit, subject: str) -> list[str]:
    return [finding.text for finding in audit.findings if finding.subject == subject]


def test_the_worst_finding() -> None:
    fine, assumed, stop = (Finding(level, "", "") for level in ("fine", "assumed", "stop"))
    assert worst([]) == worst([fine]) == "fine"
    assert worst([assumed, fine]) == "assumed"
    assert worst([assumed, stop, fine]) == "stop"


def test_files_that_can_be_run(ocean_file) -> None:
    audit = audit_files([str(ocean_file)])
    assert audit.worst == "assumed"  # the density, at least
    assert [finding.cure for finding in audit.findings if finding.subject == "density assumed"] == [
        "reading: {density: 1025 kg m-3}",
    ]
    assert "rectilinear: time 3 x lev 5 x lat 6 x lon 12" in of(audit, "grid")[0]
    assert of(audit, "vertical") == ["'lev' in m, positive down"]
    assert of(audit, "time") == [
        "2010-01-16 12:00 to 2010-03-16 12:00, 3 steps, calendar 365_day, bounds 'time_bnds', in 1 file",
    ]
    assert re.search(r"temperature [12]\d(\.\d+)? degC, salinity 3\d", of(audit, "sample")[0])
    told = audit.report().as_dict()
    assert json.loads(json.dumps(told, allow_nan=False)) == told
    roles = {row["name"]: [each["role"] for each in row["roles"] if each["taken"]] for row in told["variables"]}
    assert roles["thetao"] == ["temperature"]
    assert roles["talk"] == ["alkalinity"]
    assert roles["lev"] == []
    assert told["counts"]["stop"] == 0


def test_all_faults_are_told_at_once_by_audit_and_plan(ocean, save_ocean, recipe, tmp_path) -> None:
    """No kind of temperature, an unknown unit, and no alkalinity: three cures in one go."""
    bad = ocean().drop_vars("talk")
    bad["thetao"].attrs = {"units": "degC"}
    bad["dissic"].attrs["units"] = "frobs"
    path = save_ocean(bad.rename(thetao="temperature"), tmp_path / "bad.nc")
    audit = audit_files([str(path)])
    cures = " ".join(finding.cure for finding in stops(audit))
    assert len(stops(audit)) == 3
    for words in ("inputs: {alkalinity: NAME}", "reading: {units: {dic:", "reading: {temperature: potential}"):
        assert words in cures
    with pytest.raises(GridcarbError) as caught:
        prepare(recipe(path))
    told = [caught.value, *caught.value.others]
    assert sorted(error.what for error in told) == sorted(finding.text for finding in stops(audit))
    assert str(caught.value).count("to mend it: ") == 3
    assert "and 2 more:" in str(caught.value)


def test_what_is_whole_is_still_told_beside_a_stop(ocean, save_ocean, tmp_path) -> None:
    bad = ocean()
    bad["talk"].attrs["units"] = "frobs"
    audit = audit_files([str(save_ocean(bad, tmp_path / "bad.nc"))])
    assert [finding.text for finding in stops(audit) if "frobs" in finding.text]
    assert of(audit, "temperature")
    assert of(audit, "pressure")
    assert of(audit, "dic")


@pytest.mark.parametrize("make", [
    lambda path: path.write_bytes(b""),
    lambda path: path.write_text("these are no numbers"),
    lambda path: xr.Dataset({"a": ("x", np.arange(3.0))}).to_netcdf(path),
    lambda path: xr.Dataset().to_netcdf(path),
    lambda path: xr.Dataset({"names": ("x", np.array(["one", "two"], dtype=object))}).to_netcdf(path),
])
def test_files_that_are_not_ours(make, tmp_path) -> None:
    make(tmp_path / "strange.nc")
    audit = audit_files([str(tmp_path / "strange.nc")])
    assert audit.worst == "stop"
    assert all(finding.cure for finding in stops(audit))
    assert audit.report().sections


def test_no_file_at_all(tmp_path) -> None:
    audit = audit_files([str(tmp_path / "*.nc")])
    assert audit.worst == "stop"
    assert "no file matches" in stops(audit)[0].text


def test_a_bad_file_among_good_ones(ocean, save_ocean, tmp_path) -> None:
    months = ocean()
    for step in range(3):
        save_ocean(months.isel(time=slice(step, step + 1)), tmp_path / f"{step}.nc")
    (tmp_path / "2.nc").write_bytes((tmp_path / "2.nc").read_bytes()[:3000])
    audit = audit_files([str(tmp_path / "*.nc")])
    assert ["2.nc" in finding.where for finding in stops(audit)] == [True]
    assert "2 steps" in of(audit, "time")[0]
    assert audit.report().as_dict()["files"] == 3
    rows = dict(audit.report().sections[0].rows)
    assert rows["files"].endswith("1 cannot be read")
    assert "in 2 files: temperature (by standard_name)" in rows["thetao"]


def test_a_starter_recipe_runs_and_leaves_nothing_assumed_that_can_be_stated(ocean_file, watcher, tmp_path) -> None:
    audit = audit_files([str(ocean_file)])
    place = tmp_path / "begin.yaml"
    place.write_text(audit.starter(place))
    recipe = load(place)
    assert recipe.reading.density == "1025 kg m-3"
    again = audit_recipe(recipe)
    assert [finding for finding in again.findings if finding.level == "assumed" and finding.cure] == []
    outcome = conduct(prepare(recipe), watcher)
    assert outcome.status_counts["solved"] > 0
    journal = json.loads((recipe.output_folder() / "journal.json").read_text())
    assert journal["audit"]["counts"]["stop"] == 0
    assert [row["text"] for row in journal["audit"]["findings"] if row["subject"] == "density"] == of(again, "density")


def test_a_starter_recipe_asks_what_is_open(ocean, save_ocean, tmp_path) -> None:
    bad = ocean().drop_vars("si")
    bad["dissic"].attrs["units"] = "frobs"
    audit = audit_files([str(save_ocean(bad, tmp_path / "a b: c.nc"))])
    text = audit.starter(tmp_path / "begin.yaml")
    (tmp_path / "begin.yaml").write_text(text)
    recipe = load(tmp_path / "begin.yaml")
    assert recipe.inputs.files == (str(tmp_path / "a b: c.nc"),)
    assert text.count("# QUESTION: ") >= 2
    assert "\n  # silicate: assume zero\n" in text
    answered = text.replace("  # silicate: assume zero", "  silicate: assume zero").replace(
        "reading: {}", "reading:").replace("# units: {dic: mol m-3}", "units: {dic: mol m-3}")
    (tmp_path / "begin.yaml").write_text(answered)
    prepare(load(tmp_path / "begin.yaml"))


def test_paths_are_told_from_where_the_starter_lies(ocean_file, tmp_path, monkeypatch) -> None:
    monkeypatch.chdir(ocean_file.parent)
    (tmp_path / "there").mkdir()
    audit = audit_files([ocean_file.name])
    place = tmp_path / "there" / "begin.yaml"
    place.write_text(audit.starter(place))
    assert gather(load(place).inputs, place.parent).files[0].path == str(ocean_file)


def test_many_files_are_named_by_a_glob(ocean, save_ocean, tmp_path, monkeypatch) -> None:
    monkeypatch.chdir(tmp_path)
    for name in ("thetao", "so", "dissic", "talk", "po4", "si"):
        for step in range(2):
            save_ocean(ocean()[[name]].isel(time=slice(step, step + 1)), tmp_path / f"{name}{step}.nc")
    names = [path.name for path in sorted(tmp_path.glob("*.nc"))]
    assert '"*.nc"' in audit_files(names).starter(tmp_path / "r.yaml").replace("'", '"')
    assert "talk0.nc" in audit_files(names[1:]).starter(tmp_path / "r.yaml")


def test_two_figures_of_one_file_are_refused_with_their_lines(ocean_file, tmp_path) -> None:
    text = "\n".join([
        "recipe: 1", f"inputs: {{files: {ocean_file}}}", "reading: {density: 1026 kg m-3}",
        "chemistry: {fields: [ph_total_scale]}", f"output: {{folder: {tmp_path / 'result'}}}", "figures:",
        "  - {kind: map, field: ph_total_scale, depth: 0}", "  - {kind: map, field: ph_total_scale, depth: 1}",
    ])
    with pytest.raises(RecipeError) as caught:
        prepare(check(text))
    (fault,) = caught.value.faults
    assert (fault.line, fault.key) == (8, "figures[1]")
    assert "line 7" in fault.what
    assert "`file: " in fault.mend
    prepare(check(text.replace("depth: 1}", "depth: 1, file: other.png}")))
    with pytest.raises(RecipeError, match="one fault"):
        prepare(check(text.replace("depth: 0}", "depth: 0, file: x.png}").replace("depth: 1}", "depth: 300, file: x.png}")))


def test_faults_of_every_part_of_a_recipe_are_told(recipe, tmp_path) -> None:
    (tmp_path / "result").mkdir()
    bad = recipe(figures=[{"kind": "map", "field": "ph_total_scale", "time": "2050-01-01"}], engine={"memory": "1 MB"})
    audit = audit_recipe(bad)
    assert sorted(finding.subject for finding in stops(audit)) == ["engine", "figures", "result"]
    with pytest.raises(GridcarbError) as caught:
        prepare(bad)
    assert len(caught.value.others) == 2


@pytest.mark.parametrize(("chunks", "words", "cure"), [
    ({}, "contiguous", ""),
    ({"time": 1}, "chunks of time 1 x lev 5 x lat 6 x lon 12 (1.44 kB uncompressed), 3 in all", ""),
])
def test_how_files_are_laid_out(ocean, save_ocean, tmp_path, chunks, words, cure) -> None:
    path = save_ocean(ocean(), tmp_path / "a.nc", **chunks)
    found = list(chunk_findings(gather(InputsSettings(files=(str(path),)), tmp_path)))
    assert len(found) == 1
    assert words in found[0].text
    assert found[0].cure == cure


def test_a_chunk_that_is_too_large_for_small_blocks(tmp_path) -> None:
    array = ArraySource(
        dims=("time", "lev", "lat", "lon"), shape=(120, 75, 1000, 1400), dtype="float32", attrs={}, file_axes=(0, 1, 2, 3),
        file_rank=4, chunks=(12, 75, 100, 140), segments=(Segment("a.nc", "t", 0, 120),), time_axis=0)

    small = RoleSource("salinity", "s", "as told", replace(array, chunks=(1, 1, 10, 10)))
    roles = {"temperature": RoleSource("temperature", "t", "as told", array), "salinity": small}
    large, small = chunk_findings(SimpleNamespace(roles=roles, axes=SimpleNamespace(time="time")))
    assert "decompresses the whole of it" in large.text
    assert "{time: 12}" in large.cure
    assert "longer to find" in small.text


def test_errors_bring_their_fellows_across_workers() -> None:
    faults = Faults()
    faults.put(InputError("one", where="a.nc: x", mend="m"))
    faults.put(InputError("one", where="a.nc: y"))
    faults.put(InputError("two", where="b"))
    with pytest.raises(InputError) as caught:
        faults.tell()
    sent = pickle.loads(pickle.dumps(caught.value))
    assert (sent.what, sent.where, [other.what for other in sent.others]) == ("one", "a.nc: x, y", ["two"])


def test_paths_stay_paths(ocean_file) -> None:
    assert Path(audit_files([str(ocean_file)]).inspection.survey.files[0].path) == ocean_file


@pytest.mark.parametrize(("kind", "words"), [
    ("grid_casts", "a time for each place"), ("time_none", "no time"), ("time_scalar", "2010-11-16, calendar 365_day"),
    ("time_without_bounds", "no bounds"), ("time_climatology", "of a climatology"),
])
def test_times_in_words(kind, words, tmp_path) -> None:
    audit = audit_files([str(path) for path in KINDS[kind](tmp_path)])
    assert words in of(audit, "time")[0]
    assert audit.worst != "stop"


def test_masks_that_disagree_are_a_stop_that_names_its_cure(tmp_path) -> None:
    for folder in ("much", "little"):
        (tmp_path / folder).mkdir()
    audit = audit_files([str(path) for path in KINDS["mask_lacking_10_percent"](tmp_path / "much")])
    (stop,) = stops(audit)
    assert "`reading: {mask_difference: 0.11}`" in stop.cure
    slight = audit_files([str(path) for path in KINDS["mask_lacking_1_percent"](tmp_path / "little")])
    assert of(slight, "masks differ")
