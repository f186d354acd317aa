"""NetCDF-4 files from a finished store, streamed chunk by chunk.

A NetCDF file has one writer: it is filled under a temporary name in the folder of its target and renamed when it is
whole. The lock of the HDF5 library is held for each piece written, not while the store is read.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping, Sequence
from contextlib import suppress
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import xarray as xr

from gridcarb.netcdf_lock import NETCDF_LOCK
from gridcarb.write.coverage import coverage_of
from gridcarb.write.disk import room_for, settle
from gridcarb.write.encoding import pieces
from gridcarb.write.parts import Part, parts_of
from gridcarb.write.pointers import pointed_at
from gridcarb.write.settings import Files

_CHUNK_BYTES = 2 * 2**20
_DEFLATE_LEVEL = 4
_TYPED = frozenset({
    "flag_values", "flag_masks", "valid_min", "valid_max", "valid_range", "actual_range", "missing_value", "start_index",
})
"""Attributes which CF wants in the type of their variable; the store keeps them as plain numbers."""


def export(
    store: Path, target: Path, *, attributes: Mapping[str, object] | None = None,
    progress: Callable[[int, int], None] | None = None, part: Part | None = None,
) -> None:
    """Write the finished Zarr `store` as the NetCDF-4 file `target`, replacing one that is there only when whole.

    Never holds more than one chunk of one field. NaN stays the fill of the fields, so that file and store hold the same
    bits; coordinates, bounds and the status have none. The time dimension is unlimited.

    Parameters
    ----------
    attributes : global attributes that win over those of the store.
    progress : called with the bytes copied and the bytes in all, after each piece.
    part : what of the store goes into the file; None: all.
    """
    temporary = target.with_name(f".{target.name}.{os.getpid()}")
    whole = _opened(store)
    try:
        source = whole if part is None else _only(whole, part)
        with room_for(target, sum(file.stat().st_size for file in store.rglob("*") if file.is_file())):
            _copy(source, temporary, source.attrs | dict(attributes or {}), progress)
            settle(temporary, target)
    except BaseException:
        if temporary.exists():
            # On a full disk the HDF5 library cannot close the file and holds its space until the process ends: cut it.
            os.truncate(temporary, 0)
            temporary.unlink()
        raise
    finally:
        whole.close()


def export_parts(store: Path, folder: Path, files: Files) -> list[Path]:
    """Write the finished `store` as several files in `folder`, which are given back; see `parts_of`.

    Each appears whole or not at all. A file of a period tells the time it covers.
    """
    with _opened(store) as source:
        parts = parts_of(source, _fields(source), _time_dimension(source), files)
        times = {part.name: _covered(source, part) for part in parts}
    folder.mkdir(exist_ok=True)
    targets = [folder / f"{part.name}.nc" for part in parts]
    for part, target in zip(parts, targets, strict=True):
        export(store, target, attributes=times[part.name], part=part)
    return targets


def _opened(store: Path) -> xr.Dataset:
    return xr.open_dataset(store, engine="zarr", consolidated=False, decode_cf=False, chunks=None, cache=False)


def _only(source: xr.Dataset, part: Part) -> xr.Dataset:
    if part.fields is not None:
        source = source.drop_vars([name for name in _fields(source) if name not in part.fields])
    return source if part.steps is None else source.isel({str(_time_dimension(source)): part.steps})


def _covered(source: xr.Dataset, part: Part) -> dict[str, object]:
    time = _time_dimension(source)
    return {} if part.steps is None or time is None else coverage_of(source.isel({time: part.steps}), time)


def _copy(
    source: xr.Dataset, path: Path, attributes: Mapping[str, object], progress: Callable[[int, int], None] | None
) -> None:
    with NETCDF_LOCK:
        file = netCDF4.Dataset(path, "w", format="NETCDF4")
    try:
        with NETCDF_LOCK:
            time = _time_dimension(source)
            file.setncatts(_typed(attributes, None))
            fields = _fields(source)
            # A store has no order of its own: by name, so that the same store always gives the same file.
            names = [*sorted(str(name) for name in source.variables if name not in fields), *sorted(fields)]
            for dim in dict.fromkeys(dim for name in reversed(names) for dim in source.variables[name].dims):
                file.createDimension(str(dim), None if dim == time else source.sizes[dim])
            for name in names:
                _declare(file, name, source.variables[name], time, is_field=name in fields)
        total = sum(source.variables[name].nbytes for name in names)
        done = 0
        for name in names:
            variable = source.variables[name]
            for selection in pieces(variable.shape, variable.encoding["chunks"]):
                values = variable[selection].values
                with NETCDF_LOCK:  # which takes strings as objects only
                    file.variables[name][selection] = values.astype(object) if values.dtype.kind == "T" else values
                done += values.nbytes
                if progress:
                    progress(done, total)
        with NETCDF_LOCK:
            file.close()
    except BaseException:
        with NETCDF_LOCK, suppress(RuntimeError):  # the first error is the one to tell
            if file.isopen():
                file.close()
        raise


def _time_dimension(source: xr.Dataset) -> str | None:
    for variable in source.variables.values():
        if variable.ndim == 1 and (variable.attrs.get("axis") == "T" or variable.attrs.get("standard_name") == "time"):
            return str(variable.dims[0])
    return None


def _fields(source: xr.Dataset) -> list[str]:
    """The variables that are neither coordinates nor pointed to as bounds, terms or the mapping of the grid."""
    attrs = [variable.attrs for variable in source.variables.values()]
    coordinates = (str(entry.get("coordinates", "")).split() for entry in attrs)
    aside = pointed_at(attrs).union(*coordinates)
    return [str(name) for name in source.data_vars if name not in aside]


def _declare(file: netCDF4.Dataset, name: str, variable: xr.Variable, time: str | None, *, is_field: bool) -> None:
    options: dict[str, Any] = {}
    text = variable.dtype.kind in "OUT"
    if variable.ndim and not text and (is_field or variable.nbytes > _CHUNK_BYTES):
        options = {"zlib": True, "complevel": _DEFLATE_LEVEL, "shuffle": True,
                   "chunksizes": chunk_shape(variable.shape, variable.encoding["chunks"], variable.dtype.itemsize)}
    elif time in variable.dims:
        options = {"chunksizes": [max(1, size) for size in variable.shape]}
    # A coordinate has a fill only where it is an integer one that cannot do without: the connectivity of a mesh.
    fill = np.nan if is_field and variable.dtype.kind == "f" else variable.attrs.get("_FillValue")
    # A vlen string has no fill to switch off; for numbers, no fill means no attribute and no prefilling.
    made = file.createVariable(name, str if text else variable.dtype.newbyteorder("="), [str(dim) for dim in variable.dims],
                               fill_value=fill if text or fill is not None else False, **options)
    made.set_auto_maskandscale(False)
    if "chunksizes" in options:  # the library would keep 64 MB of chunks a field until the file is closed
        made.set_var_chunk_cache(int(np.prod(options["chunksizes"])) * variable.dtype.itemsize, 1, 1.0)
    made.setncatts(_typed({key: value for key, value in variable.attrs.items() if key != "_FillValue"}, variable.dtype))


def chunk_shape(shape: Sequence[int], block: Sequence[int], itemsize: int) -> tuple[int, ...]:
    """The chunk of a NetCDF field: part of one chunk of the store, at most two MiB.

    Each NetCDF chunk is then compressed once, when it is whole. A field is mostly opened to look at one moment, so time is
    split first, and then the vertical, whatever is left last. A split must divide the store's chunk evenly, unless that
    chunk spans the whole dimension.
    """
    chunk = [max(1, min(size, length)) for size, length in zip(block, shape, strict=True)]
    for axis, length in enumerate(shape):
        while chunk[axis] > 1 and np.prod(chunk) * itemsize > _CHUNK_BYTES:
            chunk[axis] = _split(chunk[axis], whole=block[axis] >= length)
    return tuple(chunk)


def _split(size: int, *, whole: bool) -> int:
    if whole:
        return -(-size // 2)
    return size // next(factor for factor in range(2, size + 1) if size % factor == 0)


def _typed(attributes: Mapping[Any, object], dtype: np.dtype[Any] | None) -> dict[str, object]:
    """Attributes in the types CF wants: those tied to a variable in its type, small integers in 32 bits."""
    tied = dtype is not None and dtype.kind in "iuf"
    return {
        str(key): np.asarray(value, dtype=dtype) if tied and key in _TYPED
        else np.int32(value) if isinstance(value, int) and abs(value) < 2**31
        else value
        for key, value in attributes.items()
    }
