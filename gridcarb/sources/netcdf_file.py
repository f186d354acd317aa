"""An open NetCDF file, read through the NetCDF library itself: headers of thousands of files are read one by one."""

from __future__ import annotations

import contextlib
import math
import os
import tempfile
from collections.abc import Iterator, Mapping
from typing import Any

import netCDF4
import numpy as np
import numpy.typing as npt

from gridcarb.errors import InputError
from gridcarb.sources.places import is_url, reached, split
from gridcarb.sources.stored import Head, Key, Lengths, choose_group, no_group

_MOST_KEPT = 32 * 2**20

MOST_COPIED = 4 * 2**30
"""Bytes of the largest NetCDF file that is fetched from behind a URL; HDF5 cannot read parts of one there."""


class NetcdfFile:
    """A group of a NetCDF file, with the variables of the groups above it that its own do not hide."""

    def __init__(self, path: str) -> None:
        store, group = split(path)
        with _on_disk(store) as place:
            self._file = netCDF4.Dataset(place)
        self._lean: set[str] = set()
        try:
            self._file.set_auto_maskandscale(False)
            self._file.set_auto_chartostring(False)
            self.group = group or (choose_group(self._holders(), store) if self._file.groups else "")
            self._variables = self._visible(store)
        except BaseException:
            self._file.close()
            raise

    def _holders(self) -> dict[str, list[Head]]:
        return {name: [_head(*item) for item in node.variables.items()] for name, node in _walk(self._file)}

    def _visible(self, store: str) -> dict[str, Any]:
        node, found = self._file, dict(self._file.variables)
        self.attrs: Mapping[str, Any] = {name: node.getncattr(name) for name in node.ncattrs()}
        for part in self.group.split("/") if self.group else ():
            if part not in node.groups:
                raise no_group(self.group, [name for name, _ in _walk(self._file) if name], store)
            node = node.groups[part]
            found |= node.variables
            self.attrs = {**self.attrs, **{name: node.getncattr(name) for name in node.ncattrs()}}
        return found

    def heads(self) -> dict[str, Head]:
        return {name: _head(name, variable) for name, variable in self._variables.items()}

    def layout(self, name: str) -> Lengths:
        head = _head(name, self._variables[name])
        return head.shape, head.dtype, head.chunks

    def read(self, name: str, key: Key) -> npt.NDArray[Any]:
        variable = self._variables[name]
        if name not in self._lean:
            _make_lean(variable)
            self._lean.add(name)
        return np.asarray(variable[key if key else ...])

    def close(self) -> None:
        if self._file.isopen():
            self._file.close()


def _make_lean(variable: Any) -> None:
    """The library would keep 64 MB of unpacked chunks for every variable that was ever read: one chunk is enough."""
    chunks = variable.chunking()
    if isinstance(chunks, list):
        variable.set_var_chunk_cache(min(_MOST_KEPT, math.prod(chunks) * np.dtype(variable.dtype).itemsize), 1, 1.0)


def _walk(node: Any, above: str = "") -> Iterator[tuple[str, Any]]:
    """Every group with its path, from the top."""
    yield above, node
    for name, below in node.groups.items():
        yield from _walk(below, f"{above}/{name}".strip("/"))


def _head(name: str, variable: Any) -> Head:
    chunks = variable.chunking()
    attrs = {key: variable.getncattr(key) for key in variable.ncattrs()}
    dtype = np.dtype(object) if isinstance(variable.datatype, netCDF4.VLType) else np.dtype(variable.dtype)
    if variable.dtype is str:
        dtype = np.dtype(object)
    laid = tuple(chunks) if isinstance(chunks, list) else None
    return Head(name, variable.dimensions, variable.shape, dtype, attrs, laid, _compression(variable) if laid else "")


def _compression(variable: Any) -> str:
    filters = variable.filters() or {}
    level = filters.get("complevel", 0)
    names = [name for name, on in filters.items() if on and name not in ("complevel", "shuffle", "fletcher32")]
    return ", ".join([*(f"{name} {level}" for name in names), *(["shuffle"] if names and filters.get("shuffle") else [])])


@contextlib.contextmanager
def _on_disk(store: str) -> Iterator[str]:
    """A path the library can open; what lies behind a URL is copied, and the copy goes with the last handle on it."""
    if not is_url(store):
        yield store
        return
    handle, copy = tempfile.mkstemp(suffix=".nc", prefix="gridcarb-")
    os.close(handle)
    try:
        with reached(store) as (system, inner):
            size = int(system.size(inner) or 0)
            if size > MOST_COPIED:
                raise InputError(
                    f"a NetCDF file behind a URL is copied before it is read, and this one has {size / 2**30:.1f} GiB",
                    where=store, mend="copy it to this disk yourself, or give it as a Zarr store, of which parts are read",
                )
            system.get_file(inner, copy)
        yield copy
    finally:
        os.unlink(copy)
