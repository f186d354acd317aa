"""The array face: numbers or arrays in, a dict of arrays out, tile by tile."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from gridcarb.chemistry.compiled import TILE
from gridcarb.chemistry.constants_set import CONSTANTS
from gridcarb.chemistry.declare import DERIVED
from gridcarb.chemistry.program import INPUTS, Program, program
from gridcarb.chemistry.solver import SWEPT
from gridcarb.chemistry.status import MISSING, SOLUTION_STATUS, judge, seal
from gridcarb.errors import InputError, UnknownWordError, did_you_mean

Array = npt.NDArray[np.float64]

_TO_CANONICAL = (1.0, 1.0, 0.1, 1e-6, 1e-6, 1e-6, 1e-6)
_FEW = 0.85
_PADDING = (15.0, 35.0, 0.0, 2.1e-3, 2.3e-3, 0.0, 0.0)


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
    keys = tuple(DERIVED) if fields is None else _checked(fields)
    given = _broadcast(
        temperature=temperature, salinity=salinity, pressure=pressure, dic=dic, alkalinity=alkalinity,
        phosphate=phosphate, silicate=silicate,
    )  # fmt: skip
    shape = np.broadcast_shapes(*(array.shape for array in given))
    wanted = tuple(key for key in keys if key != SOLUTION_STATUS.key)
    made = program(constants, wanted)
    ranges = (*CONSTANTS[constants].temperature_range, *CONSTANTS[constants].salinity_range)
    size = int(np.prod(shape))
    results = {key: np.full(size, np.nan) for key in wanted}
    status = np.full(size, MISSING, dtype=np.int8)
    _solve_all([_flat(array, shape) for array in given], made, ranges, results, status)
    every: dict[str, npt.NDArray[np.generic]] = {**results, SOLUTION_STATUS.key: status}
    return {key: every[key].reshape(shape) for key in keys}


def _checked(fields: Sequence[str]) -> tuple[str, ...]:
    keys = (fields,) if isinstance(fields, str) else tuple(fields)
    known = (*DERIVED, SOLUTION_STATUS.key)
    for key in keys:
        if key not in known:
            raise UnknownWordError(f"there is no field '{key}'", mend=did_you_mean(str(key), known))
    return tuple(dict.fromkeys(keys))


def _broadcast(**inputs: npt.ArrayLike) -> list[npt.NDArray[np.floating]]:
    arrays: dict[str, npt.NDArray[np.floating]] = {}
    for name, value in inputs.items():
        array = np.asarray(_unmasked(value) if isinstance(value, np.ma.MaskedArray) else value)
        if array.dtype.kind not in "fiu":
            raise InputError(f"{name} is not made of real numbers (dtype {array.dtype})", where=f"speciate: {name}")
        arrays[name] = array if array.dtype in (np.float64, np.float32) else array.astype(np.float64)
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


def _flat(array: npt.NDArray[np.floating], shape: tuple[int, ...]) -> npt.NDArray[np.floating]:
    """The array as one line of cells; a single number stays a single number."""
    if array.size == 1:
        return array.reshape(1)
    return np.ascontiguousarray(np.broadcast_to(array, shape)).reshape(-1)


def _solve_all(
    inputs: list[npt.NDArray[np.floating]],
    made: Program,
    ranges: tuple[float, ...],
    results: dict[str, Array],
    status: npt.NDArray[np.int8],
) -> None:
    """Fill results and status tile by tile. The last tile is padded with ordinary water up to the full length, so that
    every cell of every grid goes through the same instructions."""
    scratch = np.empty((made.rows, TILE))
    flags = np.empty(TILE, dtype=np.int8)
    bound = made.bind(scratch)
    outputs = list(made.outputs.values())
    wet = _wet(inputs, status.size)
    total = status.size if wet is None else wet.size
    for start in range(0, total, TILE):
        count = min(TILE, total - start)
        here = slice(start, start + count) if wet is None else wet[start : start + count]
        for row, (array, factor) in enumerate(zip(inputs, _TO_CANONICAL, strict=True)):
            values = array if array.size == 1 else array[here]
            np.multiply(values, factor, out=scratch[row, :count], dtype=np.float64)
            scratch[row, count:] = _PADDING[row]
        judge(flags, *scratch[: len(INPUTS)], *ranges)
        bound.run()
        worst = seal(flags, scratch[made.hydrogen], scratch[made.step], SWEPT)
        if worst >= MISSING:
            scratch[outputs] = np.where(flags >= MISSING, np.nan, scratch[outputs])
        for key, row in made.outputs.items():
            results[key][here] = scratch[row, :count]
        status[here] = flags[:count]


def _wet(inputs: list[npt.NDArray[np.floating]], size: int) -> npt.NDArray[np.intp] | None:
    """The places of the cells that miss no input; None where there are so many that picking them out would cost more
    than solving the rest with them. Land and sea floor are often half of a grid."""
    missing = np.zeros(size, dtype=bool)
    for array in inputs:
        if array.size > 1:
            missing |= np.isnan(array)
    wet = np.flatnonzero(~missing)
    return wet if wet.size < _FEW * size else None
