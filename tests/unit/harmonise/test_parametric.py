"""Parametric vertical coordinates: heights by arithmetic of the tests' own, pressure below the moving surface, refusals."""

from __future__ import annotations

import pickle
from collections.abc import Callable, Mapping
from math import sinh, tanh
from typing import Any

import gsw
import numpy as np
import pytest
import xarray as xr
from cf_xarray import parametric as decoders
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from xarray.backends import BackendArray
from xarray.core.indexing import IndexingSupport, LazilyIndexedArray, explicit_indexing_adapter

from gridcarb.errors import InputError, UnitsError
from gridcarb.harmonise import clothe, understand
from gridcarb.harmonise.settings import ReadingSettings
from gridcarb.harmonise.vertical import VerticalReading

Ocean = Callable[..., xr.Dataset]
READING = ReadingSettings(density="1026 kg m-3", temperature="in situ")
HERE = settings(deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=20)

SHARES = (-0.0625, -0.25, -0.5, -0.9375)
CURVE = (-0.03125, -0.125, -0.4375, -0.875)
SCALARS: dict[str, tuple[float, str]] = {
    "a": (4.0, "1"), "b": (0.75, "1"), "depth_c": (200.0, "m"), "nsigma": (2, "1"), "z1": (300.0, "m"), "z2": (50.0, "m"),
    "steep": (120.0, "m"), "href": (700.0, "m"), "k_c": (2, "1"),
}
TERMS = {
    "ocean_sigma_coordinate": "sigma: layer eta: eta depth: floor",
    "ocean_s_coordinate": "s: layer eta: eta depth: floor a: a b: b depth_c: depth_c",
    "ocean_s_coordinate_g1": "s: layer C: curve eta: eta depth: floor depth_c: depth_c",
    "ocean_s_coordinate_g2": "s: layer C: curve eta: eta depth: floor depth_c: depth_c",
    "ocean_sigma_z_coordinate": "sigma: sigma eta: eta depth: floor depth_c: depth_c nsigma: nsigma zlev: zlev",
    "ocean_double_sigma_coordinate": "sigma: layer depth: floor z1: z1 z2: z2 a: steep href: href k_c: k_c",
}
LAYERS = {"ocean_double_sigma_coordinate": (0.25, 0.75, 1.25, 1.75), "ocean_sigma_z_coordinate": (1.0, 2.0, 3.0, 4.0)}


def height(kind: str, k: int, floor: float, eta: float) -> float:
    """z of one cell as appendix D of CF 1.11 has it (a depth for the double sigma coordinate), with plain floats."""
    number = {name: value for name, (value, _) in SCALARS.items()}
    s, c, critical = LAYERS.get(kind, SHARES)[k], CURVE[k], number["depth_c"]
    if kind == "ocean_sigma_coordinate":
        return eta + s * (floor + eta)
    if kind == "ocean_s_coordinate":
        a, b = number["a"], number["b"]
        own = (1 - b) * sinh(a * s) / sinh(a) + b * (tanh(a * (s + 0.5)) / (2 * tanh(0.5 * a)) - 0.5)
        return eta * (1 + s) + critical * s + (floor - critical) * own
    if kind == "ocean_s_coordinate_g1":
        still = critical * s + (floor - critical) * c
        return still + eta * (1 + still / floor)
    if kind == "ocean_s_coordinate_g2":
        return eta + (eta + floor) * (critical * s + floor * c) / (critical + floor)
    if kind == "ocean_sigma_z_coordinate":
        return eta + SHARES[k] * (min(critical, floor) + eta) if k < 2 else (None, None, -400.0, -900.0)[k]  # type: ignore[return-value]
    z1, z2 = number["z1"], number["z2"]
    parting = 0.5 * (z1 + z2) + 0.5 * (z1 - z2) * tanh(2 * number["steep"] / (z1 - z2) * (floor - number["href"]))
    return s * parting if k < 2 else parting + (s - 1) * (floor - parting)


