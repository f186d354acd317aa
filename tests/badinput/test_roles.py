"""Variables that are missing, doubled, or play each other's role."""

from __future__ import annotations

import pytest
import xarray as xr

CARBON = ("dissic", "talk")


def _nameless(ds: xr.Dataset, **renamed: str) -> xr.Dataset:
    """Variables under other names, without standard_name: old name -> new name."""
    for name in renamed:
        del ds[name].attrs["standard_name"]
    return ds.rename(renamed)


def test_no_such_variable(bench, ocean) -> None:
    bench.put(ocean())
    bench.say({"inputs": {"dic": "disic"}})
    told = bench.refusal(3)
    assert told.what == "there is no variable 'disic' to be the dic"
    assert "did you mean 'dissic'" in told.mend
    bench.say({"inputs": {"dic": "dissic"}})
    bench.success()


def test_no_candidate(bench, ocean) -> None:
    bench.put(_nameless(ocean(), dissic="tracer_07"))
    told = bench.refusal(3)
    assert told.what == "no variable is known as dic"
    assert "tracer_07" in told.mend
    bench.say(told.line(NAME="tracer_07"))
    bench.success()


def test_two_candidates_for_one_role(bench, ocean) -> None:
    ds = ocean()
    bench.put(ds.assign(dissic_corrected=ds["dissic"]))
    told = bench.refusal(3)
    assert "2 variables could be the dic: 'dissic' (" in told.what
    bench.say(told.line(1))
    assert bench.words["inputs"]["dic"] == "dissic_corrected"
    bench.success()


def test_swapped_by_the_standard_names(bench, ocean) -> None:
    bench.put(ocean())
    bench.say({"inputs": {"dic": "talk", "alkalinity": "dissic"}})
    told = bench.refusal(3)
    assert "says alkalinity" in told.what
    assert "swapped" in told.mend
    bench.say({"inputs": {"dic": "dissic", **told.line()["inputs"]}})
    bench.success()


@pytest.mark.parametrize("surface", [True, False])
def test_swapped_by_the_values(bench, ocean, surface: bool) -> None:
    ds = ocean(surface=surface)
    for name in CARBON:
        del ds[name].attrs["standard_name"]
    bench.put(ds.rename(dissic="talk", talk="dissic"))
    told = bench.refusal(3)
    assert "look swapped" in told.what
    bench.say(told.line(NOW_ALKALINITY="talk", NOW_DIC="dissic"))
    mended = bench.success()
    bench.put(ocean(surface=surface))
    bench.say({"inputs": {"dic": "dissic", "alkalinity": "talk"}})
    xr.testing.assert_equal(mended, bench.success())


def test_the_standard_name_of_another_quantity(bench, ocean) -> None:
    ds = ocean()
    ds["dissic"].attrs["standard_name"] = "mole_concentration_of_dissolved_organic_carbon_in_sea_water"
    bench.put(ds)
    told = bench.refusal(3)
    assert told.what == "no variable is known as dic"
    bench.say(told.line(NAME="dissic"))
    bench.success()


def test_a_role_of_text(bench, ocean) -> None:
    ds = ocean()
    text = ds["talk"].astype(str).assign_attrs(ds["dissic"].attrs | {"_FillValue": "-"})
    bench.put(ds.drop_vars("dissic").assign(dissic=text))
    bench.say({"inputs": {"dic": "dissic"}})
    told = bench.refusal(3)
    assert told.where == f"{bench.folder / 'ocean.nc'}: dissic (dic)"
    assert "numbers" in told.what
