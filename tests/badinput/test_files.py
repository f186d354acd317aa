"""Files that are missing, damaged, or something else."""

from __future__ import annotations

import json
import subprocess
import sys

import numpy as np
import pytest
import xarray as xr
from click.testing import CliRunner

from gridcarb.cli.main import main


def test_a_missing_file(bench, ocean) -> None:
    bench.put(ocean())
    bench.say({"inputs": {"files": "oceans.nc"}})
    told = bench.refusal(3)
    assert told.where == str(bench.folder / "oceans.nc")
    assert "no such file" in told.what
    assert "ocean.nc" in told.mend
    bench.say({"inputs": {"files": "ocean.nc"}})
    bench.success()


def test_a_pattern_without_a_match_on_the_command_line(bench, ocean) -> None:
    bench.put(ocean())
    told = bench.refusal(3, "--input", str(bench.folder / "run_2" / "*.nc"))
    assert "no file matches" in told.what
    assert "ocean.nc" in told.mend
    bench.success("--input", str(bench.folder / "*.nc"))


@pytest.mark.parametrize("content", [b"", b"lat,lon,dic\n1,2,3\n", b"\x89PNG\r\n\x1a\n" + bytes(500), b"GRIB" + bytes(900)])
def test_not_a_netcdf(bench, ocean, content: bytes) -> None:
    bench.put(ocean())
    (bench.folder / "thing.nc").write_bytes(content)
    told = bench.refusal(3)
    assert told.where == str(bench.folder / "thing.nc")
    assert "empty" in told.what if not content else "neither a NetCDF file nor a Zarr store" in told.what
    assert "leave it out" in told.mend
    bench.say({"inputs": {"files": "ocean.nc"}})
    bench.success()


def test_a_folder_in_place_of_its_files(bench, ocean) -> None:
    (bench.folder / "data").mkdir()
    bench.put(ocean(), "data/ocean.nc")
    bench.say({"inputs": {"files": "data"}})
    told = bench.refusal(3)
    assert "folder" in told.what
    pattern = told.mend.split("`")[1]
    bench.say({"inputs": {"files": pattern}})
    bench.success()


@pytest.mark.parametrize("form", ["NETCDF4", "NETCDF3_CLASSIC"])
@pytest.mark.parametrize("kept", [0.3, 0.98])
def test_a_truncated_file(bench, ocean, form: str, kept: float) -> None:
    path = bench.folder / "ocean.nc"
    ocean().to_netcdf(path, format=form, engine="netcdf4")
    whole = path.read_bytes()
    path.write_bytes(whole[:int(kept * len(whole))])
    told = bench.refusal(3)
    assert told.where == str(path)
    assert "cut short" in told.what
    assert "copy it again" in told.mend
    path.write_bytes(whole)
    bench.success()


def test_a_file_without_any_field(bench, ocean) -> None:
    axes_only = ocean().drop_vars(["thetao", "so", "dissic", "talk", "po4", "si"])
    bench.put(axes_only)
    told = bench.refusal(3)
    assert "no variable is known as temperature or salinity or dic or alkalinity" in told.what
    assert "hold no fields" in told.mend


def test_a_file_of_station_names(bench) -> None:
    names = xr.Dataset({"station": ("station", np.array(["harbour", "bar", "deep"]))})
    names.to_netcdf(bench.folder / "ocean.nc")
    assert "no variable is known as" in bench.refusal(3).what


def test_data_given_as_recipe(bench, ocean) -> None:
    path = bench.put(ocean())
    ended = CliRunner().invoke(main, ["run", str(path)])
    assert (ended.exit_code, ended.stdout) == (2, "")
    assert "not a text file" in ended.stderr
    assert "gridcarb run RECIPE --input DATA" in ended.stderr
    bench.success("--input", str(path))


def test_from_a_terminal_an_error_is_three_lines_and_an_exit_code(bench) -> None:
    bench.recipe.write_text("recipe: 1\ninputs: {files: lost.nc}\nchemistry: {fields: all}\noutput: {folder: result}\n")
    command = "import sys; from gridcarb.cli.main import main; sys.exit(main())"
    words = [sys.executable, "-c", command, "run", str(bench.recipe)]
    ended = subprocess.run(words, capture_output=True, text=True, check=False)
    assert (ended.returncode, ended.stdout) == (3, "")
    where, what, mend = ended.stderr.splitlines()
    assert (where, what) == (str(bench.folder / "lost.nc"), "there is no such file")
    assert mend.startswith("to mend it: correct `inputs: files`")
    assert list(bench.folder.iterdir()) == [bench.recipe]


def test_a_plan_refuses_what_a_run_refuses(bench, ocean) -> None:
    bench.put(ocean().drop_vars("talk"))
    told = bench.refusal(3)
    ended = CliRunner().invoke(main, ["plan", str(bench.recipe)])
    assert (ended.exit_code, ended.stdout) == (3, "")
    assert ended.stderr.splitlines() == [told.where, told.what, f"to mend it: {told.mend}"]


def test_for_machines_an_error_is_one_json_document(bench, ocean) -> None:
    bench.put(ocean().drop_vars("talk"))
    told = bench.refusal(3)
    ended = bench.run("--json")
    assert (ended.exit_code, ended.stdout) == (3, "")
    error = json.loads(ended.stderr)["error"]
    assert error == {"kind": "InputError", "where": told.where, "what": told.what, "mend": told.mend, "exit_code": 3}


def test_a_chunk_that_breaks_in_the_middle_of_a_run(bench, ocean) -> None:
    """The headers and the sample are sound: the block fails, the run ends incomplete and can be gone on with; what was
    there before stays."""
    ds = ocean().drop_encoding().chunk(lev=1)
    ds.to_zarr(bench.folder / "ocean.zarr", consolidated=False, zarr_format=2)
    bench.say({"inputs": {"files": "ocean.zarr"}})
    assert bench.run("--quiet").exit_code == 0
    before = (bench.result / "journal.json").read_bytes()
    deep = bench.folder / "ocean.zarr" / "talk" / "2.0.0"
    deep.write_bytes(deep.read_bytes()[:20])
    ended = bench.run()
    assert ended.exit_code == 6
    assert "--resume" in ended.stderr
    assert f"{bench.folder / 'ocean.zarr'}: talk" in ended.stderr
    assert "damaged or cut short" in ended.stderr
    assert "Traceback" not in ended.stderr
    assert (bench.result / "journal.json").read_bytes() == before
    assert json.loads((bench.folder / "result.partial" / "journal.json").read_text())["state"] == "failed"
    assert not (bench.folder / "result.lock").exists()
