"""A plan says everything, writes nothing, and refuses what could not end well."""

from __future__ import annotations

import json
import math
import pickle
from pathlib import Path

import pytest

from gridcarb.errors import GridcarbError, OutputError
from gridcarb.fields import FIELDS
from gridcarb.run.plan import prepare, source_chunks


def names(folder: Path) -> list[str]:
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*"))


def strict(content: object) -> object:
    """There and back through JSON as RFC 8259 has it; anything else raises."""
    return json.loads(json.dumps(content, allow_nan=False))


def test_a_plan_writes_nothing(recipe, tmp_path) -> None:
    prepare(recipe()).report().as_dict()
    assert names(tmp_path) == []


def test_the_report_is_strict_json_and_complete(recipe, ocean_file, tmp_path) -> None:
    plan = prepare(recipe(title="An invented one", engine={"block": {"time": 1, "cells": 24}}))
    told = plan.report().as_dict()
    assert strict(told) == told
    assert told["title"] == "An invented one"
    assert {row["role"]: row["variable"] for row in told["inputs"]} == {
        "temperature": "thetao", "salinity": "so", "dic": "dissic", "alkalinity": "talk", "phosphate": "po4",
        "silicate": "si",
    }
    assert told["grid"] == {"kind": "rectilinear", "sizes": {"time": 3, "lev": 5, "lat": 6, "lon": 12}}
    assert told["blocks"]["count"] == len(plan.layout) == 9
    assert told["bytes"] == {"in": 6 * 3 * 5 * 6 * 12 * 4, "out": 3 * 5 * 6 * 12 * (4 + 4 + 1)}
    assert told["memory"]["projected_per_task"] <= told["memory"]["allowed_per_task"]
    assert told["fields"] == ["ph_total_scale", "aragonite_saturation", "solution_status"]
    assert told["result"] == str(tmp_path / "result")
    density = next(row for row in told["understood"] if row["subject"] == "density")
    assert "1026 kg m-3" in density["reading"]
    assert density["because"] == "stated in the recipe"


def test_sections_hold_words_for_people(recipe) -> None:
    report = prepare(recipe()).report()
    assert [section.title for section in report.sections] == [
        "What will be read", "How it is understood", "What will be computed", "What it will take", "Where it will go",
    ]
    for section in report.sections:
        assert section.rows
        assert all(label and value and isinstance(value, str) for label, value in section.rows), section.title
    rows = {label: value for section in report.sections for label, value in section.rows}
    assert "3 x lev 5 x lat 6 x lon 12 = 1,080 cells" in rows["grid"]
    assert rows["holding"] == "Zarr store (format 3), journal"
    assert rows["memory"].endswith("the program itself takes about 400 MB")
    assert rows["room there"].endswith("B free")


def test_every_notice_is_told_once(recipe, ocean, save_ocean, tmp_path) -> None:
    """Scale unsaid and density assumed: a notice each, with the line that states it; stated, they are gone."""
    path = save_ocean(ocean(4, 6, 1, salinity="unsaid").drop_vars(["po4", "si"]), tmp_path / "bare.nc")
    zero = {"phosphate": "assume zero", "silicate": "assume zero"}
    plan = prepare(recipe(path, reading={**zero, "density": None}))
    keys = [(notice.code, notice.text) for notice in plan.notices]
    assert len(set(keys)) == len(keys)
    assert {"density_assumed"} <= {notice.code for notice in plan.notices}
    assert plan.report().as_dict()["notices"] == [notice.as_dict() for notice in plan.notices]
    stated = prepare(recipe(path, reading={**zero, "density": "1025 kg m-3", "salinity": "practical"}))
    # What only another file could tell stays: how thick a cell is that the sea floor cuts.
    assert {notice.code for notice in stated.notices} == {"thickness_from_edges"}


def test_status_is_written_once_and_last(recipe) -> None:
    plan = prepare(recipe(chemistry={"fields": ["solution_status", "ph_total_scale"]}))
    assert [field.key for field in plan.fields] == ["ph_total_scale", "solution_status"]
    everything = prepare(recipe(chemistry={"fields": "all"}))
    assert {field.key for field in everything.fields} == {key for key, field in FIELDS.items() if field.part != "input"}


