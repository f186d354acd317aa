"""`gridcarb.derive`: any clothes, lazy where chunked, one solve a chunk, the same numbers as the array face."""

from __future__ import annotations

import threading
import warnings

import dask
import gsw
import numpy as np
import pytest
import xarray as xr

import gridcarb
from gridcarb.errors import GridcarbError, InputError, NoticeWarning, RecipeError, UnknownWordError
from gridcarb.fields import FIELDS
from gridcarb.run import lazy

DENSITY = {"density": "1026 kg m-3"}
FIELD_NAMES = ("ph_total_scale", "aragonite_saturation")


@pytest.fixture
def ds(ocean_file):
    """The small ocean as xarray opens it: decoded, in memory when touched, not chunked."""
    with xr.open_dataset(ocean_file) as opened:
        yield opened


@pytest.fixture
def solves(monkeypatch):
    """The sizes of every block the chemistry was asked to solve."""
    seen, lock, solve = [], threading.Lock(), lazy.solve

    def counting(clothed, keys, constants):
        with lock:
            seen.append((dict(clothed.sizes), tuple(keys)))
        return solve(clothed, keys, constants)

    monkeypatch.setattr(lazy, "solve", counting)
    return seen


def assert_same_numbers(one: xr.Dataset, other: xr.Dataset) -> None:
    assert set(one.data_vars) == set(other.data_vars)
    for key in one.data_vars:
        assert one[key].dims == other[key].dims
        np.testing.assert_array_equal(one[key].values, other[key].values, err_msg=str(key))


def by_hand(ds: xr.Dataset) -> dict[str, np.ndarray]:
    """The decoded small ocean in canonical units, converted without gridcarb."""
    role = {"dic": "dissic", "alkalinity": "talk", "phosphate": "po4", "silicate": "si"}
    amounts = {key: ds[name].values.astype("f8") * 1e6 / 1026.0 for key, name in role.items()}
    pressure = gsw.p_from_z(-ds["lev"].values[:, None], ds["lat"].values[None, :])[None, :, :, None]
    practical = ds["so"].values.astype("f8")
    absolute = gsw.SA_from_SP(practical, pressure, ds["lon"].values, ds["lat"].values[:, None])
    conservative = gsw.CT_from_pt(absolute, ds["thetao"].values.astype("f8"))
    warm = gsw.t_from_CT(absolute, conservative, pressure)
    return {"temperature": warm, "salinity": practical, "sea_pressure": pressure, **amounts}


def test_the_result_is_that_of_the_array_face_on_the_inputs_as_understood(ds) -> None:
    """To the last bit: the same chemistry, whichever door."""
    inputs = ["temperature", "salinity", "sea_pressure", "dic", "alkalinity", "phosphate", "silicate"]
    derived = [key for key, field in FIELDS.items() if field.part == "derived"]
    found = gridcarb.derive(ds, [*inputs, *derived, "solution_status"], reading=DENSITY)
    state = {key.removeprefix("sea_"): found[key].values for key in inputs}
    expected = gridcarb.speciate(**state, fields=[*derived, "solution_status"])
    assert np.isfinite(found["ph_total_scale"]).sum() > 100
    for key, values in expected.items():
        np.testing.assert_array_equal(found[key].values, values, err_msg=key)


def test_the_inputs_are_understood_as_a_hand_would_convert_them(ds) -> None:
    expected = by_hand(ds)
    found = gridcarb.derive(ds, list(expected), reading=DENSITY)
    for key, some in expected.items():
        values = np.broadcast_to(some, found[key].shape)
        wet = np.isfinite(found[key].values) & np.isfinite(values)
        assert wet.sum() > 100
        np.testing.assert_allclose(found[key].values[wet], values[wet], rtol=1e-12, atol=1e-12, err_msg=key)


@pytest.mark.parametrize("words", [{}, {"decode_cf": False}, {"mask_and_scale": False}, {"decode_times": False}], ids=str)
@pytest.mark.parametrize("chunks", [None, {"time": 2, "lev": 3, "lat": 4, "lon": 7}], ids=str)
def test_however_it_is_opened_the_numbers_are_the_same(ds, ocean_file, words, chunks) -> None:
    fields = [*FIELD_NAMES, "sea_pressure", "solution_status"]
    expected = gridcarb.derive(ds, fields, reading=DENSITY)
    with xr.open_dataset(ocean_file, **words) as opened:
        given = opened if chunks is None else opened.chunk(chunks)
        assert_same_numbers(gridcarb.derive(given, fields, reading=DENSITY).load(), expected)


