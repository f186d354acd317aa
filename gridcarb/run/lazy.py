"""The lazy face: the same work on a dataset in memory or behind dask, for notebooks and scripts."""

from __future__ import annotations

import warnings
from collections.abc import Mapping, Sequence

import dask.array as da
import xarray as xr

from gridcarb.chemistry.stage import solve
from gridcarb.errors import NoticeWarning
from gridcarb.fields import FIELDS
from gridcarb.harmonise import Understanding, clothe, understand
from gridcarb.recipe import check_reading
from gridcarb.sources import find_roles


def derive(
    dataset: xr.Dataset,
    fields: Sequence[str] | None = None,
    *,
    constants: str = "guide2007",
    names: Mapping[str, str] | None = None,
    reading: Mapping[str, object] | None = None,
) -> xr.Dataset:
    """Derive carbonate fields from a dataset of temperature, salinity, DIC and alkalinity in CF clothes.

    Parameters
    ----------
    dataset : variables found by standard_name, then by the names usual in the trade, or told by `names`; any units and
        kinds of temperature and salinity that gridcarb reads; coordinates with CF attributes. Not modified.
    fields : catalogue keys; None for every derived field. Inputs ("temperature", "pressure", ...) may be asked for and
        come as they were understood; "solution_status" tells what became of each cell.
    constants : key of a set of constants.
    names : role -> variable name, for roles that cannot be found (temperature, salinity, dic, alkalinity, phosphate,
        silicate).
    reading : what the files do not say, with the words of a recipe's `reading` section, such as
        ``{"temperature": "potential", "density": "1026 kg m-3", "silicate": "assume zero"}``.

    Returns
    -------
    A dataset of the fields (float64) on the same coordinates, dimensions in the order time, vertical, horizontal,
    attributes from the catalogue. Lazy where the input is chunked: one task a chunk computes all fields at once.

    Warns
    -----
    NoticeWarning : for every decision taken for the user; all are kept in ``attrs["notices"]``.

    Raises
    ------
    GridcarbError : for what cannot be read safely, before anything is computed.
    """
    keys = [key for key, entry in FIELDS.items() if entry.part == "derived"] if fields is None else list(fields)
    for key in keys:
        FIELDS[key]
    roles = find_roles(dataset, names)
    raw = dataset[list(roles.values())].rename({name: role for role, name in roles.items()})
    understanding = understand(raw, check_reading(reading or {}))
    for notice in understanding.notices:
        stated = f" (to state it: {notice.state})" if notice.state else ""
        warnings.warn(f"{notice.text}{stated}", NoticeWarning, stacklevel=2)
    if any(raw[role].chunks for role in roles):
        work = {"understanding": understanding, "keys": keys, "constants": constants}
        template = _template(raw, understanding, keys, constants)
        result = xr.map_blocks(_clothe_and_solve, raw, kwargs=work, template=template)
    else:
        result = _clothe_and_solve(raw.load(), understanding, keys, constants)
    return result.assign_attrs(_attributes(understanding, constants))


def _clothe_and_solve(raw: xr.Dataset, understanding: Understanding, keys: Sequence[str], constants: str) -> xr.Dataset:
    return solve(clothe(raw, understanding), keys, constants)


def _template(raw: xr.Dataset, understanding: Understanding, keys: Sequence[str], constants: str) -> xr.Dataset:
    """The result as it will be, without numbers: dims, types and attributes are those of its first cell."""
    first = raw.isel(dict.fromkeys(raw.dims, slice(0, 1))).load()
    model = _clothe_and_solve(first, understanding, keys, constants)
    chunks = raw.unify_chunks().chunksizes
    fields = {}
    for key, cell in model.data_vars.items():
        shape = tuple(raw.sizes[dim] for dim in cell.dims)
        pieces = tuple(chunks.get(dim, (raw.sizes[dim],)) for dim in cell.dims)
        fields[key] = (cell.dims, da.empty(shape, chunks=pieces, dtype=cell.dtype), cell.attrs)
    return xr.Dataset(fields, coords=raw.coords)


def _attributes(understanding: Understanding, constants: str) -> dict[str, object]:
    return {
        "constants": constants,
        "understood": [str(decision) for decision in understanding.decisions],
        "notices": [notice.text for notice in understanding.notices],
    }