def parametric(raw: xr.Dataset, kind: str, *, eta: float | None = None, floor: float | None = None) -> xr.Dataset:
    """The raw ocean on layers that follow the floor and a sea surface that varies in time, or on even ones."""
    raw = raw.drop_vars("depth").rename({"depth": "layer"})
    place = (raw.sizes["lat"], raw.sizes["lon"])
    wave = np.sin(np.arange(np.prod(place))).reshape(place)
    floors = 1100.0 + 1000.0 * wave if floor is None else np.full(place, floor)
    surface = np.stack([wave, -2.0 * wave]) if eta is None else np.full((2, *place), eta)
    floors[0, 0] = surface[:, 0, 0] = 1e20
    attrs = {"units": "1", "axis": "Z", "standard_name": kind, "formula_terms": TERMS[kind]}
    attrs["positive"] = "down" if kind in LAYERS else "up"
    upper, lower = np.array([*SHARES[:2], np.nan, np.nan]), np.array([np.nan, np.nan, -400.0, -900.0])
    scalars = {name: xr.Variable((), value, {"units": unit}) for name, (value, unit) in SCALARS.items()}
    return raw.assign_coords(scalars).assign_coords(
        layer=("layer", np.array(LAYERS.get(kind, SHARES)), attrs), curve=("layer", np.array(CURVE), {"units": "1"}),
        sigma=("layer", upper, {}), zlev=("layer", lower, {"units": "m"}),
        eta=(("time", "lat", "lon"), surface, {"units": "m", "_FillValue": 1e20}),
        floor=(("lat", "lon"), floors, {"units": "m", "_FillValue": 1e20}),
    )


def vertical(raw: xr.Dataset, **stated: Any) -> VerticalReading:
    return understand(raw, READING.model_copy(update=stated)).place.vertical


@pytest.mark.parametrize("kind", list(TERMS))
def test_pressure_is_that_of_the_depth_below_the_sea_surface(ocean: Ocean, kind: str) -> None:
    raw = parametric(ocean(), kind)
    found = clothe(raw, understand(raw, READING)).sea_pressure
    moving = kind != "ocean_double_sigma_coordinate"
    assert found.dims == (("time", "layer", "lat", "lon") if moving else ("layer", "lat", "lon"))
    for time, k, row, column in ((0, 0, 1, 1), (1, 1, 1, 5), (1, 2, 4, 5), (0, 3, 3, 2), (1, 3, 0, 4)):
        floor, eta = float(raw.floor[row, column]), float(raw.eta[time, row, column])
        z = height(kind, k, floor, eta)
        wanted = gsw.p_from_z(-max(eta - z, 0.0) if moving else -z, float(raw.lat[row]))
        cell = found.isel(layer=k, lat=row, lon=column)
        assert float(cell.isel(time=time) if moving else cell) == pytest.approx(wanted, rel=1e-12, abs=1e-9)
    assert found.isel(lat=0, lon=0).isnull().all()
    assert float(found.min()) >= 0.0


@pytest.mark.parametrize(("kind", "decoder"), [
    ("ocean_sigma_coordinate", decoders.OceanSigma), ("ocean_s_coordinate_g2", decoders.OceanSG2),
    ("ocean_sigma_z_coordinate", decoders.OceanSigmaZ),
])
def test_another_decoder_finds_the_same_heights(ocean: Ocean, kind: str, decoder: Any) -> None:
    raw = parametric(ocean(), kind)
    known = {"eta": "sea_surface_height_above_geoid", "depth": "sea_floor_depth_below_geoid", "zlev": "altitude"}
    named = dict(zip(TERMS[kind].replace(":", "").split()[::2], TERMS[kind].split()[1::2], strict=True))
    terms = {term.lower(): raw[name].drop_attrs().assign_attrs(standard_name=known.get(term, "")).where(raw[name] < 1e19)
             for term, name in named.items()}
    below = raw.eta - decoder.from_terms(terms).decode()
    wanted = xr.apply_ufunc(gsw.p_from_z, -below.clip(min=0.0).where(raw.floor < 1e19), raw.lat)
    found = clothe(raw, understand(raw, READING)).sea_pressure
    np.testing.assert_allclose(found, wanted.transpose(*found.dims), rtol=1e-12, atol=1e-9)


