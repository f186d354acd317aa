"""Which variables describe the grid of a field, and what an attribute may still say once the others stay behind."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from typing import Any

from gridcarb.axes import Axes
from gridcarb.fields import ROLES
from gridcarb.sources.headers import Header
from gridcarb.sources.stored import words

_NUMBERS = "iufb"


def carried(header: Header, variable: str, axes: Axes) -> list[str]:
    """Coordinates, bounds, formula terms, cell measures, grid mapping and mesh of `variable` that the file holds."""
    head = header.heads[variable]
    axes_names = (axes.time_coordinate, axes.vertical_coordinate, axes.latitude, axes.longitude)
    main = [*head.dims, *(name for name in axes_names if name), *words(head.attrs.get("coordinates"))]
    direct = [name for name in dict.fromkeys(main) if name in header.heads]
    edges = _pointed(header, direct, ("bounds", "climatology"))
    more = [word.rstrip(":") for key in ("cell_measures", "grid_mapping") for word in words(head.attrs.get(key))]
    more += _pointed(header, [*direct, *edges], ("formula_terms",))
    mesh = mesh_of(header, str(head.attrs.get("mesh", "")))
    names = dict.fromkeys([*direct, *edges, *(name for name in more if name in header.heads)])
    found = [
        name for name in names
        if name != variable and name not in ROLES and _fits(header, name, head.dims, edge=_is_edge(header, name, edges))
    ]
    return list(dict.fromkeys([*found, *mesh]))


def mesh_of(header: Header, name: str) -> list[str]:
    """A UGRID mesh and whatever it points at: connectivity, coordinates of all its parts and their bounds."""
    head = header.heads.get(name)
    if head is None or head.attrs.get("cf_role") != "mesh_topology":
        return []
    pointed = [word for key, value in head.attrs.items() if key.endswith(("_connectivity", "_coordinates"))
               for word in words(value) if word in header.heads]
    return list(dict.fromkeys([name, *pointed, *_pointed(header, pointed, ("bounds",))]))


def _pointed(header: Header, names: Iterable[str], keys: Iterable[str]) -> list[str]:
    """Variables of the file that attributes of `names` point at."""
    found = [word for name in names for key in keys for word in words(header.heads[name].attrs.get(key))]
    return [word for word in found if word in header.heads]


def _is_edge(header: Header, name: str, edges: Collection[str]) -> bool:
    """Bounds have one dimension more than what they bound; so may terms of the bounds."""
    return name in edges or any(name in words(header.heads[edge].attrs.get("formula_terms")) for edge in edges)


def _fits(header: Header, name: str, dims: tuple[str, ...], edge: bool) -> bool:
    """Numbers on the dimensions of the field (bounds have one more), a list of names, or a scalar of any type."""
    head = header.heads[name]
    strangers = set(head.dims) - set(dims)
    if head.dtype.kind in "SUO" and head.dims:
        return head.dims[0] in dims and len(strangers) <= (1 if head.dtype.kind == "S" else 0)
    return (head.dtype.kind in _NUMBERS or not head.dims) and len(strangers) <= (1 if edge else 0)


def pruned(attrs: Mapping[str, Any], kept: Collection[str]) -> dict[str, Any]:
    """Attributes without what points at variables that are not kept."""
    result = dict(attrs)
    for key in ("coordinates", "ancillary_variables"):
        names = [word for word in words(attrs.get(key)) if word in kept]
        _put(result, key, " ".join(names))
    measures = words(attrs.get("cell_measures"))
    pairs = [f"{noun} {name}" for noun, name in zip(measures[::2], measures[1::2], strict=False) if name in kept]
    _put(result, "cell_measures", " ".join(pairs))
    if attrs.get("mesh") not in kept:
        _put(result, "mesh", "")
        _put(result, "location", "")
    for key in ("bounds", "climatology", "grid_mapping", "formula_terms"):
        names = [word for word in words(attrs.get(key)) if not word.endswith(":")]
        _put(result, key, attrs[key] if names and all(name in kept for name in names) else "")
    return result


def _put(attrs: dict[str, Any], key: str, text: str) -> None:
    if text:
        attrs[key] = text
    else:
        attrs.pop(key, None)
