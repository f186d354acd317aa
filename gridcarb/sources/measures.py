"""Cell measures: area, volume, thickness, sea fraction, basin, sea floor, from whichever of the files holds them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

from gridcarb.axes import Axes
from gridcarb.errors import Faults, GridcarbError, InputError, Notice
from gridcarb.fields import ROLES
from gridcarb.sources import grid as grids
from gridcarb.sources import timeline
from gridcarb.sources.collection import ArraySource
from gridcarb.sources.conventions import MEASURES
from gridcarb.sources.describing import coordinates_of
from gridcarb.sources.grid import Grid
from gridcarb.sources.headers import Header
from gridcarb.sources.parts import Part, TimeRules, field_of, whole_part
from gridcarb.sources.roles import Candidate, known_as, told
from gridcarb.sources.settings import InputsSettings
from gridcarb.sources.stored import words

POINTED = "by cell_measures"


@dataclass(frozen=True, eq=False)
class Measures:
    """The measures that fit the reference grid, by kind; what was left aside is told."""

    parts: Mapping[str, Part] = field(default_factory=dict)
    notices: tuple[Notice, ...] = ()

    def by_kind(self) -> dict[str, str]:
        """Kind -> name of the coordinate."""
        return {kind: _name(kind, part) for kind, part in self.parts.items()}

    def names(self) -> list[str]:
        """Names of the coordinates."""
        return list(self.by_kind().values())

    def sources(self, reference: Part, kept: Sequence[str]) -> dict[str, ArraySource]:
        """Name -> array on the reference grid; small ones of the reference's own file come with their values."""
        found = {}
        for kind, part in self.parts.items():
            own = part.headers[0] is reference.headers[0] and part.axes.order == reference.axes.order
            array = coordinates_of(part, [part.variable])[part.variable] if own else field_of(part, reference, kept)
            found[_name(kind, part)] = array
        return found


def _name(kind: str, part: Part) -> str:
    return f"cell_{kind}" if part.variable in ROLES else part.variable


def find_measures(
    groups: Mapping[str, Sequence[Header]], settings: InputsSettings, reference: Part, rules: TimeRules, faults: Faults
) -> Measures:
    """The measures of the reference grid; what the recipe names and does not fit is a fault, the rest is left aside."""
    parts: dict[str, Part] = {}
    notices: list[Notice] = []
    for kind in MEASURES:
        said = settings.role(kind)
        fits: list[Part] = []
        misfits: list[tuple[Candidate, GridcarbError]] = []
        found = faults.attempt(_candidates, kind, said.variable, groups[kind], reference)
        for one in found or ():
            try:
                fits.append(_fitting(kind, one, reference, rules))
            except GridcarbError as error:
                misfits.append((one, error))
        if len(fits) == 1:
            parts[kind] = fits[0]
        elif fits:
            notices.append(_doubt(kind, fits))
        elif said.variable or said.files:
            missing = [_unknown(kind, groups[kind])] if found == [] else []
            for trouble in (*missing, *(error for _, error in misfits[:1])):
                faults.put(trouble)
        elif misfits:
            first, trouble = misfits[0]
            notices.append(Notice("measure-left-aside", f"'{first.variable}' was not taken as {kind}: {trouble.what}"))
    return Measures(parts, tuple(notices))


def _doubt(kind: str, fits: Sequence[Part]) -> Notice:
    lines = " or ".join(f"`inputs: {{{kind}: {part.variable}}}`" for part in fits)
    several = ", ".join(f"'{part.variable}'" for part in fits)
    return Notice("measure-in-doubt", f"{several} could be the {kind}; none is used", lines)


def _unknown(kind: str, headers: Sequence[Header]) -> InputError:
    return InputError(f"no variable is known as the {kind} of the cells", where=headers[0].path if headers else "inputs",
                      mend=f"name it: `inputs: {{{kind}: {{files: FILE, variable: NAME}}}}`")


def _candidates(kind: str, name: str | None, headers: Sequence[Header], reference: Part) -> list[Candidate]:
    """As told, else what the fields point at, else what is known best under a standard name or a name."""
    if name:
        return [told(kind, name, headers)]
    said = words(reference.headers[0].heads[reference.variable].attrs.get("cell_measures"))
    pointed = dict(zip(said[::2], said[1::2], strict=False)).get(f"{kind}:")
    holders = tuple(header for header in headers if pointed in header.heads)
    if pointed and holders:
        return [Candidate(pointed, 0, POINTED, 0, holders)]
    found = known_as(kind, headers)
    return [
        Candidate(name, order, how, 0, tuple(header for header in headers if name in header.heads))
        for name, (order, how) in found.items()
    ]


def _fitting(kind: str, one: Candidate, reference: Part, rules: TimeRules) -> Part:
    """The measure on the reference grid.

    Raises
    ------
    InputError : it lies on another grid or time axis.
    """
    known = {header.path for header in reference.headers}
    own = [header for header in one.headers if header.path in known]
    first = (own or list(one.headers))[0]
    axes = _axes(first, one.variable, reference)
    if axes.time is None:
        return _still(kind, one, [*own, *(header for header in one.headers if header.path not in known)], reference)
    part = whole_part(kind, one, one.headers, False, rules)
    _refuse_misfit(kind, part.grid, reference)
    if part.line is None or reference.line is None:
        raise InputError("it changes in time and the fields do not", where=first.place(one.variable))
    timeline.refuse_difference(kind, part.line, "temperature", reference.line)
    return part


def _still(kind: str, one: Candidate, headers: Sequence[Header], reference: Part) -> Part:
    """The first of the files whose grid is that of the reference."""
    trouble: GridcarbError | None = None
    for header in headers[:3]:
        try:
            grid = Grid(header, one.variable, _axes(header, one.variable, reference))
            _refuse_misfit(kind, grid, reference)
            return Part(one.variable, one.how, (header,), grid, None)
        except GridcarbError as error:
            trouble = trouble or error
    assert trouble is not None
    raise trouble


def _axes(header: Header, name: str, reference: Part) -> Axes:
    """The axes of a measure: those of the reference for dimensions of the same name and size, else by its own words."""
    head, theirs = header.heads[name], reference.axes
    sizes = dict(zip(head.dims, head.shape, strict=True))
    if all(dim in theirs.order and size == reference.grid.size(dim) for dim, size in sizes.items()):
        def there(coordinate: str | None) -> str | None:
            return coordinate if coordinate in header.heads else None

        return replace(
            theirs, time=theirs.time if theirs.time in head.dims else None,
            vertical=theirs.vertical if theirs.vertical in head.dims else None,
            horizontal=tuple(dim for dim in theirs.horizontal if dim in head.dims),
            time_coordinate=there(theirs.time_coordinate), vertical_coordinate=there(theirs.vertical_coordinate),
            latitude=there(theirs.latitude), longitude=there(theirs.longitude),
        )
    return header.axes_of(name)


def _refuse_misfit(kind: str, grid: Grid, reference: Part) -> None:
    """Horizontal places must be those of the reference, and the levels where the measure has levels."""
    if kind == "thickness" and not grid.axes.horizontal and grid.axes.vertical:
        # The same thickness in all columns.
        grids.refuse_other_levels(kind, grid, "temperature", reference.grid)
        return
    grids.refuse_other_place(kind, grid, "temperature", reference.grid)
    if grid.axes.vertical:
        grids.refuse_other_levels(kind, grid, "temperature", reference.grid)
