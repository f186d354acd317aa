from __future__ import annotations

import xml.etree.ElementTree as ET
from importlib.resources import files

import numpy as np
import pytest
import xarray as xr

import gridcarb.chemistry  # noqa: F401  puts the derived fields into the catalogue
from gridcarb.errors import OutputError
from gridcarb.fields import FIELDS
from gridcarb.write.amounts import per_volume, per_volume_field


@pytest.fixture(scope="module")
def table():
    """Standard name -> canonical units, from the official table."""
    path = files("compliance_checker") / "data" / "cf-standard-name-table.xml"
    root = ET.fromstring(path.read_text(encoding="utf-8"))
    return {entry.get("id"): entry.findtext("canonical_units") for entry in root.iter("entry")}


def test_amounts_are_multiplied_by_density_and_nothing_else_changes():
    dims = ("z", "y")
    block = xr.Dataset({
        "carbonate_ion": (dims, [[200.0, np.nan], [100.0, 50.0]], {"a": "b"}),
        "hydrogen_ion": (dims, np.full((2, 2), 1e-8)), "ph_total_scale": (dims, np.full((2, 2), 8.0)),
    })
    found = per_volume(block, xr.DataArray([1020.0, 1040.0], dims="z"))
    np.testing.assert_allclose(found["carbonate_ion"], [[0.204, np.nan], [0.104, 0.052]], rtol=1e-14)
    np.testing.assert_allclose(found["hydrogen_ion"], [[1.02e-5] * 2, [1.04e-5] * 2], rtol=1e-14)
    xr.testing.assert_identical(found["ph_total_scale"], block["ph_total_scale"])
    assert found["carbonate_ion"].dims == ("z", "y")
    assert found["carbonate_ion"].attrs == {"a": "b"}
    assert float(block["carbonate_ion"][0, 0]) == 200.0
    assert float(per_volume(block, 1000.0)["carbonate_ion"][0, 0]) == pytest.approx(0.2, rel=1e-15)


def test_without_a_density_there_is_no_volume():
    with pytest.raises(OutputError, match="density") as caught:
        per_volume(xr.Dataset(), None)
    assert "density: 1025 kg m-3" in caught.value.mend


@pytest.mark.parametrize("key", list(FIELDS))
def test_every_declaration_turns_into_one_that_is_true(key, table):
    old, new = FIELDS[key], per_volume_field(FIELDS[key])
    if old.units not in ("umol kg-1", "mol kg-1"):
        assert new is old
        return
    assert new.units == "mol m-3"
    if new.standard_name is not None:
        assert table[new.standard_name] == "mol m-3"
    for end in old.sane_range:
        value = float(per_volume(xr.Dataset({key: ((), end)}), 1030.0)[key])
        assert new.sane_range[0] <= value <= new.sane_range[1]


def test_a_fixed_scale_of_colours_follows_the_units():
    from dataclasses import replace

    from gridcarb.fields import Ink

    field = replace(FIELDS["dic"], ink=Ink("viridis", centre=2000.0, limits=(1000.0, 3000.0)))
    ink = per_volume_field(field).ink
    assert ink.centre == pytest.approx(2.05)
    assert ink.limits == pytest.approx((1.025, 3.075))
