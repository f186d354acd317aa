"""The lazy face refuses the same things; what the messages name is given as `names` and `reading`."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
import xarray as xr
from ruamel.yaml import YAML

from gridcarb import GridcarbError, derive
from gridcarb.errors import UnknownWordError

FIELDS = ["ph_total_scale"]


def _refused(ds: xr.Dataset, **words: Any) -> GridcarbError:
    with pytest.raises(GridcarbError) as caught:
        derive(ds, **{"fields": FIELDS, **words})
    assert caught.value.what
    return caught.value


def _without(name: str, key: str) -> Callable[[xr.Dataset], xr.Dataset]:
    def change(ds: xr.Dataset) -> xr.Dataset:
        del ds[name].attrs[key]
        return ds

    return change


def _swapped(ds: xr.Dataset) -> xr.Dataset:
    for name in ("dissic", "talk"):
        ds = _without(name, "standard_name")(ds)
    return ds.rename(dissic="talk", talk="dissic")


def _nameless(ds: xr.Dataset) -> xr.Dataset:
    return _without("dissic", "standard_name")(ds).rename(dissic="tracer_07")


CASES: dict[str, tuple[Callable[[xr.Dataset], xr.Dataset], str, dict[str, str]]] = {
    "missing units": (_without("dissic", "units"), "units are missing", {"mol m-3": "umol kg-1"}),
    "no candidate": (_nameless, "no variable is known as dic", {"NAME": "tracer_07"}),
    "two candidates": (lambda ds: ds.assign(dissic_2=ds["dissic"]), "2 variables could be the dic", {}),
    "swapped": (_swapped, "look swapped", {"NOW_ALKALINITY": "talk", "NOW_DIC": "dissic"}),
    "no silicate": (lambda ds: ds.drop_vars("si"), "silicate is not given", {}),
    "unknown temperature": (
        lambda ds: _without("thetao", "standard_name")(ds).rename(thetao="temp"), "in situ, potential", {},
    ),
}


@pytest.mark.parametrize("chunked", [False, True])
@pytest.mark.parametrize("case", CASES)
def test_refused_until_it_is_said(ocean, case: str, *, chunked: bool) -> None:
    change, what, fillings = CASES[case]
    ds = change(ocean())
    ds = ds.chunk(lat=3) if chunked else ds
    error = _refused(ds)
    assert what in error.what
    line = re.findall(r"`([^`]+:[^`]+)`", error.mend)[0]
    for placeholder, filling in fillings.items():
        line = line.replace(placeholder, filling)
    said = YAML(typ="safe").load(line)
    words = {{"inputs": "names"}.get(key, key): value for key, value in said.items()}
    result = derive(ds, FIELDS, **words)
    assert np.isfinite(result["ph_total_scale"]).any()


@pytest.mark.parametrize(("words", "near"), [
    ({"fields": ["ph_total"]}, "ph_total_scale"), ({"constants": "guide_2007"}, "guide2007"),
    ({"names": {"alkalinty": "talk"}}, "alkalinity"), ({"reading": {"temprature": "potential"}}, "temperature"),
])
def test_unknown_words(ocean, words: dict[str, Any], near: str) -> None:
    error = _refused(ocean(), **words)
    assert f"'{near}'" in str(error)


def test_an_unknown_set_is_refused_before_any_lazy_work(ocean) -> None:
    with pytest.raises(UnknownWordError):
        derive(ocean().chunk(lat=3), FIELDS, constants="guide")


def test_no_such_variable(ocean) -> None:
    error = _refused(ocean(), names={"dic": "disic"})
    assert "did you mean 'dissic'" in error.mend


def test_levels_without_a_coordinate(ocean) -> None:
    error = _refused(ocean().drop_vars(["lev", "lev_bnds"]))
    assert "the depth of its levels is not known" in error.what


def test_all_is_missing(ocean) -> None:
    ds = ocean()
    ds["so"] = xr.full_like(ds["so"], np.float32(1e20))
    assert "all is missing" in _refused(ds).what


def test_an_array_in_place_of_a_dataset(ocean) -> None:
    assert "not an xarray Dataset" in _refused(ocean()["thetao"]).what


def test_the_dataset_is_left_as_it_was(ocean) -> None:
    ds = ocean()
    before = ds.copy(deep=True)
    _refused(ds.drop_vars("talk"))
    derive(ds, FIELDS)
    xr.testing.assert_identical(ds, before)
