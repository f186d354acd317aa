"""What a collection says: roles, coordinates, files, attributes; and files that were packed in two ways."""

from __future__ import annotations

import hashlib
import json
import pickle
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import find_axes
from gridcarb.errors import InputError
from gridcarb.sources import open_collection


def test_one_file_says_everything(gathered, ocean, save, tmp_path: Path) -> None:
    path = save(ocean(bounds=True), tmp_path / "a.nc")
    collection = gathered(tmp_path, files="a.nc")
    assert list(collection.roles) == ["temperature", "salinity", "dic", "alkalinity", "phosphate"]
    assert dict(collection.sizes) == {"time": 3, "lev": 3, "lat": 4, "lon": 5}
    assert collection.attributes == {"title": "invented", "institution": "none"}
    assert collection.notices == ()
    assert set(collection.coordinates) == {"time", "lev", "lat", "lon", "time_bnds"}
    record, = collection.files
    assert (record.path, record.size) == (str(path), path.stat().st_size)
    assert record.mtime_ns == path.stat().st_mtime_ns
    assert record.fingerprint == hashlib.sha256(path.read_bytes()[:65536]).hexdigest()


def test_a_row_for_people_and_for_json(gathered, ocean, save, tmp_path: Path) -> None:
    save(ocean(), tmp_path / "a.nc", thetao={"chunksizes": (1, 3, 2, 5)})
    row = gathered(tmp_path, files="a.nc").describe()[0]
    assert json.loads(json.dumps(row)) == {
        "role": "temperature", "variable": "thetao", "match": "by standard_name", "files": 1,
        "first_file": str(tmp_path / "a.nc"), "units": "degC", "dims": {"time": 3, "lev": 3, "lat": 4, "lon": 5},
        "dtype": "float64", "chunks": [1, 3, 2, 5], "bytes": 1440,
    }


def test_a_file_for_every_role_and_year(gathered, ocean, save, tmp_path: Path) -> None:
    whole = ocean(times=np.arange(24) * 30.0, calendar="360_day", bounds=True)
    for name in whole.data_vars:
        if name != "time_bnds":
            for year in (1, 0):
                piece = whole[[name, "time_bnds"]].isel(time=slice(12 * year, 12 * year + 12))
                save(piece, tmp_path / f"{name}_{year}.nc")
    collection = gathered(tmp_path, files="*_*.nc", dic={"files": "dissic_?.nc"})
    assert len(collection.files) == 10
    assert [(segment.start, segment.stop) for segment in collection.roles["dic"].array.segments] == [(0, 12), (12, 24)]
    ds = open_collection(collection)
    assert ds.time_bnds.shape == (24, 2)
    for role, source in collection.roles.items():
        np.testing.assert_array_equal(ds[role], whole[source.variable])


def test_the_given_order_of_files_does_not_matter(gathered, ocean, save, tmp_path: Path) -> None:
    save(ocean(times=(0.0, 30.0)), tmp_path / "z.nc")
    save(ocean(times=(60.0, 90.0)), tmp_path / "a.nc")
    one = gathered(tmp_path, files=["z.nc", "a.nc"])
    two = gathered(tmp_path, files=["*.nc", str(tmp_path / "z.nc")])
    assert open_collection(one).identical(open_collection(two))
    assert open_collection(one).time.values.tolist() == [0, 30, 60, 90]


def test_a_link_keeps_its_name_and_a_file_meant_twice_counts_once(gathered, ocean, save, tmp_path: Path) -> None:
    (tmp_path / "store").mkdir()
    save(ocean(), tmp_path / "store" / "0f3a.nc")
    (tmp_path / "good_name.nc").symlink_to(tmp_path / "store" / "0f3a.nc")
    collection = gathered(tmp_path, files=["good_name.nc", "store/../store/*.nc"])
    assert [record.path for record in collection.files] == [str(tmp_path / "good_name.nc")]


