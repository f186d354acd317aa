"""A small sample must look like sea water: each refusal names the likely cause and the line that mends it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.errors import InputError
from gridcarb.harmonise import plausibility, understand
from gridcarb.harmonise.settings import ReadingSettings

Ocean = Callable[..., xr.Dataset]


def refusal(raw: xr.Dataset, **settings: Any) -> InputError:
    with pytest.raises(InputError) as caught:
        understand(raw, ReadingSettings(**settings))
    return caught.value


def accepted(raw: xr.Dataset, **settings: Any) -> bool:
    return understand(raw, ReadingSettings(unusual_values="accept", **settings)) is not None


@pytest.mark.parametrize(("said", "factor", "likely"), [
    ("mol m-3", 1e3, "mmol m-3 or umol kg-1"), ("mmol m-3", 1.0, "mol m-3"), ("umol kg-1", 1.0, "mol m-3"),
    ("mol m-3", 1e-3, "mol kg-1"), ("mol m-3", 12.011, "g m-3 of C"),
])
def test_dic_in_other_units_than_it_says(ocean: Ocean, said: str, factor: float, likely: str) -> None:
    raw = ocean(attributes={"dic": {"units": said}}, scale={"dic": factor})
    error = refusal(raw)
    assert error.where == "dic"
    assert f"look like {likely}" in error.what
    assert "reading: {units: {dic: " in error.mend
    assert accepted(raw)


def test_the_units_it_names_do_mend_it(ocean: Ocean) -> None:
    raw = ocean(attributes={"dic": {"units": "mol m-3"}}, scale={"dic": 12.011})
    cure = refusal(raw).mend.split("{dic: ")[1].split("}")[0]
    assert understand(raw, ReadingSettings(units={"dic": cure})) is not None


def test_alkalinity_as_calcium_carbonate(ocean: Ocean) -> None:
    raw = ocean(scale={"alkalinity": 50.0435})
    assert "look like mg L-1 of CaCO3" in refusal(raw).what
    assert "no unit of the trade" in refusal(ocean(scale={"alkalinity": 0.2})).what


def test_swapped_dic_and_alkalinity(ocean: Ocean) -> None:
    raw = ocean()
    raw["dic"], raw["alkalinity"] = raw["alkalinity"].copy(), raw["dic"].copy()
    error = refusal(raw)
    assert "look swapped" in error.what
    assert accepted(raw)


@pytest.mark.parametrize(("factor", "words"), [(1e-3, "kg of salt per kg"), (10.0, "not that of"), (0.01, "not that of")])
def test_salinity_far_off(ocean: Ocean, factor: float, words: str) -> None:
    raw = ocean(scale={"salinity": factor})
    error = refusal(raw)
    assert words in error.what
    assert error.where == "salinity"
    assert accepted(raw)


def test_kelvin_called_degc_and_the_other_way_round(ocean: Ocean) -> None:
    raw = ocean()
    raw["temperature"] = raw["temperature"].copy(data=raw["temperature"].values + 273.15)
    assert "look like kelvin" in refusal(raw, unusual_values="accept").what
    assert understand(raw, ReadingSettings(units={"temperature": "K"})) is not None
    named = {"standard_name": "sea_water_potential_temperature", "units": "K"}
    assert "not kelvin" in refusal(ocean(attributes={"temperature": named})).what


def test_nutrients_beyond_any_sea_water(ocean: Ocean) -> None:
    raw = ocean(scale={"phosphate": 1e3})
    assert refusal(raw).where == "phosphate"
    assert accepted(raw)


def test_masks_that_differ(ocean: Ocean) -> None:
    raw = ocean(rows=20, columns=20)
    raw["dic"][:, :, 3, :2] = 1e20
    codes = [notice.code for notice in understand(raw, ReadingSettings()).notices]
    assert "masks_differ" in codes
    raw["dic"][:, :, 3, :] = 1e20
    error = refusal(raw)
    assert error.where == "dic"
    assert "5.0%" in error.what
    cure = float(error.mend.split("mask_difference: ")[1].split("}")[0])
    assert understand(raw, ReadingSettings(mask_difference=cure)) is not None


def test_a_role_that_covers_part_of_the_map_is_refused(ocean: Ocean) -> None:
    raw = ocean(depths=(5.0,), steps=1, rows=200, columns=200)  # sampled by patches
    raw["dic"][..., :100] = 1e20
    assert "different places" in refusal(raw).what


def test_all_missing_is_refused_after_looking_everywhere(ocean: Ocean) -> None:
    raw = ocean()
    raw["dic"][:] = 1e20
    assert "all is missing" in refusal(raw).what


def test_water_hidden_from_the_patches_is_found(ocean: Ocean) -> None:
    raw = ocean(depths=(5.0, 1000.0), rows=40, columns=40)
    for role in raw.data_vars:
        held = raw[role].values[0, 1, 30, 30]
        raw[role][:] = 1e20
        raw[role][0, 1, 30, 30] = held
    assert understand(raw, ReadingSettings()) is not None


def test_patches_and_slabs_are_small_and_slabs_cover_the_first_step() -> None:
    axes = Axes("time", "lev", ("y", "x"), "time", "lev", "lat", "lon")
    sizes = {"time": 5, "lev": 3, "y": 2000, "x": 1500}
    patches = plausibility.patches(axes, sizes, 2)
    assert len(patches) == 9
    assert all(patch["lev"] == slice(2, 3) and patch["time"] == slice(0, 1) for patch in patches)
    cells = [np.prod([len(range(*patch[dim].indices(sizes[dim]))) for dim in ("y", "x")]) for patch in patches]
    assert 10_000 < sum(cells) <= 20_000
    seen = np.zeros((3, 2000, 1500), dtype=int)
    for slab in plausibility.slabs(axes, sizes, 0):
        part = seen[slab["lev"], slab["y"]]
        assert part.size <= 1_000_000
        part += 1
    assert (seen == 1).all()


@pytest.mark.parametrize(("horizontal", "count"), [((), 1), (("cell",), 3)])
def test_patches_of_columns_and_meshes(horizontal: tuple[str, ...], count: int) -> None:
    axes = Axes(None, "lev", horizontal, None, "lev", None, None)
    sizes = {"lev": 3, "cell": 1_000_000}
    assert len(plausibility.patches(axes, sizes, 0)) == count
    assert len(list(plausibility.slabs(axes, sizes, 0))) == 3


def test_slabs_begin_at_the_top() -> None:
    axes = Axes(None, "z", ("y", "x"), None, "z", "y", "x")
    sizes = {"z": 3, "y": 2, "x": 2}
    assert [slab["z"].start for slab in plausibility.slabs(axes, sizes, 2)] == [2, 0, 1]
