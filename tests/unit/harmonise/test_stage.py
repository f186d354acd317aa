"""Understanding and clothing as a whole: canonical units, the same bits whatever the slice, decisions in words."""

from __future__ import annotations

import pickle
import threading
from collections.abc import Callable
from typing import Any

import gsw
import numpy as np
import pytest
import xarray as xr
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from gridcarb.errors import InputError, UnitsError
from gridcarb.fields import FIELDS, ROLES
from gridcarb.harmonise import clothe, understand
from gridcarb.harmonise.settings import ReadingSettings

Ocean = Callable[..., xr.Dataset]
HERE = settings(deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=40)


def test_canonical_numbers(ocean: Ocean) -> None:
    raw = ocean()
    clothed = clothe(raw, understand(raw, ReadingSettings(density="1026 kg m-3")))
    assert set(clothed.data_vars) == {*ROLES, "sea_pressure", "density"}
    wet = raw.isel(time=1, depth=3, lat=2, lon=4)
    cell = clothed.isel(time=1, depth=3, lat=2, lon=4)
    pressure = gsw.p_from_z(-4000.0, float(raw.lat[2]))
    absolute = gsw.SA_from_SP(float(wet.salinity), pressure, float(raw.lon[4]) % 360, float(raw.lat[2]))
    assert cell.sea_pressure.item() == pressure
    assert cell.salinity.item() == wet.salinity.item()
    assert cell.temperature.item() == pytest.approx(
        gsw.t_from_CT(absolute, gsw.CT_from_pt(absolute, float(wet.temperature)), pressure), abs=1e-10
    )
    for role in ROLES[2:]:
        assert cell[role].item() == pytest.approx(wet[role].item() * 1e6 / 1026.0, rel=1e-15)
    for key in ROLES:
        assert clothed[key].dtype == np.float64
        assert clothed[key].dims == ("time", "depth", "lat", "lon")
        assert clothed[key].attrs["units"] == FIELDS[key].units
        assert np.isnan(clothed[key].values[..., 0, 0]).all()
        assert int(clothed[key].isnull().sum()) == 8
    assert clothed.attrs["masked_cells"]["fill_value"] == 8
    assert set(clothed.coords) == set(raw.coords)


def test_dims_come_in_canonical_order(ocean: Ocean) -> None:
    raw = ocean()
    straight = clothe(raw, understand(raw, ReadingSettings()))
    turned = raw.transpose("lon", "depth", "lat", "time")
    crossed = clothe(turned, understand(turned, ReadingSettings()))
    for key in ROLES:
        assert crossed[key].dims == ("time", "depth", "lat", "lon")
        assert crossed[key].values.tobytes() == straight[key].values.tobytes()


SPANS = st.tuples(st.integers(0, 5), st.integers(1, 6))
READINGS: list[dict[str, Any]] = [
    {"temperature": kind, "salinity": salt, "density": density}
    for kind in ("in situ", "potential", "conservative")
    for salt, density in (("practical", "in situ"), ("absolute", "1026 kg m-3"), ("preformed", "in situ"))
]


@HERE
@given(reading=st.sampled_from(READINGS), time=SPANS, rows=SPANS, columns=SPANS)
def test_a_cell_does_not_depend_on_its_slice(
    ocean: Ocean, reading: dict[str, Any], time: tuple[int, int], rows: tuple[int, int], columns: tuple[int, int]
) -> None:
    raw = ocean()
    understanding = understand(raw, ReadingSettings(**reading))
    whole = clothe(raw, understanding)
    part = {
        dim: slice(start % raw.sizes[dim], start % raw.sizes[dim] + size)
        for dim, (start, size) in (("time", time), ("lat", rows), ("lon", columns))
    }
    piece, wanted = clothe(raw.isel(part), understanding), whole.isel(part)
    assert set(piece) == set(wanted)
    for key in piece:
        assert piece[key].dims == wanted[key].dims
        assert np.ascontiguousarray(piece[key].values).tobytes() == np.ascontiguousarray(wanted[key].values).tobytes(), key


@pytest.mark.parametrize("reading", READINGS[:2])
def test_every_convention_of_longitude_gives_the_same_bits(ocean: Ocean, reading: dict[str, Any]) -> None:
    raw = ocean()
    east = raw.assign_coords(lon=("lon", raw.lon.values % 360, raw.lon.attrs))
    one, other = (clothe(each, understand(each, ReadingSettings(**reading))) for each in (raw, east))
    for key in one:
        assert one[key].values.tobytes() == other[key].values.tobytes()


