"""Files that lack what their variables point at borrow it from the others: grid files, sea surface files, mesh files."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

import numpy as np

from gridcarb.errors import Notice
from gridcarb.sources.headers import Header
from gridcarb.sources.stored import Head, words

_POINTING = ("coordinates", "bounds", "climatology", "formula_terms", "grid_mapping")
_PLACES = {"latitude": ("degrees_north", "degree_north", "degrees_n", "degreen"),
           "longitude": ("degrees_east", "degree_east", "degrees_e", "degreee")}


class Lender:
    """All files, by the variables they hold."""

    def __init__(self, headers: Sequence[Header]) -> None:
        self.holders: dict[str, list[Header]] = {}
        for header in headers:
            for name in header.heads:
                self.holders.setdefault(name, []).append(header)
        self.by_time = {
            (name, moments): header for name, holders in self.holders.items() for header in holders
            if (moments := _moments(header, header.heads[name]))
        }

    def completed(self, header: Header) -> Header:
        """A header with what its variables point at and other files hold on the same dimensions, if there is any."""
        sizes = {dim: size for head in header.heads.values() for dim, size in zip(head.dims, head.shape, strict=True)}
        asked = [name for name in _pointed(header.heads.values()) if name not in header.heads]
        lent: dict[str, tuple[Header, Head]] = {}
        for _ in range(3):  # a mesh points at coordinates, which point at bounds
            found = {name: pair for name in asked if name not in lent and (pair := self._find(name, header, sizes))}
            lent |= found
            asked = [name for name in _pointed(head for _, head in found.values()) if name not in header.heads]
        lent |= self._places(header, sizes)
        if not lent:
            return header
        heads = {name: replace(head, origin=head.origin or owner.path) for name, (owner, head) in lent.items()}
        values = {name: owner.values[name] for name, (owner, _) in lent.items() if name in owner.values}
        return replace(header, heads={**header.heads, **heads}, values={**header.values, **values})

    def _find(self, name: str, header: Header, sizes: Mapping[str, int]) -> tuple[Header, Head] | None:
        holders = self.holders.get(name, [])
        if not holders:
            return None
        head = holders[0].heads[name]
        if _time_dim(holders[0], head):
            moments = next((found for own in header.heads.values() if (found := _moments(header, own))), b"")
            owner = self.by_time.get((name, moments))
        else:
            owner = holders[0]
        if owner is None:
            return None
        head = owner.heads[name]
        fits = all(sizes.get(dim, size) == size for dim, size in zip(head.dims, head.shape, strict=True))
        return (owner, head) if fits else None

    def _places(self, header: Header, sizes: Mapping[str, int]) -> dict[str, tuple[Header, Head]]:
        """Latitude and longitude for a file that has none, where one file alone can give them."""
        if any(_placing(head) for head in header.heads.values()):
            return {}
        found: dict[str, dict[str, tuple[Header, Head]]] = {kind: {} for kind in _PLACES}
        for name, holders in self.holders.items():
            head = holders[0].heads[name]
            kind = _placing(head)
            if kind and head.dims and all(sizes.get(dim) == size for dim, size in zip(head.dims, head.shape, strict=True)):
                found[kind][name] = (holders[0], head)
        if any(len(names) != 1 for names in found.values()):
            return {}
        return found["latitude"] | found["longitude"]


def borrowed(headers: Iterable[Header]) -> list[Notice]:
    """What was taken from other files than the fields lie in, told once."""
    owners: dict[str, str] = {}
    for header in headers:
        for name, head in header.heads.items():
            if head.origin:
                owners.setdefault(name, head.origin)
    return [
        Notice("described-elsewhere", ", ".join(f"'{name}'" for name in owners if owners[name] == path)
               + f" describe the grid and are taken from {path}")
        for path in dict.fromkeys(owners.values())
    ]


def _pointed(heads: Iterable[Head]) -> list[str]:
    """Names of the variables that describe others, each once."""
    found: list[str] = []
    for head in heads:
        keys = [key for key in head.attrs if key in _POINTING or _of_mesh(head, key)]
        found += [word for key in keys for word in words(head.attrs[key]) if not word.endswith(":")]
        found += words(head.attrs.get("mesh"))
    return list(dict.fromkeys(found))


def _of_mesh(head: Head, key: str) -> bool:
    return head.attrs.get("cf_role") == "mesh_topology" and key.endswith(("_connectivity", "_coordinates"))


def _placing(head: Head) -> str:
    """'latitude' or 'longitude' for a variable that says so, else ''."""
    if head.dtype.kind not in "iuf" or len(head.dims) > 2:
        return ""
    said, units = head.attrs.get("standard_name"), str(head.attrs.get("units", "")).lower()
    return next((kind for kind, known in _PLACES.items() if said == kind or (not said and units in known)), "")


def _time_dim(header: Header, head: Head) -> str:
    """The dimension of a variable whose coordinate counts since a date."""
    counted = {dim: str(header.heads[dim].attrs.get("units")) for dim in head.dims if dim in header.heads}
    return next((dim for dim, units in counted.items() if " since " in units), "")


def _moments(header: Header, head: Head) -> bytes:
    """The times of a variable with their units, to know the file of the same times by."""
    dim = _time_dim(header, head)
    values = header.whole(dim) if dim else None
    if values is None:
        return b""
    return str(header.heads[dim].attrs.get("units")).encode() + np.asarray(values, np.float64).tobytes()
