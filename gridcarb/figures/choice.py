"""What a figure shows of a dataset: one field, one level, one time step."""

from __future__ import annotations

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
        """The horizontal slice, dims as `axes.horizontal`; lazy if `ds` is."""
        variable = ds[self.key]
        places = {self.axes.vertical: self.level.index, self.axes.time: self.moment.index}
        variable = variable.isel({dim: at for dim, at in places.items() if dim in variable.dims and at is not None})
        left_over = [dim for dim in variable.dims if dim not in self.axes.horizontal]
        return variable.squeeze(left_over).transpose(*self.axes.horizontal)

    @property
    def label(self) -> str:
        """Depth and time in words; empty where there is neither."""
        return ", ".join(part for part in (self.level.label, self.moment.label) if part)


def choose(ds: xr.Dataset, key: str, depth: float, time: str | int) -> Choice:
    """The level nearest to `depth` (m) and the step `time`; a field without such a dimension needs none.

    `ds` may be a header without the field. Raises UnknownWordError or InputError for what is not there.
    """
    extent = FIELDS[key].extent
    axes = find_axes(ds)
    dims = ds[key].dims if key in ds else (axes.time, axes.vertical)
    flat = extent != "cell" or (axes.vertical is not None and axes.vertical not in dims)
    timeless = axes.time is not None and axes.time not in dims
    level = Level() if flat else choose_level(ds, axes, depth)
    return Choice(key, axes, level, Moment() if timeless else choose_moment(ds, axes, time))
