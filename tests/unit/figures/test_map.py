"""Maps, judged by their pixels."""

from __future__ import annotations

import socket
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import matplotlib
import numpy as np
import pytest
import xarray as xr
from matplotlib.image import imread

from gridcarb.errors import InputError, OutputError
from gridcarb.figures.drawing import theme
from gridcarb.figures.map import MapSettings, check, draw

from .conftest import Pixels, make_result, share

Picture = Callable[..., Pixels]


def settings(**words: object) -> MapSettings:
    return MapSettings.model_validate({"kind": "map", "field": "dic", **words})


def test_the_same_input_gives_the_same_bytes_whatever_the_users_style(result: xr.Dataset, tmp_path: Path) -> None:
    first = draw(result, settings(), tmp_path / "a").read_bytes()
    with matplotlib.rc_context({"font.size": 30, "axes.facecolor": "red", "savefig.dpi": 30, "hatch.linewidth": 9}):
        second = draw(result, settings(), tmp_path / "b").read_bytes()
    assert first == second
    assert b"matplotlib" not in first.lower()


def test_threads_do_not_disturb_each_other(result: xr.Dataset, tmp_path: Path) -> None:
    alone = [draw(result, settings(depth=depth), tmp_path / "alone").read_bytes() for depth in (0, 500)]
    with ThreadPoolExecutor(2) as pool:
        together = list(pool.map(lambda depth: draw(result, settings(depth=depth), tmp_path / "together"), (0, 500)))
    assert [path.read_bytes() for path in together] == alone


def test_nothing_is_fetched(result: xr.Dataset, picture: Picture, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object, **__: object) -> None:
        raise AssertionError("a figure touched the network")

    monkeypatch.setattr(socket, "socket", refuse)
    monkeypatch.setattr(socket, "getaddrinfo", refuse)
    del result.attrs["geography"]
    assert picture(result).size


def _rolled(ds: xr.Dataset) -> xr.Dataset:
    rolled = ds.roll(lon=7, roll_coords=True)
    return rolled.assign_coords(lon=("lon", (rolled.lon.values + 180) % 360 - 180, ds.lon.attrs))


CLOTHES: dict[str, Callable[[xr.Dataset], xr.Dataset]] = {
    "longitudes from -180": _rolled,
    "a turn further": lambda ds: ds.assign_coords(lon=("lon", ds.lon.values + 720, ds.lon.attrs)),
    "latitudes from north to south": lambda ds: ds.isel(lat=slice(None, None, -1)),
    "longitudes from east to west": lambda ds: ds.isel(lon=slice(None, None, -1)),
    "dimensions in another order": lambda ds: ds.transpose("lon", "lev", "lat", "time"),
    "depth negative upward": lambda ds: ds.assign_coords(
        lev=("lev", -ds.lev.values, {"units": "m", "positive": "up", "standard_name": "depth"})),
    "bounds given": lambda ds: ds.assign_coords(
        lon=("lon", ds.lon.values, {**ds.lon.attrs, "bounds": "lon_bnds"}),
        lon_bnds=(("lon", "two"), np.stack([ds.lon.values - 5, ds.lon.values + 5], axis=1))),
    "a column repeated at the seam": lambda ds: xr.concat(
        [ds, ds.isel(lon=[0]).assign_coords(lon=("lon", [365.0], ds.lon.attrs))], "lon", data_vars="minimal",
        coords="minimal", compat="override", join="override", combine_attrs="override"),
    "lazy": lambda ds: ds.chunk({"lat": 5}),
}


@pytest.mark.parametrize("clothes", CLOTHES)
@pytest.mark.parametrize("projection", ["automatic", "south"])
def test_the_picture_does_not_depend_on_the_clothes(
    result: xr.Dataset, picture: Picture, clothes: str, projection: str
) -> None:
    plain, other = picture(result, projection=projection), picture(CLOTHES[clothes](result), projection=projection)
    assert plain.shape == other.shape
    differing = (plain != other).any(axis=-1).mean()
    assert differing < 2e-4  # pixels whose middle lies on an edge, to rounding


