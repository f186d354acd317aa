"""From settings to a checked collection: headers only, every disagreement told before any number is computed."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from gridcarb.axes import Axes, grid_kind
from gridcarb.errors import Faults, InputError, Notice
from gridcarb.fields import ROLES
from gridcarb.sources import grid as grids
from gridcarb.sources import timeline
from gridcarb.sources.collection import ArraySource, Collection, RoleSource, Segment
from gridcarb.sources.coordinates import carried, pruned
from gridcarb.sources.grid import Grid
from gridcarb.sources.headers import Header, read_header
from gridcarb.sources.locate import locate
from gridcarb.sources.roles import Candidate, settle
from gridcarb.sources.settings import InputsSettings
from gridcarb.sources.stored import Head
from gridcarb.sources.timeline import Piece, Timeline, Units

_PACKING = ("units", "scale_factor", "add_offset", "_FillValue", "missing_value", "_Unsigned", "valid_min", "valid_max",
            "valid_range")
_INLINE = 100_000
"""Coordinates up to so many values travel inside the collection; larger ones are read from their file when needed."""

_REFERENCE = "temperature"


@dataclass(frozen=True)
class _Part:
    """One role: its files in the order of time, its grid, its time axis (None if it has none)."""

    variable: str
    how: str
    headers: tuple[Header, ...]
    grid: Grid
    line: Timeline | None

    @property
    def axes(self) -> Axes:
        """The axes in the names of its first file."""
        return self.grid.axes


def gather(settings: InputsSettings, base: Path) -> Collection:
    """Find, read and check the headers of all inputs.

    Parameters
    ----------
    settings : the `inputs` section of a recipe.
    base : the folder its relative paths start from.

    Raises
    ------
    InputError : a file that is missing, damaged or no NetCDF/Zarr; a role without a variable or with two; grids or time
        axes that disagree, overlap or have gaps. It says where, what, and which recipe line mends it; its `others` hold
        whatever else is wrong.
    """
    faults = Faults()
    found = explore(settings, base, faults)
    faults.tell()
    assert found is not None  # or there would have been a fault
    return found


def explore(settings: InputsSettings, base: Path, faults: Faults) -> Collection | None:
    """As `gather`, with every error put by in `faults`: a collection of the roles that fit together, None if none does."""
    groups, told = _groups(settings, base, faults)
    if not any(groups.values()):
        return None
    chosen, notices = settle(groups, told, faults)
    parts: dict[str, _Part] = {}
    for role, one in chosen.items():
        alone = bool(settings.role(role).files)
        part = faults.attempt(_whole_part, role, one, groups[role], alone, settings.time_gaps)
        parts |= {role: part} if part else {}
    fitting: dict[str, _Part] = {}
    reference = parts.get(_REFERENCE) or next(iter(parts.values()), None)
    for role, part in parts.items():
        assert reference is not None
        told_of_it = faults.attempt(_checked, role, part, reference)
        if told_of_it is not None:
            notices += told_of_it
            fitting[role] = part
    return None if reference is None else faults.attempt(_collection, fitting, reference, notices)


def _whole_part(role: str, one: Candidate, group: Sequence[Header], alone: bool, gaps: str) -> _Part:
    _refuse_holes(role, one, group, alone)
    return _part(role, one, gaps)


def _collection(parts: Mapping[str, _Part], reference: _Part, notices: Sequence[Notice]) -> Collection:
    names = _kept(reference)
    coordinates = _coordinates(reference, names)
    roles = {
        role: RoleSource(role, part.variable, part.how, _field(part, reference, names)) for role, part in parts.items()
    }
    headers = {header.path: header.record for part in parts.values() for header in part.headers}
    field = next(roles[role].array for role, part in parts.items() if part is reference)
    sizes = dict(zip(field.dims, field.shape, strict=True))
    return Collection(
        roles=roles, coordinates=coordinates, axes=reference.axes,
        kind=grid_kind(reference.headers[0].skeleton(reference.variable), reference.axes), sizes=sizes,
        files=tuple(headers.values()), attributes=dict(reference.headers[0].attrs), notices=tuple(notices),
    )


def _groups(
    settings: InputsSettings, base: Path, faults: Faults
) -> tuple[dict[str, list[Header]], dict[str, str]]:
    """For each role the headers its variable may lie in, and the variable names the recipe tells."""
    paths = {"": faults.attempt(locate, settings.files, base)}
    paths |= {role: faults.attempt(locate, settings.role(role).files, base) for role in ROLES if settings.role(role).files}
    if all(found == [] for found in paths.values()):
        faults.put(InputError("the recipe names no input files", where="inputs",
                              mend="write `inputs: {files: [data/*.nc]}`"))
    every = dict.fromkeys(path for group in paths.values() for path in group or ())
    headers = {path: faults.attempt(read_header, path) for path in every}
    groups = {
        role: [header for path in paths.get(role, paths[""]) or () if (header := headers[path])] for role in ROLES
    }
    told = {role: name for role in ROLES if (name := settings.role(role).variable)}
    return groups, told


def _refuse_holes(role: str, one: Candidate, group: Sequence[Header], alone: bool) -> None:
    """There must be numbers, and files named for one role alone must all hold its variable."""
    for header in one.headers:
        if 0 in header.heads[one.variable].shape:
            raise InputError("the variable has no values", where=header.place(one.variable), mend="leave the file out")
    bare = [header for header in group if header not in one.headers] if alone else []
    if bare:
        raise InputError(
            f"the file holds no '{one.variable}', which is the {role} in {one.headers[0].path}", where=bare[0].path,
            mend=f"leave the file out of `inputs: {{{role}: {{files: ...}}}}`, or rename the variable in it",
        )


def _part(role: str, one: Candidate, gaps: str) -> _Part:
    """Order the files of one role in time and see that they are of one make."""
    first = Grid.of(one.headers[0], one.variable)
    headers, line = list(one.headers), None
    if first.axes.time is None and len(headers) > 1:
        raise InputError(
            f"'{one.variable}' lies in {len(headers)} files but has no time dimension",
            where=", ".join(header.path for header in headers[:3]),
            mend=f"write `inputs: {{{role}: {{files: ONE_FILE, variable: {one.variable}}}}}` in the recipe",
        )
    for header in headers[1:]:
        _refuse_other_make(role, one.variable, header, headers[0])
        grids.refuse_difference(role, Grid.of(header, one.variable, first), one.variable, first)
    if first.axes.time is not None:
        line = _line(role, first, headers, gaps)
        headers = [headers[place] for place in line.order]
    return _Part(one.variable, one.how, tuple(headers), Grid.of(headers[0], one.variable, first), line)


def _line(role: str, first: Grid, headers: Sequence[Header], gaps: str) -> Timeline:
    axes = first.axes
    if axes.time_coordinate is None:
        if len(headers) > 1:
            raise InputError(
                f"the dimension '{axes.time}' has no time coordinate, so that {len(headers)} files cannot be put in order",
                where=headers[0].place(first.variable), mend="add a time coordinate to the files, or give one file",
            )
        return timeline.build(role, [_piece(headers[0], None, first.size(axes.time))], gaps)
    return timeline.build(role, [_piece(header, axes.time_coordinate, first.size(axes.time)) for header in headers], gaps)


def _piece(header: Header, name: str | None, steps: int) -> Piece:
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
    edges = edges if edges is not None and edges.shape == (len(values), 2) else None
    return Piece(header.path, values, edges, Units.of(attrs), "climatology" in attrs)


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


def _checked(role: str, part: _Part, reference: _Part) -> list[Notice]:
    """Time axis and grid against the reference; what was let pass is told."""
    if part is reference:
        return list(part.line.notices) if part.line else []
    grids.refuse_difference(role, part.grid, _REFERENCE, reference.grid)
    if part.line and reference.line:
        timeline.refuse_difference(role, part.line, _REFERENCE, reference.line)
    elif part.line:
        raise InputError(
            f"{role} changes in time ({part.line.span()}), {_REFERENCE} has no time dimension",
            where=part.headers[0].place(part.variable), mend=f"give files of {_REFERENCE} on the same time axis",
        )
    elif reference.line:
        return [Notice(
            "constant-in-time",
            f"{role} has no time dimension: the same values are used at all {reference.line.steps} times",
            f"inputs: {{{role}: {part.variable}}}",
        )]
    return []


def _field(part: _Part, reference: _Part, kept: Sequence[str]) -> ArraySource:
    """The variable of a role, in the dimension names of the reference grid."""
    rename = dict(zip(part.axes.horizontal, reference.axes.horizontal, strict=True))
    rename |= {own: other for own, other in ((part.axes.time, reference.axes.time),
                                             (part.axes.vertical, reference.axes.vertical)) if own and other}
    source = _array(part, part.variable, part.axes.order, kept)
    return replace(source, dims=tuple(rename[dim] for dim in source.dims))


def _kept(part: _Part) -> list[str]:
    """Names of what describes the grid; of what changes with time only that which all files hold."""
    names = carried(part.headers[0], part.variable, part.axes)
    joined = _joined(part)
    heads = part.headers[0].heads
    return [
        name for name in names
        if part.axes.time not in heads[name].dims or name in joined or _everywhere(name, part.headers)
    ]


def _everywhere(name: str, headers: Sequence[Header]) -> bool:
    """Whether all files hold a variable, in the same units."""
    heads = [header.heads.get(name) for header in headers]
    return all(head and head.attrs.get("units") == (heads[0] and heads[0].attrs.get("units")) for head in heads)


def _joined(part: _Part) -> dict[str, Any]:
    """The time coordinate and its bounds over all files."""
    name, line = part.axes.time_coordinate, part.line
    if line is None or name is None:
        return {}
    attrs = part.headers[0].heads[name].attrs
    bounds = attrs.get("bounds") or attrs.get("climatology")
    return {name: line.values} | ({str(bounds): line.bounds} if line.bounds is not None else {})


def _coordinates(part: _Part, names: Sequence[str]) -> dict[str, ArraySource]:
    """What describes the reference grid."""
    first, joined, found = part.headers[0], _joined(part), {}
    for name in names:
        head = first.heads[name]
        edges = [dim for dim in head.dims if dim not in first.heads[part.variable].dims]
        source = _array(part, name, (*part.axes.order, *edges), names)
        values = joined[name] if name in joined else _few(first, name, source)
        dtype = source.dtype if values is None else str(values.dtype)
        found[name] = replace(source, dtype=dtype, values=values)
    return found


def _few(header: Header, name: str, source: ArraySource) -> Any:
    """Values that are few enough to travel, in canonical order; None: they are many, or change with time."""
    values = header.whole(name)
    if values is None or source.time_axis is not None or values.size > _INLINE:
        return None
    kept = sorted(source.file_axes)
    values = values[tuple(slice(None) if axis in kept else 0 for axis in range(source.file_rank))]
    return values.transpose([kept.index(axis) for axis in source.file_axes])


def _array(part: _Part, name: str, dims: tuple[str, ...], kept: Sequence[str]) -> ArraySource:
    """A variable along `dims` (those of them it has), over all files if it changes with time."""
    head = part.headers[0].heads[name]
    dims = tuple(dim for dim in dims if dim in head.dims)
    time = part.axes.time
    shape = tuple(part.line.steps if part.line and dim == time else head.shape[head.dims.index(dim)] for dim in dims)
    files: Sequence[Header] = part.headers if time in dims else part.headers[:1]
    starts = part.line.starts if part.line and time in dims else (0, 1)
    axes = tuple(head.dims.index(dim) for dim in dims)
    return ArraySource(
        dims=dims, shape=shape, dtype=str(_dtype(name, files)), attrs=pruned(head.attrs, kept),
        file_axes=axes, file_rank=len(head.dims), chunks=_chunks(head, axes),
        segments=tuple(Segment(header.path, name, start, stop)
                       for header, start, stop in zip(files, starts, starts[1:], strict=False)),
        time_axis=dims.index(time) if time in dims else None,
    )


def _dtype(name: str, files: Sequence[Header]) -> np.dtype[Any]:
    return np.result_type(*(header.heads[name].dtype for header in files))


def _chunks(head: Head, axes: Sequence[int]) -> tuple[int, ...] | None:
    return tuple(head.chunks[axis] for axis in axes) if head.chunks else None