@pytest.mark.parametrize("kind", [kind for kind in TERMS if kind not in LAYERS])
def test_layers_reach_from_the_surface_to_the_floor(ocean: Ocean, kind: str) -> None:
    raw = parametric(ocean(), kind)
    ends = [0.0, -0.5, -0.75, -1.0]
    raw = raw.assign_coords(layer=("layer", ends, raw.layer.attrs), curve=("layer", ends, raw.curve.attrs))
    found = clothe(raw, understand(raw, READING)).sea_pressure.isel(lat=slice(1, None))
    assert (found.isel(layer=0) < 1e-9).all()
    water = (raw.floor + raw.eta).isel(lat=slice(1, None))
    wanted = xr.apply_ufunc(gsw.p_from_z, -water, raw.lat.isel(lat=slice(1, None)))
    np.testing.assert_allclose(found.isel(layer=3), wanted.transpose("time", "lat", "lon"), rtol=1e-12)


@pytest.mark.parametrize("kind", ["ocean_sigma_coordinate", "ocean_s_coordinate_g1", "ocean_s_coordinate_g2"])
def test_the_same_depth_gives_the_same_bits_in_every_clothing(ocean: Ocean, kind: str) -> None:
    """With a floor of 1024 m, a still surface and shares of powers of two, all depths are exact."""
    plain = ocean(depths=tuple(-1024.0 * share for share in SHARES)).isel(lat=slice(1, None))
    raw = parametric(ocean(depths=tuple(-1024.0 * share for share in SHARES)), kind, eta=0.0, floor=1024.0)
    raw = raw.assign_coords(curve=("layer", np.array(SHARES), raw.curve.attrs)).isel(lat=slice(1, None))
    reading = ReadingSettings(density="in situ", temperature="potential", salinity="absolute")
    one, other = clothe(plain, understand(plain, reading)), clothe(raw, understand(raw, reading))
    for key in ("sea_pressure", "temperature", "salinity", "dic", "alkalinity", "density"):
        wanted = one[key].rename(depth="layer").broadcast_like(other[key].drop_vars("layer")).transpose(*other[key].dims)
        assert np.ascontiguousarray(wanted.values).tobytes() == np.ascontiguousarray(other[key].values).tobytes(), key


SPANS = st.tuples(st.integers(0, 5), st.integers(1, 6))


@HERE
@given(kind=st.sampled_from(list(TERMS)), time=SPANS, rows=SPANS, columns=SPANS)
def test_a_cell_does_not_depend_on_its_slice(
    ocean: Ocean, kind: str, time: tuple[int, int], rows: tuple[int, int], columns: tuple[int, int]
) -> None:
    raw = parametric(ocean(), kind)
    understanding = understand(raw, READING)
    part = {dim: slice(start % raw.sizes[dim], start % raw.sizes[dim] + size)
            for dim, (start, size) in (("time", time), ("lat", rows), ("lon", columns))}
    whole, piece = clothe(raw, understanding), clothe(raw.isel(part), understanding)
    for key in ("sea_pressure", "temperature", "dic"):
        wanted = whole[key].isel({dim: span for dim, span in part.items() if dim in whole[key].dims})
        assert np.ascontiguousarray(piece[key].values).tobytes() == np.ascontiguousarray(wanted.values).tobytes(), key


@pytest.mark.parametrize("kind", list(TERMS))
def test_a_part_of_the_levels_is_read_alike(ocean: Ocean, kind: str) -> None:
    raw = parametric(ocean(), kind)
    understanding = understand(raw, READING)
    whole = clothe(raw, understanding).sea_pressure
    for k in range(4):
        np.testing.assert_array_equal(clothe(raw.isel(layer=[k]), understanding).sea_pressure, whole.isel(layer=[k]))


def test_the_understanding_is_small_and_says_what_it_took(ocean: Ocean) -> None:
    understanding = understand(parametric(ocean(), "ocean_s_coordinate_g2"), READING)
    assert pickle.loads(pickle.dumps(understanding)) == understanding
    assert len(pickle.dumps(understanding)) < 10_000
    said = next(str(decision) for decision in understanding.decisions if decision.subject == "pressure")
    assert "'layer' is ocean_s_coordinate_g2" in said
    assert "below the sea surface 'eta', not below the datum" in said
    assert understanding.place.vertical.top == 0