def test_extra_coordinates_travel_and_pointers_to_others_do_not(gathered, ocean, save, tmp_path: Path) -> None:
    ds = ocean()
    ds.thetao.attrs |= {
        "coordinates": "basin lost", "cell_measures": "area: areacello volume: volcello", "grid_mapping": "crs",
        "ancillary_variables": "quality", "cell_methods": "time: mean",
    }
    ds.so.attrs |= {"coordinates": "basin", "cell_measures": "volume: volcello"}
    ds["basin"] = (("lat", "lon"), np.ones((4, 5), "i4"))
    ds["areacello"] = (("lon", "lat"), np.ones((5, 4)), {"standard_name": "cell_area", "units": "m2"})
    ds["crs"] = ((), 0, {"grid_mapping_name": "latitude_longitude"})
    ds["quality"] = ds.thetao.drop_attrs()
    ds["lev"].attrs |= {"bounds": "lev_edges", "formula_terms": "a: ap b: b"}
    ds["lev_edges"] = (("lev", "nv"), np.zeros((3, 2)))
    save(ds, tmp_path / "a.nc")
    found = open_collection(gathered(tmp_path, files="a.nc"))
    assert set(found.coords) == {"time", "lev", "lat", "lon", "basin", "areacello", "crs", "lev_edges"}
    assert found.areacello.dims == ("lat", "lon")
    assert found.temperature.attrs == {
        "standard_name": "sea_water_potential_temperature", "units": "degC", "coordinates": "basin",
        "cell_measures": "area: areacello", "grid_mapping": "crs", "cell_methods": "time: mean",
    }
    assert "cell_measures" not in found.salinity.attrs
    assert "formula_terms" not in found.lev.attrs
    assert found.lev.attrs["bounds"] == "lev_edges"


def test_what_changes_with_time_comes_from_all_files(gathered, ocean, save, tmp_path: Path) -> None:
    def year(times: tuple[float, ...]) -> xr.Dataset:
        ds = ocean(times=times)
        ds["lev"].attrs |= {"standard_name": "ocean_sigma_coordinate", "formula_terms": "sigma: lev eta: eta depth: floor"}
        ds["eta"] = (("time", "lat", "lon"), np.full((len(times), 4, 5), times[0]))
        ds["floor"] = (("lat", "lon"), np.ones((4, 5)))
        return ds

    save(year((0.0, 30.0)), tmp_path / "a.nc")
    save(year((60.0, 90.0)), tmp_path / "b.nc")
    found = open_collection(gathered(tmp_path, files="*.nc"))
    assert found.eta.values[:, 0, 0].tolist() == [0, 0, 60, 60]
    assert found.lev.attrs["formula_terms"] == "sigma: lev eta: eta depth: floor"
    save(year((60.0, 90.0)).drop_vars("eta"), tmp_path / "b.nc")
    found = open_collection(gathered(tmp_path, files="*.nc"))
    assert "eta" not in found.coords
    assert "formula_terms" not in found.lev.attrs


@pytest.mark.parametrize(("attrs", "noun"), [
    ({"units": "K"}, "units"), ({"scale_factor": 0.01}, "scale_factor"), ({"missing_value": -999.0}, "missing_value"),
])
def test_files_packed_in_two_ways_are_refused(gathered, ocean, save, *, tmp_path: Path, attrs: dict, noun: str) -> None:
    save(ocean(), tmp_path / "a.nc")
    later = ocean(times=(105.0, 135.0, 165.0))
    later.thetao.attrs |= attrs
    save(later, tmp_path / "b.nc")
    with pytest.raises(InputError, match=f"packed differently: {noun}") as caught:
        gathered(tmp_path, files="*.nc")
    assert "b.nc: thetao" in caught.value.where
    assert "a.nc" in caught.value.what


def test_integers_beside_floats_are_refused_and_two_widths_pass(gathered, ocean, save, tmp_path: Path) -> None:
    fill = {"_FillValue": 1e20}
    save(ocean(), tmp_path / "a.nc", thetao=fill)
    later = ocean(times=(105.0, 135.0, 165.0))
    save(later.assign(thetao=later.thetao.astype("f4")), tmp_path / "b.nc", thetao={"_FillValue": np.float32(1e20)})
    collection = gathered(tmp_path, files="*.nc")
    assert collection.roles["temperature"].array.dtype == "float64"
    assert open_collection(collection).temperature.dtype == np.float64
    save(later.assign(thetao=later.thetao.astype("i4")), tmp_path / "b.nc", thetao={"_FillValue": np.int32(-1)})
    with pytest.raises(InputError, match="type is 'int32' here, 'float64' in"):
        gathered(tmp_path, files="*.nc")


def test_a_file_of_a_role_without_its_variable(gathered, ocean, save, tmp_path: Path) -> None:
    save(ocean(), tmp_path / "a.nc")
    save(ocean(["so"], times=(105.0,)), tmp_path / "b.nc")
    with pytest.raises(InputError, match="holds no 'thetao'") as caught:
        gathered(tmp_path, files="a.nc", temperature={"files": "*.nc"})
    assert caught.value.where == str(tmp_path / "b.nc")