def test_source_chunks_are_those_of_the_file_and_blocks_follow_them(recipe) -> None:
    plan = prepare(recipe(engine={"block": {"time": 1, "cells": 50}}))
    assert source_chunks(plan.collection) == {"time": 1, "lev": 5, "lat": 3, "lon": 12}
    assert plan.layout.block == {"time": 1, "lev": 5, "lat": 3, "lon": 12}
    assert (plan.blocks_of_a_chunk(), plan.reads_of_a_chunk(), plan.kept) == (1, 1, 0)
    small = prepare(recipe(engine={"block": {"time": 1, "cells": 4}}))
    assert (small.blocks_of_a_chunk(), small.reads_of_a_chunk()) == (9, 1)
    assert small.kept == 2 * 4 * 6 * 5 * 3 * 12  # twice the chunks of six roles in single precision
    rows = {label: value for section in small.report().sections for label, value in section.rows}
    assert rows["reading"].startswith("a chunk of the source is read once and kept for the 9 blocks that need it")


def test_chunks_that_cannot_be_kept_are_told(recipe, ocean, save_ocean, tmp_path) -> None:
    path = save_ocean(ocean(60, 120, 1), tmp_path / "ocean.nc", time=1, lat=60)
    words = {"engine": {"workers": 2, "memory": "8.5 MB", "block": {"cells": 40}}, "output": {"chunks": {"cells": 40}}}
    plan = prepare(recipe(path, **words))
    assert (plan.kept, plan.reads_of_a_chunk()) == (0, 180)
    rows = {label: value for section in plan.report().sections for label, value in section.rows}
    assert "read up to 180 times: blocks are smaller than its chunks; to keep these would take" in rows["reading"]
    words["engine"]["memory"] = f"{math.ceil(plan.memory_to_read_once() / 1e3) / 1e3:.3f} MB"
    assert prepare(recipe(path, **words)).reads_of_a_chunk() == 1


def test_a_job_travels(recipe, tmp_path) -> None:
    job = prepare(recipe()).job(tmp_path)
    sent = pickle.dumps(job)
    assert len(sent) < 100_000
    assert pickle.loads(sent).keys == job.keys


@pytest.mark.parametrize(("sections", "code", "words"), [
    ({"inputs": {"files": "no/such/*.nc"}}, 3, "no/such"),
    ({"reading": {"density": "10 kg m-3"}}, 3, "density"),
    ({"figures": [{"kind": "map", "field": "ph_total_scale", "time": "2050-01-01"}]}, 3, "2050"),
    ({"engine": {"memory": "1 MB"}}, 5, "memory"),
])
def test_what_could_not_end_well_is_refused_before_anything_is_written(recipe, tmp_path, sections, code, words) -> None:
    with pytest.raises(GridcarbError) as caught:
        prepare(recipe(**sections))
    assert caught.value.exit_code == code
    assert words in str(caught.value)
    assert names(tmp_path) == []


def test_per_volume_output_of_input_per_mass_needs_a_density(recipe, ocean, save_ocean, tmp_path) -> None:
    path = save_ocean(ocean(4, 6, 1, tracer_units="umol kg-1"), tmp_path / "mass.nc")
    volumes = {"amounts": "per volume"}
    with pytest.raises(OutputError, match="need a density") as caught:
        prepare(recipe(path, reading={"density": None}, output=volumes))
    assert "reading: {density: 1025 kg m-3}" in caught.value.mend
    for density in ("1025 kg m-3", "in situ"):
        plan = prepare(recipe(path, reading={"density": density}, output=volumes, chemistry={"fields": ["carbonate_ion"]}))
        assert [field.units for field in plan.fields] == ["mol m-3", "1"]


def test_an_existing_result_is_refused_in_the_plan(recipe, tmp_path) -> None:
    (tmp_path / "result").mkdir()
    with pytest.raises(OutputError, match="exists already"):
        prepare(recipe())
    prepare(recipe(output={"replace": True}))
