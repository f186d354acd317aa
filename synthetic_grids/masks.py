"""How files say that there is no water: fill values of every sort, and values that are packed.

Each function takes the variable of a tracer as `clothes.dress` made it (float64, 1e20 where there is no water) and a
mask of the missing cells, and gives it in other clothes. Nothing but what is said changes.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from synthetic_grids.clothes import FILL, MODEL_NAMES
from synthetic_grids.scene import Scene, tracers

Mask = NDArray[np.bool_]
Clothing = Callable[[xr.Variable, Mask], xr.Variable]

DEFAULT_FILL = 9.969209968386869e36
"""What the NetCDF library writes into floats that were never set."""

PACKING = {
    "temperature": (0.001, 15.0), "salinity": (0.001, 25.0), "dic": (0.05, 1500.0), "alkalinity": (0.05, 1500.0),
    "phosphate": (0.0001, 2.0), "silicate": (0.01, 100.0),
}
"""Scale and offset of 16-bit integers by tracer: the truth comes back within half a scale."""


def _refilled(variable: xr.Variable, missing: Mask, fill: float, attributes: dict[str, object]) -> xr.Variable:
    kept = {key: value for key, value in variable.attrs.items() if key not in ("_FillValue", "missing_value")}
    return xr.Variable(variable.dims, np.where(missing, fill, variable.values), kept | attributes)


def nan(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """NaN, and _FillValue says so."""
    return _refilled(variable, missing, np.nan, {"_FillValue": np.float64(np.nan)})


def silent_nan(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """NaN without any attribute."""
    return _refilled(variable, missing, np.nan, {})


def minus_999(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """-999, and only missing_value says so."""
    return _refilled(variable, missing, -999.0, {"missing_value": np.float64(-999.0)})


def silent_minus_999(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """-999 without any attribute."""
    return _refilled(variable, missing, -999.0, {})


def zero(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """0 without any attribute, as raw model output has it."""
    return _refilled(variable, missing, 0.0, {})


def silent_1e20(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """1e20 without any attribute."""
    return _refilled(variable, missing, FILL, {})


def library_default(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """The default fill value of the NetCDF library, 9.97e36, without any attribute."""
    return _refilled(variable, missing, DEFAULT_FILL, {})


def of_other_precision(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """Doubles filled with the float32 nearest to 1e20, while the attributes have the double 1e20."""
    both: dict[str, object] = {"_FillValue": np.float64(FILL), "missing_value": np.float64(FILL)}
    return _refilled(variable, missing, float(np.float32(FILL)), both)


def two_values(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """_FillValue 1e20 in every other missing cell, missing_value -999 in the rest."""
    odd = (np.arange(missing.size) % 2 == 1).reshape(missing.shape)
    both: dict[str, object] = {"_FillValue": np.float64(FILL), "missing_value": np.float64(-999.0)}
    filled = _refilled(variable, missing, FILL, both)
    filled.values[missing & odd] = -999.0
    return filled


def out_of_range(variable: xr.Variable, missing: Mask) -> xr.Variable:
    """1e6, and only valid_range says that it is nothing."""
    return _refilled(variable, missing, 1e6, {"valid_range": np.array([-10.0, 10000.0])})


def dressed_again(scene: Scene, clothing: Clothing) -> Scene:
    """The scene with all its tracers in other clothes for missing cells."""
    changed = {name: clothing(scene.dataset[name].variable, _missing(scene, name)) for name in tracers(scene.dataset)}
    return scene.with_dataset(scene.dataset.assign(changed))


def _missing(scene: Scene, name: str) -> Mask:
    return np.asarray(scene.dataset[name].values == FILL)


def packed(scene: Scene) -> Scene:
    """16-bit integers by `PACKING`, -32768 where there is no water; lossy."""
    changed = {}
    for key, name in MODEL_NAMES.items():
        scale, offset = PACKING[key]
        missing, variable = _missing(scene, name), scene.dataset[name].variable
        numbers = np.where(missing, -32768, np.round((variable.values - offset) / scale)).astype(np.int16)
        said = {"scale_factor": scale, "add_offset": offset, "_FillValue": np.int16(-32768)}
        kept = {word: value for word, value in variable.attrs.items() if word not in ("_FillValue", "missing_value")}
        changed[name] = xr.Variable(variable.dims, numbers, kept | said)
    return scene.with_dataset(scene.dataset.assign(changed))


def lacking(scene: Scene, key: str, share: float) -> Scene:
    """One tracer missing in a stated share of the cells with water, spread evenly over them; the truth stays whole."""
    name = MODEL_NAMES[key]
    variable = scene.dataset[name].variable.copy(deep=True)
    wet = np.flatnonzero(variable.values != FILL)
    count = round(share * wet.size)
    variable.values.flat[wet[(np.arange(count) * wet.size) // max(count, 1)]] = FILL
    return scene.with_dataset(scene.dataset.assign({name: variable}))


CLOTHINGS: dict[str, Clothing] = {
    "nan": nan, "silent_nan": silent_nan, "minus_999": minus_999, "silent_minus_999": silent_minus_999, "zero": zero,
    "silent_1e20": silent_1e20, "library_default": library_default, "of_other_precision": of_other_precision,
    "two_values": two_values, "out_of_range": out_of_range,
}
"""Ways to say that there is no water, by name."""