def test_levels_from_the_floor_up_have_their_top_last(ocean: Ocean) -> None:
    raw = parametric(ocean(), "ocean_sigma_coordinate").isel(layer=slice(None, None, -1))
    assert vertical(raw).top == 3


class Counting(BackendArray):
    """Numbers that count how many of them are read."""

    def __init__(self, values: np.ndarray[Any, Any]) -> None:
        self.values, self.shape, self.dtype, self.read = values, values.shape, values.dtype, 0

    def __getitem__(self, key: Any) -> Any:
        return explicit_indexing_adapter(key, self.shape, IndexingSupport.OUTER, self._take)

    def _take(self, key: tuple[Any, ...]) -> np.ndarray[Any, Any]:
        found = np.asarray(self.values[key])
        self.read += found.size
        return found


@pytest.mark.parametrize("field", [False, True])
def test_only_a_sample_of_large_terms_is_read(ocean: Ocean, field: bool) -> None:
    raw = ocean(rows=300, columns=400)
    counted: Mapping[str, Counting]
    if field:
        deep = np.broadcast_to(raw.depth.values[None, :, None, None], raw.dic.shape)
        counted = {"deep": Counting(deep)}
        raw = raw.drop_vars("depth")
        lazy = {"deep": xr.Variable(("time", "depth", "lat", "lon"), LazilyIndexedArray(counted["deep"]),
                                    {"units": "m", "standard_name": "depth", "positive": "down"})}
    else:
        raw = parametric(raw, "ocean_sigma_coordinate")
        counted = {"eta": Counting(raw.eta.values), "floor": Counting(raw.floor.values)}
        lazy = {name: xr.Variable(raw[name].dims, LazilyIndexedArray(numbers), raw[name].attrs)
                for name, numbers in counted.items()}
    found = vertical(raw.assign_coords(lazy))
    assert found.deepest > (3999.0 if field else 1800.0)
    for numbers in counted.values():
        assert 0 < numbers.read <= 4 * 25_000


@pytest.mark.parametrize(("kind", "term"), [(kind, term) for kind, text in TERMS.items() for term in text.split()[::2]
                                            if term not in ("eta:", "b:", "nsigma:") and "depth_c" not in term])
def test_a_term_not_named_is_refused_by_its_name(ocean: Ocean, kind: str, term: str) -> None:
    raw = parametric(ocean(), kind)
    words = TERMS[kind].split()
    place = words.index(term)
    raw.layer.attrs["formula_terms"] = " ".join(words[:place] + words[place + 2:])
    with pytest.raises(InputError, match=f"the term '{term[:-1].lower()}'") as caught:
        understand(raw, READING)
    assert "formula_terms" in caught.value.mend


@pytest.mark.parametrize("kind", ["ocean_sigma_coordinate", "ocean_s_coordinate", "ocean_s_coordinate_g1"])
def test_a_surface_not_named_is_still_with_a_notice(ocean: Ocean, kind: str) -> None:
    raw, still = (parametric(ocean(), kind, eta=0.0) for _ in range(2))
    raw.layer.attrs["formula_terms"] = TERMS[kind].replace("eta: eta ", "")
    understanding = understand(raw, READING)
    assert "formula_term_zero" in {notice.code for notice in understanding.notices}
    found, wanted = clothe(raw, understanding).sea_pressure, clothe(still, understand(still, READING)).sea_pressure
    np.testing.assert_array_equal(found.isel(lat=slice(1, None)), wanted.isel(time=0, lat=slice(1, None)))


def change(name: str, values: Any = None, **attrs: Any) -> Callable[[xr.Dataset], xr.Dataset]:
    def bend(raw: xr.Dataset) -> xr.Dataset:
        old = raw[name]
        return raw.assign_coords({name: (old.dims, old.values if values is None else values(old.values),
                                         {**old.attrs, **attrs})})
    return bend