def test_an_empty_time_axis(gathered, ocean, save, tmp_path: Path) -> None:
    save(ocean().isel(time=slice(0)), tmp_path / "a.nc")
    with pytest.raises(InputError, match="no values"):
        gathered(tmp_path, files="a.nc")


@pytest.mark.parametrize("change", [
    lambda ds: ds.isel(lat=2, lon=3), lambda ds: ds.isel(time=0), lambda ds: ds.isel(lev=0),
    lambda ds: ds.isel(lev=0, drop=True), lambda ds: ds.isel(lat=2, lon=3, time=1, lev=1),
    lambda ds: ds.stack(cell=("lat", "lon")).reset_index("cell").transpose("cell", "lev", "time"),
])
def test_columns_scalars_and_cells(gathered, ocean, save, tmp_path: Path, change) -> None:
    ds = change(ocean())
    save(ds, tmp_path / "a.nc")
    collection = gathered(tmp_path, files="a.nc")
    found = open_collection(collection)
    assert find_axes(found) == collection.axes
    assert set(ds.coords) <= set(found.coords)
    np.testing.assert_array_equal(found.dic, ds.dissic.transpose(*found.dic.dims))
    assert collection.kind == {0: "column", 1: "unstructured", 2: "rectilinear"}[len(collection.axes.horizontal)]


def test_a_collection_is_plain_data(gathered, ocean, save, tmp_path: Path) -> None:
    for place in range(12):
        save(ocean(times=(30.0 * place,)), tmp_path / f"{place:02}.nc")
    collection = gathered(tmp_path, files="*.nc")
    travelled = pickle.dumps(collection)
    assert len(travelled) < 20_000
    assert pickle.loads(travelled).describe() == collection.describe()
    assert open_collection(pickle.loads(travelled)).identical(open_collection(collection))


def test_large_positions_stay_in_their_file(gathered, ocean, save, tmp_path: Path) -> None:
    ds = ocean(dims=("lat", "lon"), lat=400, lon=300)
    for field in ds.data_vars.values():
        field.attrs["coordinates"] = "north east"
    north, east = np.meshgrid(ds.lat, ds.lon, indexing="ij")
    ds = ds.rename(lat="y", lon="x").drop_vars(["x", "y"])
    ds["north"] = (("y", "x"), north, {"units": "degrees_north"})
    ds["east"] = (("y", "x"), east, {"units": "degrees_east"})
    save(ds, tmp_path / "a.nc")
    collection = gathered(tmp_path, files="a.nc")
    assert len(pickle.dumps(collection)) < 20_000
    np.testing.assert_array_equal(open_collection(collection).north.isel(y=slice(100, 200)), north[100:200])


@pytest.mark.real
@pytest.mark.parametrize("name", ["global_state_2p8deg.nc"])
def test_the_real_global_state(gathered, name: str) -> None:
    folder = Path(__file__).parents[4] / "shared" / "data"
    if not (folder / name).exists():
        pytest.skip(f"the shared real data ({name}) are not beside the checkout")
    collection = gathered(folder, files=name)
    assert {role: source.variable for role, source in collection.roles.items()} == {
        "temperature": "thetao", "salinity": "so", "dic": "dissic", "alkalinity": "talk", "phosphate": "po4",
    }
    assert dict(collection.sizes) == {"depth": 15, "lat": 64, "lon": 128}
    ds = open_collection(collection)
    assert "rhoConst=1035" in ds.attrs["source"]
    assert set(ds.coords) == {"depth", "lat", "lon", "depth_bnds", "deptho"}
    assert collection.measures == {"sea_floor_depth": "deptho"}
    with xr.open_dataset(folder / name, decode_cf=False) as raw:
        for role, source in collection.roles.items():
            np.testing.assert_array_equal(ds[role], raw[source.variable])
    assert int((ds.dic < 1e10).sum()) == 55_673
    with pytest.raises(InputError, match="'si_surface' has no levels"):
        gathered(folder, files=name, silicate="si_surface")


@pytest.mark.real
def test_a_real_climatology_lacks_carbon(gathered) -> None:
    folder = Path(__file__).parents[4] / "shared" / "data"
    if not (folder / "levitus_annual_4deg.nc").exists():
        pytest.skip("the shared real data are not beside the checkout")
    with pytest.raises(InputError, match="known as dic or alkalinity"):
        gathered(folder, files="levitus_annual_4deg.nc")
