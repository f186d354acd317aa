"""The lazy face: the same work on a dataset in memory or behind dask, for notebooks and scripts."""

from __future__ import annotations

import warnings
from collections.abc import Mapping, Sequence

import dask.array as da
import xarray as xr

from gridcarb.chemistry import CONSTANTS
from gridcarb.chemistry.stage import solve
from gridcarb.errors import NoticeWarning
from gridcarb.fields import FIELDS
from gridcarb.harmonise import Understanding, clothe, understand
from gridcarb.recipe import check_reading
from gridcarb.sources import find_roles
from gridcarb.write.attributes import field_attributes

_POINTERS = ("coordinates", "bounds", "climatology", "formula_terms")
"""CF attributes that name the variables which describe a grid."""


def derive(
    dataset: xr.Dataset,
    fields: Sequence[str] | str | None = None,
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
    fields : catalogue keys, or one of them; None for every derived field. Inputs ("temperature", "sea_pressure", ...) may
        be asked for and come as they were understood; "solution_status" tells what became of each cell.
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
    NoticeWarning : for every decision taken for the user; all are kept in ``attrs["notices"]``, one a line.

    Raises
    ------
    GridcarbError : for what cannot be read safely, before anything is computed.
    """
    keys = _keys(fields)
    CONSTANTS[constants]  # an unknown word is refused before anything is read
    roles = find_roles(dataset, names)
    raw = _by_role(dataset, roles)
    understanding = understand(raw, check_reading(reading or {}))
    for notice in understanding.notices:
        stated = f" (to state it: {notice.state})" if notice.state else ""
        warnings.warn(f"{notice.text}{stated}", NoticeWarning, stacklevel=2)
    if any(raw[role].chunks for role in roles):
        raw = raw.unify_chunks()
        work = {"understanding": understanding, "keys": keys, "constants": constants}
        template = _template(raw, understanding, keys, constants)
        result = xr.map_blocks(_clothe_and_solve, raw, kwargs=work, template=template)
    else:
        result = _clothe_and_solve(raw.load(), understanding, keys, constants)
    status = next((key for key in keys if FIELDS[key].part == "status"), None)
    for key in keys:
        result[key].attrs |= field_attributes(FIELDS[key], (), {}, {}, status)
    return result.assign_attrs(_attributes(understanding, constants))


def _keys(fields: Sequence[str] | str | None) -> list[str]:
    if fields is None:
        return [key for key, entry in FIELDS.items() if entry.part == "derived"]
    return [FIELDS[key].key for key in dict.fromkeys((fields,) if isinstance(fields, str) else fields)]


def _by_role(dataset: xr.Dataset, roles: Mapping[str, str]) -> xr.Dataset:
    """The variables under the names of their roles; what describes their grid (positions, depths, bounds) as coordinates.

    In undecoded data such variables are coordinates only by the attributes that point at them.
    """
    names = list(roles.values())
    found = dict.fromkeys([*names, *(str(name) for name in dataset[names].coords)])
    unseen = list(found)
    while unseen:
        variable = dataset[unseen.pop()]
        said = variable.encoding | variable.attrs
        words = " ".join(str(said.get(key, "")) for key in _POINTERS).split()
        fresh = [word for word in dict.fromkeys(words) if word in dataset.variables and word not in found]
        found |= dict.fromkeys(fresh)
        unseen += fresh
    grid = [name for name in found if name not in names]
    raw = dataset[list(found)].set_coords(grid).rename({name: role for role, name in roles.items()})
    dims = {dim for role in roles for dim in raw[role].dims}
    return raw.assign_coords({name: raw[name].load() for name in grid if not dims.issuperset(raw[name].dims)})


def _clothe_and_solve(raw: xr.Dataset, understanding: Understanding, keys: Sequence[str], constants: str) -> xr.Dataset:
    return solve(clothe(raw, understanding), keys, constants)


def _template(raw: xr.Dataset, understanding: Understanding, keys: Sequence[str], constants: str) -> xr.Dataset:
    """The result as it will be, without numbers: dims, types and attributes are those of its first cell."""
    first = raw.isel({dim: slice(0, 1) for dim in understanding.axes.order if dim in raw.dims}).load()
    model = _clothe_and_solve(first, understanding, keys, constants)
    chunks = raw.chunksizes
    fields = {}
    for key, cell in model.data_vars.items():
        shape = tuple(raw.sizes[dim] for dim in cell.dims)
        pieces = tuple(chunks.get(dim, (raw.sizes[dim],)) for dim in cell.dims)
        fields[key] = (cell.dims, da.empty(shape, chunks=pieces, dtype=cell.dtype), cell.attrs)
    return xr.Dataset(fields, coords=raw.coords)


def _attributes(understanding: Understanding, constants: str) -> dict[str, object]:
    return {
        "constants": constants,
        "understood": "\n".join(str(decision) for decision in understanding.decisions),
        "notices": "\n".join(notice.text for notice in understanding.notices),
    }