def test_understanding_travels_and_reads_little(ocean: Ocean) -> None:
    raw = ocean()
    understanding = understand(raw, ReadingSettings())
    assert pickle.loads(pickle.dumps(understanding)) == understanding
    lazy = raw.chunk({"time": 1})
    assert understand(lazy, ReadingSettings()) == understanding
    assert all(lazy[role].chunks for role in ROLES)


def test_threads_agree(ocean: Ocean) -> None:
    raw = ocean()
    understanding = understand(raw, ReadingSettings(density="in situ"))
    found: list[bytes] = []
    threads = [
        threading.Thread(target=lambda: found.append(clothe(raw, understanding)["dic"].values.tobytes())) for _ in range(8)
    ]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(found) == 8
    assert len(set(found)) == 1


def test_decisions_are_sentences_about_everything(ocean: Ocean) -> None:
    raw = ocean(attributes={"silicate": None})
    understanding = understand(raw, ReadingSettings(silicate="assume zero"))
    subjects = [decision.subject for decision in understanding.decisions]
    assert set(subjects) == {"temperature", "salinity", "pressure", "dic", "alkalinity", "phosphate", "silicate", "density"}
    assert str(understanding.decisions[0]) == (
        "temperature: potential, converted to in situ (TEOS-10), from degC "
        "(standard_name is sea_water_potential_temperature)"
    )
    assert [notice.code for notice in understanding.notices] == ["density_assumed"]


def test_each_notice_comes_once_and_names_its_line(ocean: Ocean) -> None:
    raw = ocean(attributes={"salinity": {"standard_name": "sea_water_salinity", "units": "0.001"}})
    notices = understand(raw, ReadingSettings()).notices
    assert [notice.code for notice in notices] == ["salinity_kind_assumed", "density_assumed"]
    assert all(notice.state.startswith("reading: ") for notice in notices)


def test_zero_land_and_undeclared_fills_are_masked_with_a_notice(ocean: Ocean) -> None:
    raw = ocean()
    for role in ROLES:
        raw[role][..., 0, 0] = 0.0
        raw[role][..., 1, 1] = -999.0
    understanding = understand(raw, ReadingSettings())
    assert {"land_by_physics", "usual_fill"} <= {notice.code for notice in understanding.notices}
    clothed = clothe(raw, understanding)
    assert clothed.attrs["masked_cells"]["land"] == clothed.attrs["masked_cells"]["usual_fill"] == 8
    assert all(int(clothed[role].isnull().sum()) == 16 for role in ROLES)


def test_packed_integers_are_unpacked(ocean: Ocean) -> None:
    raw = ocean()
    values = raw["dic"].values
    packed = np.where(values > 1e19, -32768, np.round((values - 2.2) / 1e-4)).astype("i2")
    attrs = {**raw["dic"].attrs, "_FillValue": np.int16(-32768), "scale_factor": 1e-4, "add_offset": 2.2}
    raw["dic"] = (raw["dic"].dims, packed, attrs)
    clothed = clothe(raw, understand(raw, ReadingSettings()))
    assert int(clothed["dic"].isnull().sum()) == 8
    np.testing.assert_allclose(clothed["dic"].values * 1025e-6, np.where(values > 1e19, np.nan, values), atol=6e-5)


def test_static_nutrients_keep_their_dims_in_every_block(ocean: Ocean) -> None:
    raw = ocean()
    raw["phosphate"] = raw["phosphate"].isel(time=0, drop=True)
    for role in ("salinity", "alkalinity"):
        raw[role][..., 0, 0] = 0.0
    understanding = understand(raw, ReadingSettings())
    for part in (raw, raw.isel(lat=slice(2, 3))):
        assert clothe(part, understanding)["phosphate"].dims == ("depth", "lat", "lon")


def test_amounts_per_mass_need_no_density(ocean: Ocean) -> None:
    names = {role: {"units": "mol kg-1"} for role in ROLES[2:]}
    raw = ocean(attributes=names, scale=dict.fromkeys(ROLES[2:], 1e-3))
    understanding = understand(raw, ReadingSettings())
    clothed = clothe(raw, understanding)
    assert "density" not in clothed
    assert clothed["dic"].values[0, 0, 1, 1] == raw["dic"].values[0, 0, 1, 1] * 1e6


