"""The xarray face of the chemistry: clothed inputs in, solved fields with their attributes out."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.chemistry.constants_set import CONSTANTS
from gridcarb.chemistry.program import Precision
from gridcarb.chemistry.tile import solve_arrays
from gridcarb.fields import FIELDS, ROLES

_ARGUMENTS = {**{role: role for role in ROLES}, "sea_pressure": "pressure"}
"""What a clothed block calls it -> what `speciate` calls it: blocks may have an axis named pressure."""


def solve(
    clothed: xr.Dataset, fields: Sequence[str], constants: str, precision: Precision = "float64"
) -> xr.Dataset:
    """Solve the carbonate system of a block once, for all fields wanted.

    Parameters
    ----------
    clothed : temperature (in situ, degC), salinity (practical), sea_pressure (dbar), dic, alkalinity, phosphate, silicate
        (umol/kg), broadcasting by dimension name; in memory. Dimensions come out in the order of the alkalinity.
    fields : catalogue keys: derived fields, "solution_status", or inputs (passed through as they were understood).
    constants : key of a set of constants.
    precision : of the results; all is computed in double precision and rounded once.

    Returns
    -------
    One variable a field (of that precision; the status int8) with the attributes of the catalogue, on the coordinates of
    the input.

    Raises
    ------
    UnknownWordError : an unknown field or set.
    """
    wanted = [FIELDS[key] for key in fields]
    order = _dimension_order(clothed)
    arrays = {name: _aligned(clothed.variables[name], order) for name in _ARGUMENTS}
    state = {argument: arrays[name] for name, argument in _ARGUMENTS.items()}
    computed = tuple(field.key for field in wanted if field.part != "input")
    results = solve_arrays(state, computed, constants, precision) if computed else {}
    shape = np.broadcast_shapes(*(array.shape for array in arrays.values()))
    solved = {}
    for field in wanted:
        given = field.part == "input"
        data = np.broadcast_to(arrays[field.key], shape).astype(precision) if given else results[field.key]
        solved[field.key] = xr.Variable(order, data, {**field.attributes(), **_provenance(field.part, constants)})
    return xr.Dataset(solved, coords=clothed.coords)


def _dimension_order(clothed: xr.Dataset) -> tuple[str, ...]:
    """The dimensions of the variable that has most of them, which the harmonised inputs keep in canonical order."""
    widest = max((clothed.variables[name] for name in _ARGUMENTS), key=lambda value: value.ndim)
    return tuple(str(dim) for dim in widest.dims)


def _aligned(variable: xr.Variable, order: tuple[str, ...]) -> npt.NDArray[np.float64]:
    """The numbers with one axis for each dimension of `order`, of length 1 where they do not vary; a scalar as it is."""
    if not variable.ndim:
        return np.asarray(variable.values)
    return np.asarray(variable.set_dims(order).values)  # type: ignore[no-untyped-call]


def _provenance(part: str, constants: str) -> dict[str, str]:
    return {"constants": CONSTANTS[constants].key} if part == "derived" else {}
