"""A byte that turns over in a finished result: found, named and mended through the command line."""

from __future__ import annotations

import json
from pathlib import Path

from click.testing import CliRunner, Result

from gridcarb.cli.main import main


def call(*words: object) -> Result:
    return CliRunner().invoke(main, [str(word) for word in words])


def test_a_byte_in_the_store_and_one_in_the_file(place) -> None:
    here = place(engine={"block": {"time": 2, "cells": 100}}, output={"netcdf": True})
    assert call("run", here.recipe, "--quiet").exit_code == 0
    wanted = {path: path.read_bytes() for path in here.result.rglob("*") if path.is_file()}
    assert call("verify", here.result, "--quiet").exit_code == 0
    chunk = sorted((here.result / "fields.zarr" / "ph_total_scale").glob("c.*"))[2]
    turn_over(chunk)
    turn_over(here.result / "fields.nc")

    found = call("verify", here.result, "--json")
    assert found.exit_code == 8
    told = json.loads(found.stdout)
    inside = str(chunk.relative_to(here.result))
    assert {(each["kind"], each["place"]) for each in told["damages"]} == {("chunk", inside), ("file", "fields.nc")}
    assert [each["field"] for each in told["damages"] if each["place"] == inside] == ["ph_total_scale"]
    assert f"gridcarb verify {here.result} --repair" in json.loads(found.stderr)["error"]["mend"]

    words = call("verify", here.result)
    assert words.exit_code == 8
    assert inside in words.stdout
    assert "to mend it: " in words.stderr
    assert "Traceback" not in words.output

    assert call("verify", here.result, "--repair", "--json").exit_code == 0
    books = {"journal.json", "charter.json"}
    harmed = [path for path, content in wanted.items() if path.read_bytes() != content and path.name not in books]
    assert [path for path in harmed if "ledger" not in path.parts] == []
    assert call("verify", here.result, "--quiet", "--sample", 6).exit_code == 0
    assert json.loads(call("status", here.result, "--json").stdout)["state"] == "complete"


def turn_over(path: Path) -> None:
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.write_bytes(content)