@pytest.mark.parametrize("axis", ["time", "depth", "lon"])
@pytest.mark.parametrize("density", ["1026 kg m-3", "in situ"])
def test_an_axis_may_be_called_density(ocean: Ocean, axis: str, density: str) -> None:
    raw = ocean()
    column = {"time": 0, "lat": 2, "lon": 3}
    for part in (raw, raw.isel({dim: slice(place, place + 1) for dim, place in column.items()}), raw.isel(column)):
        if axis not in part.dims:
            continue
        renamed = part.rename({axis: "density"})
        wanted, found = (clothe(each, understand(each, ReadingSettings(density=density))) for each in (part, renamed))
        for key in (*ROLES, "sea_pressure"):
            assert found[key].values.tobytes() == wanted[key].values.tobytes(), key
        np.testing.assert_array_equal(found["density"].values, wanted["density"].values)


def test_an_assumed_nutrient_is_a_scalar(ocean: Ocean) -> None:
    raw = ocean(attributes={"silicate": None})
    clothed = clothe(raw, understand(raw, ReadingSettings(silicate="2 umol kg-1")))
    assert clothed["silicate"].dims == ()
    assert clothed["silicate"].item() == 2.0


def test_surface_maps_need_no_level(ocean: Ocean) -> None:
    raw = ocean(attributes={"phosphate": None, "silicate": None}).isel(depth=0, drop=True)
    understanding = understand(raw, ReadingSettings(depth="surface"))
    clothed = clothe(raw, understanding)
    assert clothed["sea_pressure"].item() == 0.0
    np.testing.assert_allclose(
        clothed["temperature"].values[:, 1:], raw["temperature"].values[:, 1:], atol=1e-12, rtol=0
    )


def test_a_single_column_and_a_single_cell(ocean: Ocean) -> None:
    raw = ocean()
    whole = clothe(raw, understand(raw, ReadingSettings()))
    for here in ({"lat": 2, "lon": 3}, {"lat": 2, "lon": 3, "time": 0, "depth": 1}):
        piece = raw.isel(here)
        clothed = clothe(piece, understand(piece, ReadingSettings()))
        for key in ROLES:
            assert clothed[key].values.tobytes() == whole[key].isel(here).values.tobytes()


def test_curvilinear_coordinates_missing_on_land(ocean: Ocean) -> None:
    raw = ocean()
    lat, lon = np.meshgrid(raw.lat.values, raw.lon.values, indexing="ij")
    lat[0, 0] = lon[0, 0] = 1e20
    bent = raw.drop_vars(["lat", "lon"]).rename_dims(lat="j", lon="i").assign_coords(
        nav_lat=(("j", "i"), lat, {**raw.lat.attrs, "_FillValue": 1e20}),
        nav_lon=(("j", "i"), lon, {**raw.lon.attrs, "_FillValue": 1e20}),
    )
    straight = clothe(raw, understand(raw, ReadingSettings()))
    clothed = clothe(bent, understand(bent, ReadingSettings()))
    for key in ROLES:
        assert clothed[key].values.tobytes() == straight[key].values.tobytes()


@pytest.mark.parametrize(("change", "what"), [
    (lambda raw: raw.drop_vars("dic"), "no dic"),
    (lambda raw: raw.assign(dic=raw.dic.expand_dims(member=2)), "member"),
    (lambda raw: raw.drop_vars("depth"), "no coordinate"),
    (lambda raw: raw.drop_vars("silicate"), "silicate is not given"),
])
def test_refused(ocean: Ocean, change: Any, what: str) -> None:
    with pytest.raises(InputError, match=what) as caught:
        understand(change(ocean()), ReadingSettings())
    assert caught.value.mend


@pytest.mark.parametrize(("stated", "what"), [
    ({"alkalinty": "mol m-3"}, "did you mean 'alkalinity'"), ({"dic": "bananas"}, "cannot be read"),
])
def test_units_stated_badly_are_refused_with_the_settings(stated: dict[str, str], what: str) -> None:
    with pytest.raises(ValidationError, match=what):
        ReadingSettings(units=stated)


def test_missing_units_are_refused(ocean: Ocean) -> None:
    for role in ROLES:
        raw = ocean()
        del raw[role].attrs["units"]
        if role == "salinity":
            raw[role].attrs["standard_name"] = "sea_water_salinity"
        with pytest.raises(UnitsError, match="missing") as caught:
            understand(raw, ReadingSettings())
        assert caught.value.where == role
