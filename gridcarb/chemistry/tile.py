"""The array face: numbers or arrays in, a dict of arrays out, tile by tile."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.chemistry.compiled import TILE
from gridcarb.chemistry.constants_set import CONSTANTS
from gridcarb.chemistry.declare import DERIVED
from gridcarb.chemistry.program import Precision, program
from gridcarb.chemistry.status import MISSING, SOLUTION_STATUS, Flags
from gridcarb.errors import InputError, UnknownWordError, did_you_mean

Array = npt.NDArray[np.float64]

_INPUTS = ("temperature", "salinity", "pressure", "dic", "alkalinity", "phosphate", "silicate")
"""In the order in which compiled code takes them."""

_SCARCE = slice(3, 5)
_FEW = 0.85
_NO_PLACES = np.empty(0, dtype=np.intp)


def speciate(
    *,
    temperature: npt.ArrayLike,
    salinity: npt.ArrayLike,
    pressure: npt.ArrayLike = 0,
    dic: npt.ArrayLike,
    alkalinity: npt.ArrayLike,
    phosphate: npt.ArrayLike = 0,
    silicate: npt.ArrayLike = 0,
    fields: Sequence[str] | None = None,
    constants: str = "guide2007",
) -> dict[str, npt.NDArray[np.generic]]:
    """Compute the marine carbonate system of every cell from DIC and total alkalinity.

    Parameters
    ----------
    temperature : in situ, degC, ITS-90.
    salinity : practical salinity.
    pressure : sea pressure, dbar (absolute pressure minus one atmosphere).
    dic, alkalinity, phosphate, silicate : umol per kg of seawater; alkalinity after Dickson (1981).
    fields : keys of the catalogue (``gridcarb fields`` lists them); None for every derived field. "solution_status"
        adds the status of each cell (int8: 0 solved, 1 solved outside the range of the constants, 2 missing input,
        3 unphysical input, 4 not solved).
    constants : key of a set of constants.

    All inputs broadcast against each other. Masked arrays count as NaN where masked.

    Returns
    -------
    Field key -> float64 array of the broadcast shape. NaN where the input is missing (NaN) or unphysical: DIC <= 0,
    S < 0 or > 300, negative nutrients, T outside -2.5..45 degC, pressure outside 0..15000 dbar, infinities. Zero or
    negative alkalinity, S = 0, and DIC above alkalinity are solved like any other water.

    Raises
    ------
    UnknownWordError : an unknown field or set, with the nearest known words.
    InputError : inputs that are not numbers or do not broadcast.
    """
    given = {
        "temperature": temperature, "salinity": salinity, "pressure": pressure, "dic": dic, "alkalinity": alkalinity,
        "phosphate": phosphate, "silicate": silicate,
    }  # fmt: skip
    return solve_arrays(given, tuple(DERIVED) if fields is None else _checked(fields), constants, "float64")


def solve_arrays(
    given: Mapping[str, npt.ArrayLike], keys: tuple[str, ...], constants: str, precision: Precision
) -> dict[str, npt.NDArray[np.generic]]:
    """As `speciate`, for all of its inputs by name and known keys; results are rounded to `precision` at the very end."""
    arrays = _broadcast(given)
    shape = np.broadcast_shapes(*(array.shape for array in arrays))
    wanted = tuple(key for key in keys if key != SOLUTION_STATUS.key)
    lines = [_flat(array, shape) for array in arrays]
    results, status = _solve(lines, int(np.prod(shape)), wanted, constants, precision)
    every: dict[str, npt.NDArray[np.generic]] = dict(zip(wanted, results, strict=True))
    every[SOLUTION_STATUS.key] = status
    return {key: every[key].reshape(shape) for key in keys}


def _checked(fields: Sequence[str]) -> tuple[str, ...]:
    keys = (fields,) if isinstance(fields, str) else tuple(fields)
    known = (*DERIVED, SOLUTION_STATUS.key)
    for key in keys:
        if key not in known:
            raise UnknownWordError(f"there is no field '{key}'", mend=did_you_mean(str(key), known))
    return tuple(dict.fromkeys(keys))


def _broadcast(inputs: Mapping[str, npt.ArrayLike]) -> list[npt.NDArray[np.generic]]:
    arrays: dict[str, npt.NDArray[np.generic]] = {}
    for name in _INPUTS:
        value = inputs[name]
        array = np.asarray(_unmasked(value) if isinstance(value, np.ma.MaskedArray) else value)
        if array.dtype.kind not in "fiu":
            raise InputError(f"{name} is not made of real numbers (dtype {array.dtype})", where=f"speciate: {name}")
        arrays[name] = array
    try:
        np.broadcast_shapes(*(array.shape for array in arrays.values()))
    except ValueError:
        shapes = ", ".join(f"{name} {array.shape}" for name, array in arrays.items() if array.shape)
        raise InputError(
            f"the inputs do not broadcast: {shapes}", where="speciate",
            mend="give arrays of one shape, or of length 1 where a value is shared",
        ) from None
    return list(arrays.values())


def _unmasked(value: np.ma.MaskedArray[Any, Any]) -> Array:
    filled: Array = np.ma.filled(value.astype(np.float64), np.nan)
    return filled


def _flat(array: npt.NDArray[np.generic], shape: tuple[int, ...]) -> Array:
    """The array as one line of float64 cells; a single number stays a single number. A copy only where it must be one:
    compiled code takes lines that are contiguous and, though it leaves them alone, writeable."""
    if array.size == 1:
        return array.reshape(1).astype(np.float64)
    whole = array if array.shape == shape else np.broadcast_to(array, shape)
    line = np.ascontiguousarray(whole, dtype=np.float64).reshape(-1)
    return line if line.flags.writeable else line.copy()


def _solve(
    inputs: list[Array], size: int, fields: tuple[str, ...], constants: str, precision: Precision
) -> tuple[npt.NDArray[np.generic], Flags]:
    """Results (fields x cells) and status of all cells."""
    made, solve_cells = program(constants, fields, precision)
    chosen = CONSTANTS[constants]
    wet = _wet(inputs, size)
    results = np.empty((len(fields), size), dtype=precision)
    status = np.full(size, MISSING, dtype=np.int8)
    if wet is not None and not wet.size:
        results[...] = np.nan
        return results, status
    solve_cells(
        tuple(inputs), results, status, _NO_PLACES if wet is None else wet, wet is None, np.empty((made.rows, TILE)),
        np.empty(TILE, dtype=np.int8), np.array(made.outputs, dtype=np.intp),
        (*chosen.temperature_range, *chosen.salinity_range),
    )  # fmt: skip
    return results, status


def _wet(inputs: list[Array], size: int) -> npt.NDArray[np.intp] | None:
    """The places of the cells to solve: land and sea floor, often half of a grid, are left out. None where there are so
    many that picking them out would cost more than solving the rest with them.

    Land misses everything, and what else is not known mostly DIC or alkalinity: only these are looked at. A cell that
    misses another input is found out when it is judged.
    """
    missing = np.zeros(size, dtype=bool)
    for array in (line for line in inputs[_SCARCE] if line.size > 1):
        missing |= np.isnan(array)
    return np.flatnonzero(~missing) if np.count_nonzero(missing) > (1.0 - _FEW) * size else None
