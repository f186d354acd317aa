"""Fields in groups: found where there is one place for them, asked for where there are several."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from gridcarb.errors import InputError
from gridcarb.sources import open_collection
from gridcarb.sources.places import join, split

FORMS = ["nc4", "zarr2", "zarr3"]


def _write(ds, path: Path, group: str, form: str) -> None:
    if form == "nc4":
        ds.to_netcdf(path, mode="a" if path.exists() else "w", group=group or None)
    else:
        ds.to_zarr(path, mode="a", group=group or None, zarr_format=int(form[-1]), consolidated=False)


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("group", ["model", "model/tracers"])
def test_the_only_group_is_entered(ocean, gathered, tmp_path: Path, form: str, group: str) -> None:
    _write(ocean(), tmp_path / "ocean", group, form)
    collection = gathered(tmp_path, files="ocean")
    assert [notice.state for notice in collection.notices] == [f"inputs: {{files: [{tmp_path / 'ocean'}#{group}]}}"]
    np.testing.assert_array_equal(open_collection(collection).dic, ocean().dissic)
    assert gathered(tmp_path, files=f"ocean#{group}").notices == ()


@pytest.mark.parametrize("form", FORMS)
def test_coordinates_may_lie_above(ocean, gathered, tmp_path: Path, form: str) -> None:
    ds = ocean()
    _write(ds[["time", "lev", "lat", "lon"]], tmp_path / "ocean", "", form)
    _write(ds.drop_vars(["lev", "lat", "lon"]), tmp_path / "ocean", "fields", form)
    found = open_collection(gathered(tmp_path, files="ocean#fields"))
    np.testing.assert_array_equal(found.lat, ds.lat)
    np.testing.assert_array_equal(found.dic, ds.dissic)


@pytest.mark.parametrize("form", FORMS)
def test_several_groups_are_a_question(ocean, gathered, tmp_path: Path, form: str) -> None:
    for group in ("control", "warming"):
        _write(ocean(), tmp_path / "ocean", group, form)
    with pytest.raises(InputError, match=r"several groups \(control, warming\)") as caught:
        gathered(tmp_path, files="ocean")
    assert "ocean#control" in caught.value.mend
    assert gathered(tmp_path, files="ocean#warming").files[0].path.endswith("#warming")
    with pytest.raises(InputError, match="no group 'cooling'"):
        gathered(tmp_path, files="ocean#cooling")


def test_a_name_with_the_sign_in_it(ocean, save, gathered, tmp_path: Path) -> None:
    path = save(ocean(), tmp_path / "run#3.nc")
    assert split(str(path)) == (str(path), "")
    assert gathered(tmp_path, files="run#*.nc").files[0].path == str(path)
    assert split(join("a.nc", "x/y")) == ("a.nc", "x/y")
