"""Pressure: from depth and latitude, from pressure, or the surface; refused where up and down are not certain."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import gsw
import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import find_axes
from gridcarb.errors import InputError, UnitsError
from gridcarb.harmonise.decisions import Decided
from gridcarb.harmonise.depth import Place, PlaceReading, coordinate_masks, locate, read_place
from gridcarb.harmonise.settings import ReadingSettings

Ocean = Callable[..., xr.Dataset]


def read(raw: xr.Dataset, names: set[str] | None = None, **settings: Any) -> Decided[PlaceReading]:
    axes = find_axes(raw)
    return read_place(raw, axes, coordinate_masks(raw, axes), ReadingSettings(**settings), names or set())


def place(raw: xr.Dataset, **settings: Any) -> Place:
    axes = find_axes(raw)
    return locate(raw, axes, coordinate_masks(raw, axes), read(raw, **settings).reading)


def vertical(raw: xr.Dataset, values: list[float], **attrs: Any) -> xr.Dataset:
    return raw.isel(depth=slice(0, len(values))).assign_coords(depth=("depth", np.array(values), {"axis": "Z", **attrs}))


def test_pressure_is_that_of_gsw_and_varies_over_depth_and_latitude_alone(ocean: Ocean) -> None:
    raw = ocean()
    found = place(raw).pressure
    assert found.dims == ("depth", "lat")
    np.testing.assert_array_equal(found, gsw.p_from_z(-raw.depth.values[:, None], raw.lat.values[None, :]))


@pytest.mark.parametrize(("values", "attrs"), [
    ([5.0, 4000.0], {"units": "m", "positive": "down"}),
    ([-5.0, -4000.0], {"units": "m", "positive": "up"}),
    ([500.0, 400000.0], {"units": "cm", "positive": "down"}),
    ([0.005, 4.0], {"units": "km", "standard_name": "depth"}),
    ([-5.0, -4000.0], {"units": "metres"}),
    ([5.0, 4000.0], {"units": "meters"}),
    ([-5.0, -4000.0], {"units": "m", "standard_name": "height"}),
])
def test_every_way_to_say_the_same_depth(ocean: Ocean, values: list[float], attrs: dict[str, Any]) -> None:
    found = place(vertical(ocean(), values, **attrs)).pressure
    np.testing.assert_array_equal(found.isel(lat=2), gsw.p_from_z([-5.0, -4000.0], 0.0))


@pytest.mark.parametrize(("units", "factor"), [("dbar", 1.0), ("Pa", 1e4), ("bar", 0.1)])
def test_pressure_as_coordinate_is_taken_as_it_is(ocean: Ocean, units: str, factor: float) -> None:
    raw = vertical(ocean(), [10 * factor, 4000 * factor], units=units,
                   standard_name="sea_water_pressure_due_to_sea_water")
    assert place(raw).pressure.values.tolist() == [10.0, 4000.0]
    assert read(raw).notices == ()


def test_absolute_pressure_gives_a_notice(ocean: Ocean) -> None:
    decided = read(vertical(ocean(), [10.0, 4000.0], units="dbar", standard_name="sea_water_pressure"))
    assert [notice.code for notice in decided.notices] == ["sea_pressure"]


def test_depth_zero_is_pressure_zero_without_a_sign(ocean: Ocean) -> None:
    found = place(vertical(ocean(), [-0.0, -10.0], units="m", positive="up")).pressure.values[0]
    assert not np.signbit(found).any()
    assert (found == 0).all()


def test_scalar_depth(ocean: Ocean) -> None:
    raw = ocean().isel(depth=2)
    found = place(raw).pressure
    assert found.dims == ("lat",)
    np.testing.assert_array_equal(found, gsw.p_from_z(-1000.0, raw.lat.values))


@pytest.mark.parametrize(("values", "attrs", "what"), [
    ([-5.0, -10.0], {"units": "m", "positive": "down"}, "all negative"),
    ([5.0, 10.0], {"units": "m", "positive": "up"}, "all positive"),
    ([-5.0, -10.0], {"units": "m", "standard_name": "depth"}, "all negative"),
    ([-0.5, 10.0], {"units": "m", "positive": "down"}, "0.5 above the sea surface"),
    ([-0.5, 10.0], {"units": "m"}, "which way is down"),
    ([500.0, 400000.0], {"units": "m", "positive": "down"}, "likely are cm"),
    ([np.nan, np.nan], {"units": "m", "positive": "down"}, "missing"),
    ([1e5, 4e7], {"units": "dbar"}, "likely are Pa"),
])
def test_contradictions_are_refused(ocean: Ocean, values: list[float], attrs: dict[str, Any], what: str) -> None:
    with pytest.raises(InputError, match=what) as caught:
        read(vertical(ocean(), values, **attrs))
    assert caught.value.mend


def test_centimetres_can_be_stated(ocean: Ocean) -> None:
    raw = vertical(ocean(), [500.0, 400000.0], units="m", positive="down")
    assert read(raw, units={"depth": "cm"}).reading.vertical.deepest == 4000.0


def test_missing_units_are_refused(ocean: Ocean) -> None:
    with pytest.raises(UnitsError, match="missing") as caught:
        read(vertical(ocean(), [5.0, 10.0], positive="down"))
    assert "reading: {units: {depth: m}}" in caught.value.mend


def test_levels_without_coordinate_are_refused(ocean: Ocean) -> None:
    with pytest.raises(InputError, match="no coordinate"):
        read(ocean().drop_vars("depth"))


def test_surface_by_standard_name_by_statement_or_with_a_notice(ocean: Ocean) -> None:
    raw = ocean().isel(depth=0, drop=True)
    by_name, stated, assumed = read(raw, {"sea_surface_temperature"}), read(raw, depth="surface"), read(raw)
    assert by_name.notices == stated.notices == ()
    assert [notice.code for notice in assumed.notices] == ["surface_assumed"]
    for decided in (by_name, stated, assumed):
        assert (decided.reading.vertical.kind, decided.reading.vertical.deepest) == ("surface", 0.0)
    assert place(raw).pressure.item() == 0.0


def test_surface_stated_of_many_levels_is_refused_and_of_one_wins(ocean: Ocean) -> None:
    with pytest.raises(InputError, match="4 levels"):
        read(ocean(), depth="surface")
    decided = read(ocean().isel(depth=slice(0, 1)), depth="surface")
    assert [notice.code for notice in decided.notices] == ["depth_overruled"]


def test_depth_needs_a_latitude(ocean: Ocean) -> None:
    raw = ocean().isel(lat=0, lon=0).drop_vars(["lat", "lon"])
    with pytest.raises(InputError, match="latitude"):
        read(raw)


def test_top_level_is_the_shallowest(ocean: Ocean) -> None:
    for raw, index in ((ocean(), 0), (ocean().isel(depth=slice(None, None, -1)), 3)):
        assert read(raw).reading.vertical.top == index


@pytest.mark.parametrize("west", [-157.3, -0.1, 12.3456])
def test_longitude_turns_are_one_number(ocean: Ocean, west: float) -> None:
    found = set()
    for turn in (-360.0, 0.0, 360.0):
        turned = ocean().assign_coords(lon=("lon", west + turn + np.arange(6.0), {"units": "degrees_east"}))
        longitude = place(turned).longitude
        assert longitude is not None
        found.add(longitude.values.tobytes())
    assert len(found) == 1


def test_radians_become_degrees(ocean: Ocean) -> None:
    raw = ocean()
    turned = raw.assign_coords(lat=("lat", np.radians(raw.lat.values), {"units": "radian", "standard_name": "latitude"}))
    np.testing.assert_allclose(place(turned).pressure, place(raw).pressure, rtol=1e-12)


def with_field(raw: xr.Dataset, dims: tuple[str, ...], factor: float = 1.0, **attrs: Any) -> xr.Dataset:
    """The levels as depths of every cell, deeper by a hundredth from column to column, in place of the coordinate."""
    deeper = 1.0 + 0.01 * xr.DataArray(np.arange(raw.sizes["lon"]), dims="lon")
    template = raw.dic.reset_coords(drop=True)
    field = (raw.depth.drop_vars("depth") * deeper * factor).broadcast_like(template).transpose(*template.dims)
    field = field.isel({dim: 0 for dim in field.dims if dim not in dims})
    said = {"units": "m", "standard_name": "depth", "positive": "down", "_FillValue": 1e20, **attrs}
    return raw.drop_vars("depth").assign_coords(deep=(dims, field.values.copy(), said))


@pytest.mark.parametrize("dims", [("depth", "lon"), ("depth", "lat", "lon"), ("time", "depth", "lat", "lon")])
def test_a_depth_of_every_cell(ocean: Ocean, dims: tuple[str, ...]) -> None:
    raw = with_field(ocean(), dims)
    if "lat" in dims:
        raw.deep.values[..., 0, 0] = 1e20
    found = place(raw).pressure
    assert set(found.dims) == {*dims, "lat"}
    cell = found.isel(depth=2, lat=3, lon=4)
    np.testing.assert_array_equal(cell, gsw.p_from_z(-1000.0 * (1.0 + 0.01 * 4.0), float(raw.lat[3])))
    assert bool(found.isel(lat=0, lon=0).isnull().all()) == ("lat" in dims)
    reading = read(raw).reading.vertical
    assert reading.deepest == pytest.approx(4200.0)
    assert (reading.shallowest, reading.top) == (5.0, 0)


def test_a_depth_of_every_cell_goes_before_numbers_of_levels(ocean: Ocean) -> None:
    raw = with_field(ocean(), ("depth", "lat", "lon"))
    raw = raw.assign_coords(depth=("depth", np.arange(1.0, 5.0), {"axis": "Z", "long_name": "number of the level"}))
    assert read(raw).reading.vertical.deepest == pytest.approx(4200.0)


def test_heights_in_centimetres_from_the_deep_up(ocean: Ocean) -> None:
    raw = with_field(ocean().isel(depth=slice(None, None, -1)), ("depth", "lat", "lon"), -100.0, units="cm", positive="up",
                     standard_name="height")
    reading = read(raw).reading.vertical
    assert reading.deepest == pytest.approx(4200.0)
    assert (reading.top, reading.downward) == (3, False)


def test_a_pressure_of_every_cell(ocean: Ocean) -> None:
    raw = with_field(ocean(), ("depth", "lat", "lon"), units="dbar", standard_name="sea_water_pressure_due_to_sea_water")
    assert float(place(raw).pressure[2, 3, 4]) == 1000.0 * (1.0 + 0.01 * 4.0)


def test_water_in_a_corner_of_a_large_map_is_found(ocean: Ocean) -> None:
    raw = with_field(ocean(rows=300, columns=200), ("depth", "lat", "lon"))
    raw.deep.values[:, :, 15:] = 1e20
    raw.deep.values[:, :170, :] = 1e20
    raw.deep.values[:, 190:, :] = 1e20
    assert read(raw).reading.vertical.deepest == pytest.approx(4000.0 * 1.14)
    raw.deep.values[...] = 1e20
    with pytest.raises(InputError, match="all its values are missing"):
        read(raw)


@pytest.mark.parametrize(("attrs", "values"), [({"units": "km"}, 1.0), ({"units": "cm", "positive": "down"}, 1e5)])
def test_scalar_depth_in_other_units(ocean: Ocean, attrs: dict[str, Any], values: float) -> None:
    raw = ocean().isel(depth=2).assign_coords(depth=((), values, {"standard_name": "depth", **attrs}))
    np.testing.assert_array_equal(place(raw).pressure, gsw.p_from_z(-1000.0, raw.lat.values))


def test_one_depth_gives_the_same_bits_in_every_clothing(ocean: Ocean) -> None:
    raw = ocean(depths=(5.0, 128.0, 1024.0, 4096.0))
    wanted = place(raw).pressure.values.tobytes()
    depths = raw.depth.values
    for values, attrs in (
        (-depths, {"units": "m", "positive": "up"}), (depths * 100.0, {"units": "cm", "positive": "down"}),
        (-depths, {"units": "m", "standard_name": "height_above_mean_sea_level"}),
    ):
        turned = raw.assign_coords(depth=("depth", values, {"axis": "Z", **attrs}))
        assert place(turned).pressure.values.tobytes() == wanted
        upside = place(turned.isel(depth=slice(None, None, -1))).pressure.values[::-1]
        assert np.ascontiguousarray(upside).tobytes() == wanted
    field = raw.drop_vars("depth").assign_coords(deep=(("depth", "lat"), np.repeat(depths[:, None], 5, axis=1),
                                                       {"units": "m", "standard_name": "depth"}))
    assert place(field).pressure.values.tobytes() == wanted
