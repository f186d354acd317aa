"""One variable over all its files: their order in time, their likeness, and the arrays made of them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from gridcarb.axes import Axes
from gridcarb.errors import InputError
from gridcarb.sources import grid as grids
from gridcarb.sources import timeline
from gridcarb.sources.collection import ArraySource, Segment
from gridcarb.sources.coordinates import pruned
from gridcarb.sources.dates import Months, Units, without_months
from gridcarb.sources.grid import Grid
from gridcarb.sources.headers import Header
from gridcarb.sources.roles import Candidate
from gridcarb.sources.stored import Head, words
from gridcarb.sources.timeline import Piece, Timeline

_PACKING = ("units", "scale_factor", "add_offset", "_FillValue", "missing_value", "_Unsigned", "valid_min", "valid_max",
            "valid_range")


@dataclass(frozen=True)
class TimeRules:
    """What the recipe says of time: gaps 'refuse' or 'accept'; what a month is."""

    gaps: str
    months: Months


@dataclass(frozen=True)
class Part:
    """One variable: its files in the order of time, its grid, its time axis (None if it has none).

    spread : variables that have no time dimension in the files, each of which holds one step of them.
    """

    variable: str
    how: str
    headers: tuple[Header, ...]
    grid: Grid
    line: Timeline | None
    spread: frozenset[str] = frozenset()

    @property
    def axes(self) -> Axes:
        """The axes in the names of its first file."""
        return self.grid.axes


def whole_part(role: str, one: Candidate, group: Sequence[Header], alone: bool, rules: TimeRules) -> Part:
    """The part a role plays; `alone` if its files were named for it.

    Raises
    ------
    InputError : files without values or without the variable, of different make, or that no time axis puts in order.
    """
    _refuse_holes(role, one, group, alone)
    return _part(role, one, rules)


def _refuse_holes(role: str, one: Candidate, group: Sequence[Header], alone: bool) -> None:
    """There must be numbers, and files named for one role alone must all hold its variable."""
    for header in one.headers:
        if 0 in header.heads[one.variable].shape:
            raise InputError("the variable has no values", where=header.place(one.variable), mend="leave the file out")
    holders = {header.path for header in one.headers}
    bare = [header for header in group if header.path not in holders] if alone else []
    if bare:
        raise InputError(
            f"the file holds no '{one.variable}', which is the {role} in {one.headers[0].path}", where=bare[0].path,
            mend=f"leave the file out of `inputs: {{{role}: {{files: ...}}}}`, or rename the variable in it",
        )


def _part(role: str, one: Candidate, rules: TimeRules) -> Part:
    """Order the files of one role in time and see that they are of one make."""
    first = Grid.of(one.headers[0], one.variable)
    headers, line = list(one.headers), None
    spread: frozenset[str] = frozenset()
    if first.axes.time is None and len(headers) > 1:
        spread = _spread(role, one, first.axes)
        first = replace(first, axes=replace(first.axes, time=first.axes.time_coordinate))
    for header in headers[1:]:
        _refuse_other_make(role, one.variable, header, headers[0])
        grids.refuse_difference(role, Grid.of(header, one.variable, first), one.variable, first)
    if first.axes.time is not None:
        line = _line(role, first, headers, rules)
        headers = [headers[place] for place in line.order]
    return Part(one.variable, one.how, tuple(headers), Grid.of(headers[0], one.variable, first), line, spread)


def _spread(role: str, one: Candidate, axes: Axes) -> frozenset[str]:
    """Files of one moment each, told by a scalar time: what has a value for each of them."""
    time, head = axes.time_coordinate, one.head
    if time is None or any(time not in header.heads or header.heads[time].dims for header in one.headers):
        raise InputError(
            f"'{one.variable}' lies in {len(one.headers)} files but has no time dimension",
            where=", ".join(header.path for header in one.headers[:3]),
            mend=f"write `inputs: {{{role}: {{files: ONE_FILE, variable: {one.variable}}}}}` in the recipe",
        )
    attrs = one.headers[0].heads[time].attrs
    levels = one.headers[0].heads[axes.vertical_coordinate].attrs if axes.vertical_coordinate else {}
    terms = words(levels.get("formula_terms"))
    surfaces = [name for term, name in zip(terms[::2], terms[1::2], strict=False) if term == "eta:"]
    return frozenset({head.name, time, *words(attrs.get("bounds")), *words(attrs.get("climatology")), *surfaces})


def _line(role: str, first: Grid, headers: Sequence[Header], rules: TimeRules) -> Timeline:
    axes = first.axes
    if axes.time_coordinate is None:
        if len(headers) > 1:
            raise InputError(
                f"the dimension '{axes.time}' has no time coordinate, so that {len(headers)} files cannot be put in order",
                where=headers[0].place(first.variable), mend="add a time coordinate to the files, or give one file",
            )
        return timeline.build(role, [_piece(headers[0], None, first.size(axes.time), rules)], rules.gaps)
    pieces = [_piece(header, axes.time_coordinate, 0, rules) for header in headers]
    return timeline.build(role, pieces, rules.gaps)


def _piece(header: Header, name: str | None, steps: int, rules: TimeRules) -> Piece:
    """The time axis of one file; a bare counter if the dimension has no coordinate."""
    if name is None:
        return Piece(header.path, np.arange(steps), None, Units.of({}))
    values = header.whole(name)
    if values is None:
        raise InputError("the time coordinate cannot be read as numbers", where=header.place(name),
                         mend="write it as numbers with units such as `days since 1850-01-01`")
    attrs = header.heads[name].attrs
    bounds = str(attrs.get("bounds") or attrs.get("climatology") or "")
    edges = header.whole(bounds) if bounds in header.heads else None
    values = np.atleast_1d(values)
    edges = np.atleast_2d(edges) if edges is not None else None
    edges = edges if edges is not None and edges.shape == (len(values), 2) else None
    units = Units.of(attrs)
    values, told = without_months(values, units, rules.months, header.place(name))
    if edges is not None:
        edges, _ = without_months(edges, units, rules.months, header.place(name))
    return Piece(header.path, values, edges, told, "climatology" in attrs)


def _refuse_other_make(role: str, variable: str, header: Header, first: Header) -> None:
    """Dimensions, type and packing must be those of the first file; floats of two widths are the same make."""
    ours, theirs = header.heads[variable], first.heads[variable]
    pairs: list[tuple[str, Any, Any]] = [("dimensions", ours.dims, theirs.dims)]
    if not (ours.dtype.kind == theirs.dtype.kind == "f"):
        pairs.append(("type", ours.dtype, theirs.dtype))
    pairs += [(key, ours.attrs.get(key), theirs.attrs.get(key)) for key in _PACKING]
    for noun, own, other in pairs:
        if not _same(own, other):
            raise InputError(
                f"the files of {role} are packed differently: {noun} is {_said(own)} here, {_said(other)} in {first.path}",
                where=header.place(variable), mend=f"rewrite the files of {role} with one {noun}",
            )


def _same(one: Any, two: Any) -> bool:
    if one is two:
        return True
    numbers = (int, float, np.number, np.ndarray)
    if not (isinstance(one, numbers) and isinstance(two, numbers)):
        return bool(one == two)
    left, right = np.asarray(one), np.asarray(two)
    if left.dtype.kind == right.dtype.kind == "f":
        # A fill value of 1e20 is another number in single than in double precision.
        narrow = min(left.dtype, right.dtype, key=lambda dtype: dtype.itemsize)
        with np.errstate(over="ignore"):
            left, right = left.astype(narrow), right.astype(narrow)
    return np.array_equal(left, right, equal_nan=True)


def _said(value: Any) -> str:
    return "absent" if value is None else f"'{value}'"


def field_of(part: Part, reference: Part, kept: Sequence[str]) -> ArraySource:
    """The variable of a part, in the dimension names of the reference grid."""
    rename = dict(zip(part.axes.horizontal, reference.axes.horizontal, strict=True))
    rename |= {own: other for own, other in ((part.axes.time, reference.axes.time),
                                             (part.axes.vertical, reference.axes.vertical)) if own and other}
    source = array_of(part, part.variable, part.axes.order, kept)
    return replace(source, dims=tuple(rename[dim] for dim in source.dims))


def array_of(part: Part, name: str, dims: tuple[str, ...], kept: Sequence[str]) -> ArraySource:
    """A variable along `dims` (those of them it has), over all files if it changes with time."""
    head, time = part.headers[0].heads[name], part.axes.time
    spread = name in part.spread
    dims = tuple(dim for dim in dims if dim in head.dims or (spread and dim == time))
    shape = tuple(part.line.steps if part.line and dim == time else head.shape[head.dims.index(dim)] for dim in dims)
    files: Sequence[Header] = part.headers if time in dims else part.headers[:1]
    starts = part.line.starts if part.line and time in dims else (0, 1)
    axes = tuple(-1 if spread and dim == time else head.dims.index(dim) for dim in dims)
    return ArraySource(
        dims=dims, shape=shape, dtype=str(_dtype(name, files)), attrs=pruned(head.attrs, kept),
        file_axes=axes, file_rank=len(head.dims), chunks=_chunks(head, axes),
        segments=tuple(Segment(header.heads[name].origin or header.path, name, start, stop)
                       for header, start, stop in zip(files, starts, starts[1:], strict=False)),
        time_axis=dims.index(time) if time in dims else None,
    )


def joined_times(part: Part) -> Mapping[str, tuple[np.ndarray[Any, Any], Units]]:
    """The time coordinate and its bounds over all files, with their units."""
    name, line = part.axes.time_coordinate, part.line
    if line is None or name is None:
        return {}
    attrs = part.headers[0].heads[name].attrs
    bounds = attrs.get("bounds") or attrs.get("climatology")
    edges = {str(bounds): (line.bounds, line.units)} if line.bounds is not None else {}
    return {name: (line.values, line.units), **edges}


def _dtype(name: str, files: Sequence[Header]) -> np.dtype[Any]:
    return np.result_type(*{header.heads[name].dtype for header in files})


def _chunks(head: Head, axes: Sequence[int]) -> tuple[int, ...] | None:
    return tuple(1 if axis < 0 else head.chunks[axis] for axis in axes) if head.chunks else None