def _field_area(image: Pixels) -> Pixels:
    """The pixels of the frame of a map without labels: the middle of the picture."""
    rows, columns = image.shape[:2]
    return image[rows * 3 // 10 : rows * 7 // 10, columns // 7 : columns * 6 // 7]


def test_no_white_gap_anywhere(picture: Picture) -> None:
    everywhere = make_result(levels=(5.0,))
    everywhere["dic"] = everywhere.dic.fillna(2000)
    everywhere["solution_status"] = xr.zeros_like(everywhere.solution_status)
    for words in ({}, {"centre": 0}, {"centre": 97.3}, {"region": [150, -150, -20, 20]}, {"region": [-60, 50, -80, 10]}):
        inner = _field_area(picture(everywhere, limits=[1500, 2500], **words))
        assert share(inner, theme.PAPER) == 0, words


def test_the_pole_is_filled(picture: Picture) -> None:
    full = make_result()
    image = picture(full, projection="north")
    rows, columns = image.shape[:2]
    middle = image[rows // 2 - 60 : rows // 2 + 60, columns // 2 - 60 : columns // 2 + 60]
    assert share(middle, theme.PAPER) == 0


def test_land_and_missing_are_told_apart(result: xr.Dataset, picture: Picture) -> None:
    sound = picture(result)
    assert 0.02 < share(sound, theme.LAND) < 0.2
    assert share(sound, theme.MISSING) == 0
    hurt = result.copy(deep=True)
    hurt.solution_status[0, 0, 4:8, 20:26] = 2  # wet in the second month
    hurt.solution_status[:, 0, 10:13, 28:32] = 4
    hurt["dic"] = hurt.dic.where(hurt.solution_status < 2)
    image = picture(hurt)
    assert share(image, theme.MISSING) > 0.01
    assert share(image, theme.LAND) == pytest.approx(share(sound, theme.LAND), rel=0.02)


def test_the_sea_floor_is_ground_below_it_and_only_there(result: xr.Dataset, picture: Picture) -> None:
    top, deep = picture(result), picture(result, depth=500)
    assert share(deep, theme.LAND) > 1.5 * share(top, theme.LAND)
    assert share(deep, theme.MISSING) == 0
    hole = result.copy(deep=True)
    hole.solution_status[:, 0, 8:10, 20:24] = 2  # never at this level, but wet below it
    hole["dic"] = hole.dic.where(hole.solution_status < 2)
    assert share(picture(hole), theme.MISSING) > 0.003


def test_without_status_what_has_never_a_value_is_land(result: xr.Dataset, picture: Picture) -> None:
    bare = result.drop_vars("solution_status")
    bare["dic"] = bare.dic.copy()
    bare.dic[0, 0, 4:8, 20:26] = np.nan
    image = picture(bare)
    assert share(image, theme.LAND) == pytest.approx(share(picture(result), theme.LAND), rel=0.02)
    assert share(image, theme.MISSING) > 0.01


def test_the_coastline_of_the_earth_is_left_out_for_invented_oceans(result: xr.Dataset, picture: Picture) -> None:
    invented = picture(result)
    real = result.copy()
    del real.attrs["geography"]
    earth = picture(real)
    assert share(invented, theme.COAST) == 0
    assert share(earth, theme.COAST) > 1e-4
    assert np.array_equal(picture(real, coastline=False), invented)


def test_a_regional_grid_fills_its_frame(result: xr.Dataset, picture: Picture) -> None:
    region = result.isel(lon=[34, 35, 0, 1], lat=slice(6, 11))  # across the seam of its longitudes
    image = picture(region, limits=[1500, 2500])
    assert image.shape[0] > image.shape[1] * 0.8
    assert share(_field_area(image), theme.PAPER) == 0


def test_a_region_narrows_the_scale_to_what_is_seen(result: xr.Dataset, tmp_path: Path) -> None:
    from gridcarb.figures.choice import choose
    from gridcarb.figures.drawing.plates import plate_of

    choice = choose(result, "dic", 0, "first")
    whole = plate_of(result, choice, settings()).scale.norm
    part = plate_of(result, choice, settings(region=[80, 100, -10, 10])).scale.norm
    assert part.vmax - part.vmin < 0.5 * (whole.vmax - whole.vmin)


def test_curvilinear_cells_give_the_picture_of_the_same_plain_grid(result: xr.Dataset, picture: Picture) -> None:
    lat, lon = np.meshgrid(result.lat.values, result.lon.values, indexing="ij")
    curved = result.drop_vars(["lat", "lon"]).rename(lat="y", lon="x")
    corners = np.array([[-5, -5], [5, -5], [5, 5], [-5, 5]])
    curved = curved.assign_coords(
        lat=(("y", "x"), lat, {**result.lat.attrs, "bounds": "lat_b"}),
        lon=(("y", "x"), lon, {**result.lon.attrs, "bounds": "lon_b"}),
        lat_b=(("y", "x", "v"), lat[..., None] + corners[:, 1]), lon_b=(("y", "x", "v"), lon[..., None] + corners[:, 0]),
    )
    plain, bent = picture(result, centre=0), picture(curved, centre=0)
    assert (plain != bent).any(axis=-1).mean() < 0.02  # sides of 10 degrees are straight there, bent here
    cells = curved.stack(cell=("y", "x")).reset_index("cell", drop=True).drop_vars(["y", "x"], errors="ignore")
    assert np.array_equal(picture(cells, centre=0), bent)


def test_a_status_is_drawn_as_kinds_with_a_legend(result: xr.Dataset, picture: Picture) -> None:
    result.solution_status[0, 0, 4:8, 20:26] = 4
    image = picture(result, field="solution_status")
    assert share(image, theme.CATEGORIES[0]) > 0.2
    assert share(image, theme.CATEGORIES[4]) > 0.01
    assert share(image, theme.LAND) > 0.02


def test_data_without_time_and_depth_are_drawn(result: xr.Dataset, tmp_path: Path) -> None:
    flat = result.isel(time=0, lev=0, drop=True)
    assert draw(flat, settings(), tmp_path).name == "dic.png"
    assert draw(result.isel(time=1), settings(), tmp_path).name == "dic_5m_2001-02-16.png"


def test_names_of_files(result: xr.Dataset, tmp_path: Path) -> None:
    assert draw(result, settings(), tmp_path).name == "dic_5m_2001-01-16.png"
    polar = settings(depth=400, time="last", projection="north")
    assert draw(result, polar, tmp_path).name == "dic_500m_2001-02-16_north.png"
    assert draw(result, settings(file="mine.png"), tmp_path).name == "mine.png"
    assert sorted(path.suffix for path in tmp_path.iterdir()) == [".png"] * 3  # nothing half-written stays


def test_a_slice_without_any_value_is_drawn_all_the_same(result: xr.Dataset, picture: Picture) -> None:
    result["dic"] = result.dic.where(False)
    assert share(picture(result), theme.MISSING) > 0.1


def test_a_folder_that_cannot_be_written(result: xr.Dataset, tmp_path: Path) -> None:
    (tmp_path / "taken").write_text("a file")
    with pytest.raises(OutputError, match="cannot be written"):
        draw(result, settings(), tmp_path / "taken")


@pytest.mark.parametrize(
    ("words", "what", "mend"),
    [
        ({"field": "dick"}, "no field 'dick'", "'dic'"),
        ({"depth": 6000}, "grid ends at 747.5 m", "5, 500"),
        ({"time": 2}, "no time step 2", "steps 0 to 1"),
        ({"time": "2003-01-01"}, "outside the time axis", "2001-01-16 to 2001-02-16"),
        ({"time": "2001-02-31"}, "no '2001-02-31' in the calendar '360_day'", "dates from"),
        ({"time": "soon"}, "'soon' is no date", "first"),
    ],
)
def test_what_cannot_be_drawn_is_refused_from_the_header(
    result: xr.Dataset, words: dict[str, object], what: str, mend: str
) -> None:
    header = result.drop_vars("solution_status").drop_vars("dic")
    with pytest.raises(ValueError, match=what) as caught:
        check(header, settings(**words))
    assert mend in str(caught.value)


def test_a_view_without_cells_is_refused(result: xr.Dataset) -> None:
    tropics = result.isel(lat=slice(7, 11), lon=slice(0, 6))
    check(tropics, settings(region=[1, 2, 3, 4]))  # smaller than a cell
    for words in ({"projection": "north"}, {"region": [100, 120, -10, 10]}):
        with pytest.raises(InputError, match="would be empty"):
            check(tropics, settings(**words))


def test_a_field_the_result_lacks(result: xr.Dataset, tmp_path: Path) -> None:
    with pytest.raises(InputError, match="holds no 'alkalinity'"):
        draw(result, settings(field="alkalinity"), tmp_path)


def test_a_single_column_has_no_map(result: xr.Dataset) -> None:
    with pytest.raises(InputError, match="no map of a single column"):
        check(result.isel(lat=0, lon=0), settings())


@pytest.mark.parametrize(
    "words",
    [{"region": [0, 9, 20, 10]}, {"limits": [2, 1]}, {"file": "../up.png"}, {"file": "up.jpg"}, {"depth": -5}, {"tint": 1}],
)
def test_settings_that_make_no_sense(words: dict[str, object]) -> None:
    with pytest.raises(ValueError, match="MapSettings"):
        settings(**words)


def test_png_carries_its_title(result: xr.Dataset, tmp_path: Path) -> None:
    path = draw(result, settings(title="Carbon of Nowhere"), tmp_path)
    assert b"Title\x00Carbon of Nowhere" in path.read_bytes()
    assert imread(path).shape[1] / theme.DPI == pytest.approx(9.84, abs=0.01)
