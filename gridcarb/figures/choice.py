"""What a figure shows of a dataset: one field, one level, one time step."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import xarray as xr

from gridcarb.axes import Axes, find_axes
from gridcarb.fields import FIELDS
from gridcarb.figures.levels import Level, choose_level
from gridcarb.figures.moments import Moment, choose_moment


@dataclass(frozen=True)
class Choice:
    """A field by its key, the axes of the dataset, and where on them."""

    key: str
    axes: Axes
    level: Level
    moment: Moment

    def slice_of(self, ds: xr.Dataset) -> xr.DataArray:
        """The horizontal slice at one level, dims as `axes.horizontal`; lazy if `ds` is."""
        variable = ds[self.key]
        places = {self.axes.vertical: self.level.index, self.axes.time: self.moment.index}
        variable = variable.isel({dim: at for dim, at in places.items() if dim in variable.dims and at is not None})
        left_over = [dim for dim in variable.dims if dim not in self.axes.horizontal]
        return variable.squeeze(left_over).transpose(*self.axes.horizontal)

    def columns_of(self, ds: xr.Dataset, name: str) -> xr.DataArray:
        """A variable at the moment, with all its levels, dims as (vertical, *`axes.horizontal`); lazy if `ds` is."""
        variable = ds[name].reset_coords(drop=True)
        if self.axes.time in variable.dims:
            variable = variable.isel({self.axes.time: self.moment.index or 0})
        wanted = [dim for dim in (self.axes.vertical, *self.axes.horizontal) if dim]
        lacking = {dim: ds.sizes[dim] for dim in wanted if dim not in variable.dims}
        return variable.expand_dims(lacking).transpose(*wanted)

    @property
    def label(self) -> str:
        """Depth and time in words; empty where there is neither."""
        return ", ".join(part for part in (self.level.label, self.moment.label) if part)


def choose(ds: xr.Dataset, key: str, depth: float, time: str | int, fields: Collection[str] = ()) -> Choice:
    """The level nearest to `depth` (m) and the step `time`; a field without such a dimension needs none.

    `ds` may be a header without the field; `fields` are what will be beside it. Raises UnknownWordError or InputError for
    what is not there.
    """
    extent = FIELDS[key].extent
    axes = find_axes(ds)
    dims = ds[key].dims if key in ds else (axes.time, axes.vertical)
    flat = extent != "cell" or (axes.vertical is not None and axes.vertical not in dims)
    timeless = axes.time is not None and axes.time not in dims
    level = Level() if flat else choose_level(ds, axes, depth, {*fields, *map(str, ds.data_vars)})
    return Choice(key, axes, level, Moment() if timeless else choose_moment(ds, axes, time))
