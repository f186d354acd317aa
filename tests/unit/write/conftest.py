"""A small invented grid with bounds, a scalar depth label and two fields, for every test of writing."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import Axes
from gridcarb.fields import Field


def make_template() -> xr.Dataset:
    lat, lon, lev = np.array([-30.0, -10.0, 10.0, 30.0]), np.arange(5) * 72.0, np.array([5.0, 50.0, 500.0])
    time = np.arange(6) * 30 + 15
    return xr.Dataset(
        {"temperature": (("time", "lev", "lat", "lon"), np.zeros((6, 3, 4, 5), "f4"),
                         {"cell_methods": "time: mean", "cell_measures": "area: areacello"})},
        coords={
            "time": ("time", time, {"units": "days since 2001-01-01", "calendar": "360_day", "bounds": "time_bnds",
                                    "standard_name": "time"}),
            "time_bnds": (("time", "bnds"), np.stack([time - 15, time + 15], 1).astype("f8"), {"_FillValue": 1e20}),
            "lev": ("lev", lev, {"units": "m", "positive": "down", "standard_name": "depth", "_FillValue": -999.0}),
            "lat": ("lat", lat.astype(">f4"), {"units": "degrees_north", "bounds": "lat_bnds_of_no_file"}),
            "lon": ("lon", lon, {"units": "degrees_east", "standard_name": "longitude", "valid_range": [0.0, 360.0]}),
            "basin": (("lat", "lon"), np.where(np.arange(20).reshape(4, 5) > 9, 1e20, 4.0),
                      {"long_name": "basin number", "missing_value": 1e20}),
            "letters": (("lat", "n"), np.array([list("abc"), list("de "), list("f  "), list("ghi")], "S1"),
                        {"long_name": "name of the row"}),
            "run": ((), np.int32(7), {"long_name": "number of the run"}),
        },
        attrs={"institution": "Institute of the Invented Ocean", "history": "2001: made", "source": "an invented model",
               "geography": "invented", "tracking_id": "not ours"},
    )


AXES = Axes("time", "lev", ("lat", "lon"), "time", "lev", "lat", "lon")
PH = Field(key="ph_total_scale", long_name="pH", units="1", standard_name="sea_water_ph_reported_on_total_scale",
           sane_range=(7.0, 9.0), digits=3, citations=("guide2007",), comment="As said.")
DEEP = Field(key="horizon", long_name="depth of a horizon", units="m", sane_range=(0.0, 9000.0), digits=0, extent="column")
STATUS = Field(key="solution_status", long_name="status", units="1", part="status", sane_range=(0, 2), digits=0,
               standard_name="status_flag", flags=((0, "solved"), (1, "outside_validity"), (2, "missing_input")))
CHUNKS = {"time": 2, "lat": 2, "lon": 5}


def make_result(template: xr.Dataset) -> xr.Dataset:
    ph = 8 + 0.3 * np.sin(np.arange(360.0)).reshape(6, 3, 4, 5) + 1e-9
    ph[:, 2, 0] = np.nan
    status = np.where(np.isnan(ph), 2, 0).astype("int8")
    dims = ("time", "lev", "lat", "lon")
    return xr.Dataset({"ph_total_scale": (dims, ph), "solution_status": (dims, status),
                       "horizon": (("time", "lat", "lon"), ph[:, 1] * 100)})


@pytest.fixture
def grid() -> SimpleNamespace:
    template = make_template()
    regions = [
        {"time": slice(t, t + 2), "lat": slice(y, y + 2), "lon": slice(0, 5)} for t in (0, 2, 4) for y in (0, 2)
    ]
    return SimpleNamespace(template=template, axes=AXES, fields=(PH, DEEP, STATUS), chunks=CHUNKS, ph=PH, horizon=DEEP,
                           status=STATUS, regions=regions, result=make_result(template))


@pytest.fixture
def fill_store(grid):
    """A function that makes a store and writes every block of it."""
    from gridcarb.write import store

    def fill(path, **options):
        store.create(path, template=grid.template, fields=grid.fields, axes=grid.axes, chunks=grid.chunks,
                     attributes={"title": "t", "number": np.float32(2.5)}, **options)
        return [store.write_block(path, region, grid.result.isel(region)) for region in grid.regions]

    return fill