@pytest.mark.parametrize(("kind", "bend", "what"), [
    ("ocean_sigma_coordinate", lambda raw: raw.drop_vars("floor"), "term 'depth' is the variable 'floor'"),
    ("ocean_sigma_coordinate", lambda raw: raw.drop_vars("eta"), "term 'eta' is the variable 'eta'"),
    ("ocean_sigma_coordinate", change("layer", standard_name="atmosphere_sigma_coordinate"), "no parametric coordinate"),
    ("ocean_sigma_coordinate", change("layer", np.negative), "above the sea surface"),
    ("ocean_sigma_coordinate", change("layer", lambda s: 1.5 * s), "below the sea floor"),
    ("ocean_sigma_coordinate", change("floor", np.negative), "positive nowhere"),
    ("ocean_sigma_coordinate", change("floor", lambda f: np.full(f.shape, 1e20)), "all its values are missing"),
    ("ocean_sigma_coordinate", change("floor", units="km"), "deeper than any sea"),
    ("ocean_sigma_z_coordinate", change("zlev", np.negative), "above the sea surface"),
    ("ocean_sigma_z_coordinate", lambda raw: change("zlev", lambda z: np.zeros(4))(change("sigma", np.nan_to_num)(raw)),
     "same value in upper and lower"),
    ("ocean_double_sigma_coordinate", change("layer", np.negative), "below the sea floor"),
])
def test_what_cannot_be_so_is_refused(
    ocean: Ocean, kind: str, bend: Callable[[xr.Dataset], xr.Dataset], what: str
) -> None:
    with pytest.raises(InputError, match=what) as caught:
        understand(bend(parametric(ocean(), kind)), READING)
    assert caught.value.mend


def test_terms_need_units_which_can_be_stated(ocean: Ocean) -> None:
    raw = parametric(ocean(), "ocean_sigma_coordinate")
    del raw.floor.attrs["units"]
    with pytest.raises(UnitsError, match="missing") as caught:
        understand(raw, READING)
    assert "reading: {units: {depth: m}}" in caught.value.mend
    assert vertical(raw, units={"depth": "m"}).deepest > 1500.0


def test_heights_that_count_down_are_turned(ocean: Ocean) -> None:
    raw = parametric(ocean(), "ocean_sigma_z_coordinate")
    turned = change("zlev", np.negative, positive="down")(raw)
    one, other = (clothe(each, understand(each, READING)).sea_pressure for each in (raw, turned))
    np.testing.assert_array_equal(one, other)


def test_complete_terms_of_both_kinds_are_told_apart_by_their_count(ocean: Ocean) -> None:
    raw = parametric(ocean(), "ocean_sigma_z_coordinate")
    full = change("zlev", lambda z: np.array([-5.0, -50.0, *z[2:]]))(change("sigma", np.nan_to_num)(raw))
    one, other = (clothe(each, understand(each, READING)).sea_pressure for each in (raw, full))
    np.testing.assert_array_equal(one, other)


def test_a_double_sigma_that_does_not_say_its_sense_gives_a_notice(ocean: Ocean) -> None:
    raw = parametric(ocean(), "ocean_double_sigma_coordinate")
    del raw.layer.attrs["positive"]
    assert "double_sigma_depths" in {notice.code for notice in understand(raw, READING).notices}


def test_water_that_has_fallen_dry_is_at_the_surface(ocean: Ocean) -> None:
    """A fixed level above a low sea surface."""
    raw = change("zlev", lambda z: np.array([np.nan, np.nan, -0.5, -900.0]))(
        parametric(ocean(), "ocean_sigma_z_coordinate", eta=-1.0))
    found = clothe(raw, understand(raw, READING)).sea_pressure.isel(layer=2, lat=2, lon=2)
    assert (found == 0.0).all()


@pytest.mark.parametrize("cells", [1, 10])
def test_wet_cells_without_a_depth_are_told_and_many_refused(ocean: Ocean, cells: int) -> None:
    raw = parametric(ocean(rows=10, columns=20), "ocean_sigma_coordinate")
    raw.floor.values[5, :cells] = 1e20
    if cells == 1:
        assert "depths_missing" in {notice.code for notice in understand(raw, READING).notices}
        return
    with pytest.raises(InputError, match=r"the depth is missing in 5\.0% of the wet cells") as caught:
        understand(raw, READING)
    assert "mask_difference: 0.06" in caught.value.mend
