"""Missing values: recognised by attributes, by the defaults of the file format, and by physics; packed numbers unpacked.

Rules, in the order they are applied to a value (the first that fits counts it): `nan`, `fill_value`, `missing_value`,
`default_fill` (the NetCDF default of the type, declared or not), `usual_fill` (-999, -9999), `valid_range`,
`beyond_physics` (1e15 and more in size); and for a whole cell `land`: salinity <= 0 together with alkalinity <= 0.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from gridcarb.errors import InputError
from gridcarb.harmonise.sifting import Marks, Numbers, sift

RULES = ("nan", "fill_value", "missing_value", "default_fill", "usual_fill", "valid_range", "beyond_physics", "land")
"""The rules by which a value or a cell is masked, in order."""

DEFAULT_FILLS = {
    "f4": 9.969209968386869e36, "f8": 9.969209968386869e36, "i2": -32767, "i4": -2147483647, "i8": -9223372036854775806,
    "u2": 65535, "u4": 4294967295, "u8": 18446744073709551614,
}
"""NetCDF default fill values by type; bytes have none."""

_RANGE_KEYS = ("valid_range", "valid_min", "valid_max")
_USUAL = np.array([-999.0, -9999.0])
_BEYOND = 1e15

MARKS = {rule: np.uint8(1 << place) for place, rule in enumerate(RULES)}
"""The mark of each rule: one bit of a byte, so that marks of several variables can be laid over each other."""

Flags = npt.NDArray[np.bool_]

_OWN_MARKS = np.array([MARKS[rule] for rule in ("nan", "usual_fill", "valid_range", "beyond_physics")], dtype=np.uint8)


@dataclass(frozen=True)
class MaskReading:
    """How one variable marks missing values, and how it is packed.

    fills : (rule, value) in the packed numbers.
    low, high : valid range, None where open; `range_unpacked` says in which numbers it is given.
    scale, offset : unpacked = packed * scale + offset.
    unsigned : the packed integers are to be taken as unsigned.
    """

    fills: tuple[tuple[str, float], ...] = ()
    low: float | None = None
    high: float | None = None
    range_unpacked: bool = False
    scale: float = 1.0
    offset: float = 0.0
    unsigned: bool = False

    @property
    def packed(self) -> bool:
        """Whether there is anything to unpack."""
        return (self.scale, self.offset) != (1.0, 0.0)


def read_mask(variable: xr.DataArray, where: str) -> MaskReading:
    """The mask and packing of a raw variable, from its type and attributes.

    Raises InputError for attributes that are no numbers, and for text data.
    """
    dtype, attrs = variable.dtype, variable.attrs
    if dtype.kind not in "fiu":
        raise InputError(f"the data are of type {dtype}, not numbers", where=where,
                         mend="name another variable in the recipe")
    fills: dict[float, str] = {}
    for rule, key in (("fill_value", "_FillValue"), ("missing_value", "missing_value")):
        for value in _numbers(attrs, key, where):
            fills.setdefault(value, rule)
    code = f"{dtype.kind}{dtype.itemsize}"
    if code in DEFAULT_FILLS and (dtype.kind == "f" or "_FillValue" not in attrs):
        fills.setdefault(DEFAULT_FILLS[code], "default_fill")
    low, high = _valid_range(attrs, where)
    scale, offset = _one(attrs, "scale_factor", 1.0, where), _one(attrs, "add_offset", 0.0, where)
    whole = not any(np.asarray(attrs[key]).dtype.kind == "f" for key in _RANGE_KEYS if key in attrs)
    if whole and dtype.kind == "f":  # unpacked by the reader before it came here; the range still is in packed numbers
        packing = variable.encoding
        low, high = (
            None if edge is None
            else edge * _one(packing, "scale_factor", 1.0, where) + _one(packing, "add_offset", 0.0, where)
            for edge in (low, high)
        )
    return MaskReading(
        fills=tuple((rule, value) for value, rule in fills.items()), low=low, high=high, range_unpacked=not whole,
        scale=scale, offset=offset, unsigned=dtype.kind == "i" and str(attrs.get("_Unsigned")).lower() == "true",
    )


def unmask(raw: npt.NDArray[Any], reading: MaskReading) -> tuple[Numbers, Marks]:
    """Unpacked float64 numbers, NaN where missing, and for every number the mark of the rule that applied (0: none).

    `raw` is any numeric array.
    """
    if reading.unsigned:
        raw = raw.view(raw.dtype.str.replace("i", "u"))
    line = np.ascontiguousarray(raw, _known_type(raw.dtype)).reshape(-1)
    with np.errstate(over="ignore"):
        numbers = line * np.float64(reading.scale) + reading.offset if reading.packed else np.empty(line.size)
    marks = np.empty(line.size, np.uint8)
    floats = raw.dtype.kind == "f"
    fills, fill_marks = _fills(reading, raw.dtype)
    low, high = -np.inf if reading.low is None else reading.low, np.inf if reading.high is None else reading.high
    usual = _USUAL if floats else _USUAL[:0]
    sift(line, numbers, marks, reading.packed, *_sound(reading, fills), fills, fill_marks, floats, usual, low, high,
         reading.range_unpacked, _BEYOND, _OWN_MARKS)  # fmt: skip
    return numbers.reshape(raw.shape), marks.reshape(raw.shape)


def _known_type(dtype: np.dtype[Any]) -> np.dtype[Any]:
    """A type of this machine's that compiled code knows and that loses nothing."""
    return np.dtype(np.float32) if dtype == np.float16 else dtype.newbyteorder("=")