def test_roles_chunked_in_different_ways(ds) -> None:
    mixed = ds.chunk(time=1)
    mixed["so"] = mixed["so"].chunk(lat=2)
    mixed["talk"] = mixed["talk"].load()
    expected = gridcarb.derive(ds, FIELD_NAMES, reading=DENSITY)
    assert_same_numbers(gridcarb.derive(mixed, FIELD_NAMES, reading=DENSITY).load(), expected)


def test_one_solve_a_chunk_for_all_fields(ds, solves) -> None:
    found = gridcarb.derive(ds.chunk(time=1, lat=3, lon=12), reading=DENSITY)
    early = [sizes[dim] for sizes, _ in solves for dim in ("time", "lev", "lat", "lon")]
    assert set(early) == {1}, "only one cell, the model of the result, is computed early"
    assert len(found.data_vars) >= 12
    assert found["ph_total_scale"].chunks == ((1, 1, 1), (5,), (3, 3), (12,))
    solves.clear()
    dask.compute(found)
    assert len(solves) == 3 * 2
    assert {keys for _, keys in solves} == {tuple(found.data_vars)}
    solves.clear()
    found["ph_total_scale"].isel(time=0, lat=0).load()
    assert len(solves) == 1, "what is not looked at is not computed"


def test_nothing_is_lazy_that_was_not_chunked(ds, solves) -> None:
    found = gridcarb.derive(ds, FIELD_NAMES, reading=DENSITY)
    assert not found.chunks
    assert len(solves) == 1


def test_a_chunked_call_reads_small_samples_only(ds) -> None:
    touched = []

    def note(block: np.ndarray, block_info=None) -> np.ndarray:
        touched.append(block_info[0]["chunk-location"])
        return block

    counted = ds.chunk(time=1).load().chunk(time=1)
    noted = counted["thetao"].data.map_blocks(note, dtype="f4", meta=np.empty(0, "f4"))
    counted["thetao"] = counted["thetao"].copy(data=noted)
    gridcarb.derive(counted, FIELD_NAMES, reading=DENSITY)
    assert {place[0] for place in touched} == {0}, "the first time step is sampled, no other"


def test_found_by_standard_name_by_name_and_as_told(ds) -> None:
    expected = gridcarb.derive(ds, FIELD_NAMES, reading=DENSITY)
    anonymous = {name: f"v{number}" for number, name in enumerate(ds.data_vars) if "bnds" not in str(name)}
    assert_same_numbers(gridcarb.derive(ds.rename(anonymous), FIELD_NAMES, reading=DENSITY), expected)
    bare = ds.copy()
    for name in bare.data_vars:
        bare[name].attrs = {key: value for key, value in ds[name].attrs.items() if key != "standard_name"}
    reading = {**DENSITY, "temperature": "potential", "salinity": "practical"}
    assert_same_numbers(gridcarb.derive(bare, FIELD_NAMES, reading=reading), expected)
    names = {"temperature": "thetao", "salinity": "so", "dic": "dissic", "alkalinity": "talk", "phosphate": "po4",
             "silicate": "si"}
    lost = bare.rename(anonymous)
    with pytest.raises(InputError):
        gridcarb.derive(lost, FIELD_NAMES, reading=reading)
    told = {role: anonymous[name] for role, name in names.items()}
    assert_same_numbers(gridcarb.derive(lost, FIELD_NAMES, names=told, reading=reading), expected)


def test_attributes_and_coordinates_are_complete(ds) -> None:
    for given in (ds, ds.chunk(time=1)):
        found = gridcarb.derive(given, ["ph_total_scale", "solution_status"], reading=DENSITY, constants="practice2022")
        expected = {"constants": "practice2022", "ancillary_variables": "solution_status"}
        assert found["ph_total_scale"].attrs == {**FIELDS["ph_total_scale"].attributes(), **expected}
        status = found["solution_status"].attrs
        assert dict(zip(status["flag_values"], status["flag_meanings"].split(), strict=True)) == dict(
            FIELDS["solution_status"].flags)
        assert found.attrs["constants"] == "practice2022"
        assert "1026 kg m-3" in found.attrs["understood"]
        for name in ("time", "lev", "lat", "lon", "lat_bnds", "lev_bnds"):
            xr.testing.assert_identical(found[name].reset_coords(drop=True), ds[name].reset_coords(drop=True))


