"""The survey: all that is there, all that is wrong, nothing raised."""

from __future__ import annotations

from pathlib import Path

import pytest

from gridcarb.errors import InputError
from gridcarb.sources import InputsSettings, gather, survey
from synthetic_grids.kinds import KINDS


def test_every_variable_has_its_reason(tmp_path: Path) -> None:
    KINDS["measures_raster"](tmp_path)
    found = survey(InputsSettings(files=("*.nc",)), tmp_path)
    assert found.faults == ()
    files = {Path(file.path).name: file for file in found.files}
    taken = {variable.name: variable.taken_as for variable in files["ocean.nc"].variables}
    assert taken["thetao"] == ("temperature",)
    assert taken["lat"] == ()
    variables = {variable.name: variable for variable in files["ocean.nc"].variables}
    assert variables["lat"].part == "coordinate"
    assert variables["lat_bnds"].part == "bounds"
    assert variables["dissic"].chances[0].how == "by standard_name"
    assert all(variable.chances or variable.why_none for file in found.files for variable in file.variables)
    fixed = {variable.name: variable for variable in files["fixed.nc"].variables}
    assert fixed["areacello"].part == "measure"
    assert fixed["areacello"].taken_as == ("area",)


def test_all_faults_at_once(ocean, save, tmp_path: Path) -> None:
    save(ocean(), tmp_path / "whole.nc")
    (tmp_path / "words.nc").write_text("no NetCDF at all")
    (tmp_path / "empty.nc").touch()
    double = ocean(["dissic"]).rename(dissic="again")
    save(double, tmp_path / "second.nc")
    found = survey(InputsSettings(files=("*.nc", "absent.nc")), tmp_path)
    assert found.files == ()  # the list of files itself is at fault
    assert "no such file" in found.faults[0].what
    found = survey(InputsSettings(files=("*.nc",)), tmp_path)
    failed = {Path(file.path).name: file.error for file in found.files if file.error}
    assert set(failed) == {"words.nc", "empty.nc"}
    assert len(found.faults) == 3
    assert "2 variables could be the dic" in found.faults[2].what
    chance = next(variable for file in found.files for variable in file.variables if variable.name == "again").chances[0]
    assert (chance.role, chance.taken) == ("dic", False)
    with pytest.raises(InputError) as caught:
        gather(InputsSettings(files=("*.nc",)), tmp_path)
    assert len(caught.value.others) == 2


def test_what_is_left_is_still_a_collection(ocean, save, tmp_path: Path) -> None:
    save(ocean(), tmp_path / "whole.nc")
    (tmp_path / "words.nc").write_text("no NetCDF at all")
    found = survey(InputsSettings(files=("*.nc",)), tmp_path)
    assert len(found.faults) == 1
    assert found.collection
    assert len(found.collection.roles) == 5


def test_chunks_and_compression_are_told(ocean, save, tmp_path: Path) -> None:
    packing = {"chunksizes": (1, 3, 2, 5), "zlib": True, "complevel": 3, "shuffle": True}
    save(ocean(), tmp_path / "ocean.nc", thetao=packing)
    (file,) = survey(InputsSettings(files=("ocean.nc",)), tmp_path).files
    variables = {variable.name: variable for variable in file.variables}
    assert (variables["thetao"].chunks, variables["thetao"].compression) == ((1, 3, 2, 5), "zlib 3, shuffle")
    save(ocean(), tmp_path / "ocean.zarr", "zarr3")
    (file,) = survey(InputsSettings(files=("ocean.zarr",)), tmp_path).files
    assert file.form == "zarr"
    assert file.variables[0].compression