def _fills(reading: MaskReading, dtype: np.dtype[Any]) -> tuple[Numbers, Marks]:
    """Fill values of packed numbers and their marks. Numbers and fill of a float type are compared rounded to single
    precision: 1e20 is not the same number in single and double precision, and files mix the two."""
    found = np.array([value for _, value in reading.fills], dtype=np.float64)
    if dtype.kind == "f":
        with np.errstate(over="ignore"):
            rounded = found.astype(np.float32).astype(np.float64)
        found = np.where(found != 0, rounded, found)
    elif dtype.kind == "u":
        found = np.where(found < 0, found + 2.0 ** (8 * dtype.itemsize), found)  # signed fill, unsigned numbers
    return found, np.array([MARKS[rule] for rule, _ in reading.fills], dtype=np.uint8)


def _sound(reading: MaskReading, fills: Numbers) -> tuple[float, float]:
    """Between these packed numbers, both left out, no rule applies: most numbers lie there, and are looked at no further.

    It need not be all that is sound; where packed numbers have their range in unpacked ones it is nothing.
    """
    ranged = reading.low is not None or reading.high is not None
    if ranged and reading.range_unpacked and reading.packed:
        return np.inf, -np.inf
    most = (_BEYOND - abs(reading.offset)) / max(1.0, abs(reading.scale))
    floor, ceiling = max(-most, float(_USUAL.max())), most
    if reading.low is not None:
        floor = max(floor, np.nextafter(reading.low, -np.inf))
    if reading.high is not None:
        ceiling = min(ceiling, np.nextafter(reading.high, np.inf))
    for fill in fills[(fills > floor) & (fills < ceiling)]:
        if fill <= 0:
            floor = max(floor, fill * (1 - 1e-6))
        else:
            ceiling = min(ceiling, fill * (1 - 1e-6))
    return float(floor), float(ceiling)


def rules_met(marks: Marks) -> tuple[str, ...]:
    """The rules that applied to any number, in order."""
    every = int(np.bitwise_or.reduce(marks, axis=None))
    return tuple(rule for rule, mark in MARKS.items() if every & mark)


def decoded(raw: xr.Dataset, name: str, readings: Mapping[str, MaskReading]) -> xr.DataArray:
    """A coordinate of loaded data as float64 numbers in the units of the file, NaN where missing, without attributes."""
    variable = raw[name]
    return xr.DataArray(unmask(np.asarray(variable.values), readings[name])[0], dims=variable.dims)


def unmask_roles(
    raw: xr.Dataset, readings: Mapping[str, MaskReading], roles: tuple[str, ...]
) -> tuple[dict[str, xr.DataArray], dict[str, int]]:
    """The roles of a loaded block as float64 numbers in the units of the file, land set to NaN in those that vary with it.

    Returns them with the count for each of `RULES`: of the cells in which it took away the value of any role.
    """
    clean: dict[str, xr.DataArray] = {}
    marked = xr.Variable((), np.uint8(0))
    for role in roles:
        variable = raw[role].variable
        numbers, marks = unmask(np.asarray(variable.values), readings[role])
        clean[role] = xr.DataArray(numbers, dims=variable.dims)
        marked = marked | xr.Variable(variable.dims, marks)
    salt = clean["salinity"] <= 0
    if salt.any() and (land := salt & (clean["alkalinity"] <= 0)).any():
        marked = marked | land.variable.astype(np.uint8) * MARKS["land"]
        clean = {
            role: values.where(~land) if set(land.dims) <= set(values.dims) else values for role, values in clean.items()
        }
    met = rules_met(marked.values)
    return clean, {rule: int(np.count_nonzero(marked.values & MARKS[rule])) if rule in met else 0 for rule in RULES}


def _numbers(attrs: Mapping[Any, Any], key: str, where: str) -> list[float]:
    if key not in attrs or attrs[key] is None:
        return []
    try:
        values = np.atleast_1d(np.asarray(attrs[key])).ravel()
        found = [value.item() if value.dtype.kind in "iu" else float(value) for value in values]
    except (TypeError, ValueError):
        raise InputError(
            f"the attribute {key} = {attrs[key]!r} is not a number", where=where, mend=f"correct {key} in the file"
        ) from None
    return [value for value in found if not np.isnan(value)]


def _one(attrs: Mapping[Any, Any], key: str, default: float, where: str) -> float:
    found = _numbers(attrs, key, where)
    return float(found[0]) if found else default


def _valid_range(attrs: Mapping[Any, Any], where: str) -> tuple[float | None, float | None]:
    pair = _numbers(attrs, "valid_range", where)
    if len(pair) == 2:
        return pair[0], pair[1]
    low, high = _numbers(attrs, "valid_min", where), _numbers(attrs, "valid_max", where)
    return (low[0] if low else None), (high[0] if high else None)
