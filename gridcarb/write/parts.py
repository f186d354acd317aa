"""What goes into each NetCDF file of a result, where it is not all in one: one field, or the steps of one period."""

from __future__ import annotations

import itertools
import warnings
from collections.abc import Collection
from dataclasses import dataclass

import cftime
import xarray as xr

from gridcarb.errors import OutputError
from gridcarb.write.coordinates import plain_numbers
from gridcarb.write.settings import Files


@dataclass(frozen=True)
class Part:
    """A file by the name it gets, without its ending; what is None is all of it."""

    name: str
    fields: tuple[str, ...] | None = None
    steps: slice | None = None


def parts_of(source: xr.Dataset, fields: Collection[str], time: str | None, files: Files) -> list[Part]:
    """The files a store is exported to.

    Parameters
    ----------
    source : the store, undecoded. fields : its fields. time : its dimension of time.

    A field takes along what its `ancillary_variables` name, such as its status, which gets no file of its own. A period
    is a stretch of steps that follow one another; without a time, all is one file.

    Raises
    ------
    OutputError : times that cannot be dated, or that come back to a period they have left.
    """
    if files == "by field":
        beside = {name: str(source[name].attrs.get("ancillary_variables", "")).split() for name in fields}
        aside = set(itertools.chain.from_iterable(beside.values()))
        return [Part(name, (name, *beside[name])) for name in sorted(fields) if name not in aside]
    if files == "one" or time is None:
        return [Part("fields")]
    stretches = [(label, list(steps)) for label, steps in itertools.groupby(
        enumerate(_labels(source, time, months=files == "by month")), key=lambda step: step[1])]  # fmt: skip
    if len({label for label, _ in stretches}) < len(stretches):
        raise _undated("the times come back to a period they have left")
    return [Part(f"fields_{label}", steps=slice(steps[0][0], steps[-1][0] + 1)) for label, steps in stretches]


def _labels(source: xr.Dataset, time: str, *, months: bool) -> list[str]:
    """The period of each step."""
    dated = (variable for variable in source.variables.values() if variable.dims == (time,) and (
        variable.attrs.get("axis") == "T" or " since " in str(variable.attrs.get("units"))))  # fmt: skip
    steps = next(dated, None)
    if steps is None:
        raise _undated("no coordinate tells when the steps are")
    units, calendar = str(steps.attrs.get("units", "")), str(steps.attrs.get("calendar", "standard")).lower()
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # year zero, a base date before the Gregorian reform: still a date
            dates = cftime.num2date(plain_numbers(steps), units, calendar)
    except (ValueError, OverflowError) as error:
        raise _undated(f"the times cannot be dated ({error})") from None
    return [f"{date.year:04d}-{date.month:02d}" if months else f"{date.year:04d}" for date in dates]


def _undated(what: str) -> OutputError:
    return OutputError(what, where="output.netcdf_files", mend="write `netcdf_files: one` under `output` in the recipe")
