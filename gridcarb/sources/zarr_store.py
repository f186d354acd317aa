"""An open Zarr store, format 2 or 3, on this disk or behind a URL."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr
import zarr

from gridcarb.sources.in_thread import read_in_thread
from gridcarb.sources.places import is_url, split
from gridcarb.sources.stored import Head, Key, Lengths, choose_group, no_group

_AS_STORED: dict[str, Any] = {
    "engine": "zarr", "consolidated": False, "chunks": None, "decode_cf": False, "mask_and_scale": False,
    "decode_times": False, "cache": False,
}


class ZarrStore:
    """A group of a Zarr store, with the variables of the groups above it that its own do not hide."""

    def __init__(self, path: str) -> None:
        store, group = split(path)
        found = xr.open_dataset(store, **_AS_STORED)
        self._open = [found]
        below: dict[str, list[Head]] = {} if found.variables and not group else {
            name: [] for name in _groups(zarr.open_group(store, mode="r"))
        }
        if group and group not in below:
            raise no_group(group, sorted(below), store)
        if below and not group:
            holders = {"": list(heads_of(found.variables).values())}
            for name in below:
                with xr.open_dataset(store, group=name, **_AS_STORED) as dataset:
                    holders[name] = list(heads_of(dataset.variables).values())
            group = choose_group(holders, store)
        self.group = group
        parts = group.split("/") if group else []
        self._open += [
            xr.open_dataset(store, group="/".join(parts[: n + 1]), **_AS_STORED) for n in range(len(parts))
        ]
        self._variables: dict[str, xr.Variable] = {}
        self.attrs: Mapping[str, Any] = {}
        self._store, self._arrays, self._homes = store, dict[str, "zarr.Array[Any]"](), dict[str, str]()
        for depth, dataset in enumerate(self._open):
            self._variables |= {str(name): variable for name, variable in dataset.variables.items()}
            self._homes |= {str(name): "/".join([*parts[:depth], str(name)]) for name in dataset.variables}
            self.attrs = {**self.attrs, **dataset.attrs}

    def heads(self) -> dict[str, Head]:
        return heads_of(self._variables)

    def read(self, name: str, key: Key) -> npt.NDArray[Any]:
        variable = self._variables[name]
        plain = variable.dtype.kind in "fiu" and all(isinstance(part, slice) for part in key) and variable.ndim > 0
        if plain and not is_url(self._store):
            return read_in_thread(self._array(name), key)
        return np.asarray(variable[key].values)

    def _array(self, name: str) -> zarr.Array[Any]:
        if name not in self._arrays:
            self._arrays[name] = zarr.open_array(self._store, path=self._homes[name], mode="r")
        return self._arrays[name]

    def layout(self, name: str) -> Lengths:
        head = heads_of({name: self._variables[name]})[name]
        return head.shape, head.dtype, head.chunks

    def close(self) -> None:
        for dataset in self._open:
            dataset.close()


def _groups(node: Any, above: str = "") -> list[str]:
    found = []
    for name, below in node.groups():
        place = f"{above}/{name}".strip("/")
        found += [place, *_groups(below, place)]
    return found


def heads_of(variables: Mapping[Any, xr.Variable]) -> dict[str, Head]:
    """The variables of an open store, or of a dataset in memory."""
    found = {}
    for name, variable in variables.items():
        encoding = variable.encoding
        chunks = encoding.get("chunksizes") or encoding.get("chunks")
        moved = {key: encoding[key] for key in ("coordinates", "grid_mapping") if key in encoding}
        packers = encoding.get("compressors") or encoding.get("compressor") or ()
        packers = packers if isinstance(packers, (tuple, list)) else (packers,)
        found[str(name)] = Head(
            str(name), tuple(map(str, variable.dims)), variable.shape, variable.dtype, {**moved, **variable.attrs},
            tuple(chunks) if chunks else None, ", ".join(type(packer).__name__ for packer in packers),
        )
    return found