@pytest.mark.parametrize("form", ["NETCDF4", "NETCDF3_64BIT"])
@pytest.mark.parametrize("chunked", [False, True])
def test_the_result_can_be_saved(ds, tmp_path, form, chunked) -> None:
    found = gridcarb.derive(ds.chunk(time=1) if chunked else ds, [*FIELD_NAMES, "solution_status"], reading=DENSITY)
    found.to_netcdf(tmp_path / "out.nc", engine="netcdf4", format=form)
    with xr.open_dataset(tmp_path / "out.nc") as saved:
        np.testing.assert_array_equal(saved["ph_total_scale"].values, found["ph_total_scale"].values)


def test_depths_that_differ_by_column_are_found_in_undecoded_data(ds, ocean_file) -> None:
    """A depth field the variables point at is a coordinate only once it is decoded; it must not get lost before."""
    with xr.open_dataset(ocean_file, decode_cf=False) as opened:
        raw = opened.load().drop_vars(["lev", "lev_bnds"])
        stretched = (ds["lev"] * (1 + ds["lat"] / 200)).transpose("lev", "lat")
        raw["depth"] = (stretched.dims, stretched.values, {"standard_name": "depth", "units": "m", "positive": "down"})
        for name in ("thetao", "so", "dissic", "talk", "po4", "si"):
            raw[name].attrs["coordinates"] = "depth"
        whole = gridcarb.derive(raw, ["sea_pressure"], reading=DENSITY)
        expected = gsw.p_from_z(-stretched.values, ds["lat"].values)[None, :, :, None]
        expected = np.broadcast_to(expected, whole["sea_pressure"].shape)
        np.testing.assert_allclose(whole["sea_pressure"].values, expected, rtol=1e-12)
        pieces = gridcarb.derive(raw.chunk(time=1, lev=2, lat=4), ["sea_pressure"], reading=DENSITY)
        assert_same_numbers(pieces.load(), whole)


def test_the_dataset_given_is_left_as_it_was(ds) -> None:
    before = ds.load().copy(deep=True)
    gridcarb.derive(ds, FIELD_NAMES, reading=DENSITY)
    xr.testing.assert_identical(ds, before)
    assert ds["thetao"].encoding == before["thetao"].encoding


def test_notices_are_warnings_with_the_words_that_state_them(ds) -> None:
    with pytest.warns(NoticeWarning, match="density of 1025 kg m-3") as caught:
        found = gridcarb.derive(ds, FIELD_NAMES)
    assert "(to state it: reading: {density: 1025 kg m-3})" in str(caught[0].message)
    assert caught[0].filename == __file__
    assert "density of 1025 kg m-3" in found.attrs["notices"]
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        assert gridcarb.derive(ds, FIELD_NAMES, reading={"density": "1025 kg m-3"}).attrs["notices"] == ""


def test_one_key_may_be_given_bare_and_none_stands_for_every_derived_field(ds) -> None:
    assert list(gridcarb.derive(ds, "ph_total_scale", reading=DENSITY).data_vars) == ["ph_total_scale"]
    derived = [key for key, field in FIELDS.items() if field.part == "derived"]
    assert list(gridcarb.derive(ds, reading=DENSITY).data_vars) == derived


@pytest.mark.parametrize(("words", "error", "told"), [
    ({"fields": ["ph_totl_scale"]}, UnknownWordError, "ph_total_scale"),
    ({"constants": "guide2070"}, UnknownWordError, "guide2007"),
    ({"names": {"salt": "so"}}, UnknownWordError, "salt"),
    ({"names": {"salinity": "sso"}}, GridcarbError, "sso"),
    ({"reading": {"densty": "1026 kg m-3"}}, RecipeError, "density"),
    ({"reading": {"density": "heavy", "temperature": "warm"}}, RecipeError, "2 faults"),
])
@pytest.mark.parametrize("chunked", [False, True])
def test_unknown_words_are_refused_before_anything_is_computed(ds, solves, words, error, told, chunked) -> None:
    words = {"fields": FIELD_NAMES, "reading": DENSITY, **words}
    with pytest.raises(error, match=told):
        gridcarb.derive(ds.chunk(time=1) if chunked else ds, **words)
    assert solves == []


def test_the_configuration_of_dask_is_left_alone(ds) -> None:
    before = dask.config.config.copy()
    with dask.config.set(scheduler="synchronous"):
        gridcarb.derive(ds.chunk(time=1), FIELD_NAMES, reading=DENSITY).load()
        assert dask.config.get("scheduler") == "synchronous"
    assert dask.config.config == before
