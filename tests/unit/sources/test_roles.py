"""Who plays which role: by standard_name, by name, or as told; never by guessing between two."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from gridcarb.errors import InputError, UnknownWordError
from gridcarb.sources import find_roles

CMIP = {"temperature": "thetao", "salinity": "so", "dic": "dissic", "alkalinity": "talk", "phosphate": "po4"}


def _bare(*names: str, dims: tuple[str, ...] = ("lev", "lat", "lon"), **standard_names: str) -> xr.Dataset:
    sizes = {"time": 2, "lev": 3, "lat": 4, "lon": 5}
    attrs = {name: {"standard_name": standard_names[name]} if name in standard_names else {} for name in names}
    return xr.Dataset({name: (dims, np.zeros([sizes[dim] for dim in dims]), attrs[name]) for name in names})


def test_standard_names_come_first(ocean) -> None:
    ds = ocean().rename(thetao="a", so="b", dissic="c", talk="d", po4="e")
    ds["temp"], ds["salt"] = ds.a.drop_attrs(), ds.b.drop_attrs()
    assert find_roles(ds) == dict(zip(CMIP, "abcde", strict=True))


@pytest.mark.parametrize("names", [
    ("thetao", "so", "dissic", "talk"), ("votemper", "vosaline", "DIC", "Alk"), ("TEMP", "SALT", "DIC", "ALK"),
    ("temperature", "salinity", "TCO2", "TAlk"), ("theta", "Sal", "dic", "total_alkalinity"),
])
def test_names_where_attributes_are_silent(names: tuple[str, ...]) -> None:
    assert list(find_roles(_bare(*names)).values()) == list(names)


def test_an_earlier_convention_is_believed_before_a_later_one() -> None:
    assert find_roles(_bare("temp", "thetao", "so", "dissic", "talk"))["temperature"] == "thetao"


def test_decoded_and_raw_headers_agree(ocean) -> None:
    assert find_roles(xr.decode_cf(ocean())) == find_roles(ocean()) == CMIP


def test_two_candidates_are_a_question_for_the_user() -> None:
    kinds = {"a": "sea_water_potential_temperature", "b": "sea_water_conservative_temperature"}
    ds = _bare("a", "b", "so", "dissic", "talk", **kinds)
    with pytest.raises(InputError, match=r"2 variables could be the temperature: 'a' .*'b'") as caught:
        find_roles(ds)
    assert "`inputs: {temperature: a}` or `inputs: {temperature: b}`" in caught.value.mend
    assert find_roles(ds, {"temperature": "b"})["temperature"] == "b"


def test_missing_roles_are_told_together(ocean) -> None:
    with pytest.raises(InputError, match="no variable is known as dic or alkalinity") as caught:
        find_roles(ocean().drop_vars(["dissic", "talk"]))
    assert "`inputs: {dic: NAME}`" in caught.value.mend
    assert "thetao" in caught.value.mend


def test_a_name_that_is_not_there(ocean) -> None:
    with pytest.raises(InputError, match="no variable 'disic' to be the dic") as caught:
        find_roles(ocean(), {"dic": "disic"})
    assert "did you mean 'dissic'?" in caught.value.mend


def test_swapped_roles_are_refused(ocean) -> None:
    with pytest.raises(InputError, match=r"'talk' is the dic.*says alkalinity") as caught:
        find_roles(ocean(), {"dic": "talk", "alkalinity": "dissic"})
    assert "`inputs: {alkalinity: talk}`" in caught.value.mend


def test_an_unknown_role_word(ocean) -> None:
    with pytest.raises(UnknownWordError, match="no role 'salt'"):
        find_roles(ocean(), {"salt": "so"})


def test_a_standard_name_of_something_else_rules_a_name_out() -> None:
    ds = _bare("temp", "salt", "dic", "ta", ta="air_temperature")
    with pytest.raises(InputError, match="known as alkalinity"):
        find_roles(ds)


def test_bounds_and_coordinates_play_no_role() -> None:
    ds = _bare("thetao", "so", "dissic", "talk")
    ds["thetao"].attrs["coordinates"] = "sal"
    ds["sal"] = ("lev", [1.0, 2.0, 3.0])
    ds = ds.assign_coords(si=("si", [1.0]))
    assert "silicate" not in find_roles(ds)


def test_water_columns_go_before_surface_fields_where_all_have_them() -> None:
    deep = _bare("thetao", "so", "dissic", "talk", "po4")
    surface = _bare("tos", "sos", "dissicos", "talkos", "po4os", dims=("lat", "lon"))
    assert find_roles(xr.merge([deep, surface])) == CMIP


def test_surface_fields_where_one_role_has_no_columns() -> None:
    deep = _bare("thetao", "so", "talk", "po4")
    surface = _bare("tos", "sos", "dissicos", "talkos", dims=("lat", "lon"))
    assert list(find_roles(xr.merge([deep, surface])).values()) == ["tos", "sos", "dissicos", "talkos"]


def test_a_surface_nutrient_is_left_aside_unless_named(gathered, ocean, save, tmp_path) -> None:
    ds = ocean().drop_vars("po4")
    ds["si"] = ds.so.isel(lev=0, drop=True).drop_attrs()
    save(ds, tmp_path / "a.nc")
    collection = gathered(tmp_path, files="a.nc")
    assert "silicate" not in collection.roles
    assert [notice.code for notice in collection.notices] == ["left-aside"]
    with pytest.raises(InputError, match="'si' has no levels"):
        gathered(tmp_path, files="a.nc", silicate="si")


def test_a_role_known_by_name_is_told(gathered, ocean, save, tmp_path) -> None:
    ds = ocean()
    del ds.so.attrs["standard_name"]
    save(ds, tmp_path / "a.nc")
    collection = gathered(tmp_path, files="a.nc")
    assert [(notice.code, notice.state) for notice in collection.notices] == [("role-by-name", "inputs: {salinity: so}")]
    assert [row["match"] for row in collection.describe()][:2] == ["by standard_name", "by name (CMIP)"]
    told = gathered(tmp_path, files="a.nc", salinity="so")
    assert told.notices == ()
    assert told.roles["salinity"].how == "as told"
