"""Levels that are only numbered, with the depth of every cell beside them."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from gridcarb.axes import find_axes


@pytest.mark.parametrize(("attrs", "found"), [
    ({"axis": "Z"}, "deep"),
    ({"axis": "Z", "units": "level"}, "deep"),
    ({"long_name": "number of the level", "units": "1"}, "deep"),
    ({"units": "m", "positive": "down"}, "lev"),
    ({"units": "1", "standard_name": "ocean_sigma_coordinate"}, "lev"),
])
def test_a_depth_of_every_cell_goes_before_numbers_of_levels(attrs: dict[str, str], found: str) -> None:
    says = {"standard_name": "sea_water_temperature", "units": "degC", "coordinates": "deep lat lon"}
    ds = xr.Dataset({"t": (("lev", "y", "x"), np.zeros((3, 2, 4)), says)}, coords={
        "lev": ("lev", np.arange(3.0), attrs),
        "deep": (("lev", "y", "x"), np.zeros((3, 2, 4)), {"standard_name": "depth", "units": "m", "positive": "down"}),
        "lat": (("y", "x"), np.zeros((2, 4)), {"units": "degrees_north"}),
        "lon": (("y", "x"), np.zeros((2, 4)), {"units": "degrees_east"}),
    })
    axes = find_axes(ds)
    assert (axes.vertical, axes.vertical_coordinate, axes.horizontal) == ("lev", found, ("y", "x"))


def test_numbered_levels_stay_where_nothing_else_tells_a_depth() -> None:
    ds = xr.Dataset({"t": ("lev", np.zeros(3))}, coords={"lev": ("lev", np.arange(3.0), {"axis": "Z"})})
    assert find_axes(ds).vertical_coordinate == "lev"
