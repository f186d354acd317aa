"""Time axes of many files made into one: in order, in one unit, without overlap, and without gaps nobody meant."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import cftime
import numpy as np

from gridcarb.errors import InputError, Notice
from gridcarb.sources.dates import Numbers, Units

_LONG_STEP = 1.5
"""Times the median step: months of 28 to 31 days and leap years pass, a missing month or year does not."""
_SHORT_STEP = 0.5
_CLOSE = 1e-3
"""Share of a step by which times or bounds may differ and still be the same."""


@dataclass(frozen=True)
class Piece:
    """The time axis of one file; `bounds` has shape (steps, 2) or is None, and may be those of a climatology."""

    path: str
    values: Numbers
    bounds: Numbers | None
    units: Units
    climatological: bool = False


@dataclass(frozen=True)
class Timeline:
    """One axis over all files.

    order : for each stretch of the axis, the place of its file in the list that was given.
    starts : where each stretch begins; one entry more than there are files.
    """

    values: Numbers
    bounds: Numbers | None
    units: Units
    order: tuple[int, ...]
    starts: tuple[int, ...]
    paths: tuple[str, ...]
    climatological: bool = False
    notices: tuple[Notice, ...] = ()

    @property
    def steps(self) -> int:
        """Length of the axis."""
        return len(self.values)

    def path_at(self, step: int) -> str:
        """The file a step lies in."""
        return self.paths[int(np.searchsorted(self.starts, step, side="right")) - 1]

    def span(self) -> str:
        """First and last date, and how many steps."""
        return f"{self.units.date(self.values[0])} to {self.units.date(self.values[-1])} ({self.steps} steps)"


def build(role: str, pieces: Sequence[Piece], gaps: str) -> Timeline:
    """Join the time axes of the files of one role; `gaps` is 'refuse' or 'accept'.

    Raises
    ------
    InputError : times that are missing, unsorted or duplicated, calendars that differ, files that overlap, gaps.
    """
    for piece in pieces:
        _refuse_undated(role, piece)
        _refuse_disorder(role, piece)
    begins = [float(piece.values[0]) for piece in _in_one_unit(role, pieces)]
    order = sorted(range(len(pieces)), key=lambda place: begins[place])
    # The earliest file gives the joined axis its units.
    pieces = _in_one_unit(role, [pieces[place] for place in order])
    bounds = [piece.bounds for piece in pieces if piece.bounds is not None]
    line = Timeline(
        values=np.concatenate([piece.values for piece in pieces]),
        bounds=np.concatenate(bounds) if len(bounds) == len(pieces) else None,
        units=pieces[0].units,
        order=tuple(order),
        starts=tuple(int(n) for n in np.cumsum([0, *(len(piece.values) for piece in pieces)])),
        paths=tuple(piece.path for piece in pieces),
        climatological=any(piece.climatological for piece in pieces),
    )
    _refuse_overlap(role, line)
    return replace(line, notices=_gaps(role, line, gaps))


def _refuse_undated(role: str, piece: Piece) -> None:
    """Times counted since a date must give dates; months and years have no fixed length in most calendars."""
    units, calendar = piece.units.units, piece.units.calendar
    if " since " not in units:
        return
    try:
        cftime.num2date(0, units, calendar)
    except (ValueError, TypeError, OverflowError) as error:
        raise InputError(
            f"the times are no dates in the calendar {calendar}: '{units}' ({error})", where=f"{piece.path}: {role}",
            mend="write the time axis of the file in `days since` a date",
        ) from None


def _refuse_disorder(role: str, piece: Piece) -> None:
    values, where = piece.values, f"{piece.path}: {role}"
    if not len(values):
        raise InputError("the time axis has no steps", where=where, mend="leave the file out of `inputs: files`")
    if not np.all(np.isfinite(values)):
        raise InputError("the time axis has missing values", where=where, mend="repair the time coordinate of the file")
    steps = np.diff(values.astype(np.float64))
    if np.any(steps == 0):
        twice = piece.units.date(values[int(np.argmax(steps == 0))])
        raise InputError(f"the time {twice} is there twice", where=where, mend="remove one of the two from the file")
    if np.any(steps < 0):
        place = int(np.argmax(steps < 0))
        raise InputError(
            f"the times are not sorted: {piece.units.date(values[place])} is followed by "
            f"{piece.units.date(values[place + 1])}", where=where, mend="sort the file along its time axis",
        )


def _in_one_unit(role: str, pieces: Sequence[Piece]) -> list[Piece]:
    """All pieces in the units of the first."""
    first = pieces[0]
    return [piece if piece is first else in_units(role, piece, first) for piece in pieces]


def in_units(role: str, piece: Piece, model: Piece) -> Piece:
    """A piece with its times told in the units of `model`."""
    ours, theirs = piece.units, model.units
    if ours == theirs:
        return piece
    if ours.calendar != theirs.calendar:
        raise InputError(
            f"the calendars differ: {theirs.calendar} in {model.path}, {ours.calendar} here",
            where=f"{piece.path}: {role}", mend="use files of one calendar; gridcarb never converts between calendars",
        )
    try:
        values = _retold(piece.values, ours, theirs)
        bounds = None if piece.bounds is None else _retold(piece.bounds, ours, theirs)
    except (ValueError, TypeError, OverflowError):
        raise InputError(
            f"the time units '{ours.units}' cannot be told in those of {model.path}, '{theirs.units}'",
            where=f"{piece.path}: {role}", mend="write one time unit, such as `days since 1850-01-01`, into all files",
        ) from None
    return replace(piece, values=values, bounds=bounds, units=theirs)


def _retold(values: Numbers, ours: Units, theirs: Units) -> Numbers:
    """The same instants in other units; a mere shift of the epoch stays exact to the last bit of the numbers."""
    numbers = values.astype(np.float64)
    if ours.units.split()[:1] == theirs.units.split()[:1]:
        epoch = cftime.num2date(0, ours.units, ours.calendar)
        return numbers + float(cftime.date2num(epoch, theirs.units, theirs.calendar))
    dates = cftime.num2date(numbers, ours.units, ours.calendar)
    return np.asarray(cftime.date2num(dates, theirs.units, theirs.calendar), dtype=np.float64)


def _refuse_overlap(role: str, line: Timeline) -> None:
    for seam in line.starts[1:-1]:
        before, after = line.values[seam - 1], line.values[seam]
        if after > before and not _short_join(line, seam):
            continue
        ours, theirs = line.path_at(seam), line.path_at(seam - 1)
        raise InputError(
            f"the files overlap in time: {theirs} goes to {line.units.date(before)}, {ours} begins at "
            f"{line.units.date(after)}",
            where=f"{ours}: {role}", mend="leave one of the two out of `inputs: files`, or cut it to the time it adds",
        )


def _short_join(line: Timeline, seam: int) -> bool:
    """Whether the step from one file to the next is too short to be a step of this axis."""
    bounds = _usable_bounds(line)
    step = float(line.values[seam] - line.values[seam - 1])
    if bounds is not None:
        return bool(bounds[seam, 0] < bounds[seam - 1, 1] - _CLOSE * step)
    return line.steps > 3 and step < _SHORT_STEP * float(np.median(np.diff(line.values)))


def _usable_bounds(line: Timeline) -> Numbers | None:
    """Bounds that are intervals around their times; others (snapshots, climatologies) say nothing of gaps."""
    if line.bounds is None or line.climatological:
        return None
    lower, upper = line.bounds[:, 0], line.bounds[:, 1]
    inside = (lower <= line.values) & (line.values <= upper) & (lower < upper)
    return line.bounds if bool(np.all(inside)) else None


def _gaps(role: str, line: Timeline, gaps: str) -> tuple[Notice, ...]:
    places = _gap_places(line)
    if not len(places):
        return ()
    told = [f"{line.units.date(line.values[place])} and {line.units.date(line.values[place + 1])}" for place in places]
    text = "time steps are missing between " + ", ".join(told[:3])
    text += f" and at {len(told) - 3} more places" if len(told) > 3 else ""
    first = int(places[0])
    where = " and ".join(dict.fromkeys((line.path_at(first), line.path_at(first + 1))))
    if gaps == "refuse":
        raise InputError(
            text, where=f"{where}: {role}",
            mend="add the missing files, or write `inputs: {time_gaps: accept}` in the recipe",
        )
    return (Notice("time-gap", text, "inputs: {time_gaps: accept}"),)


def _gap_places(line: Timeline) -> Numbers:
    """Steps after which something is missing: by bounds that do not meet, else by steps longer than the others."""
    if line.steps < 2:
        return np.empty(0, dtype=np.int64)
    bounds = _usable_bounds(line)
    if bounds is not None:
        holes = bounds[1:, 0].astype(np.float64) - bounds[:-1, 1]
        lengths = (bounds[:, 1] - bounds[:, 0]).astype(np.float64)
        return np.flatnonzero(holes > _CLOSE * lengths[:-1])
    steps = np.diff(line.values.astype(np.float64))
    return np.flatnonzero(steps > _LONG_STEP * np.median(steps))


def refuse_difference(role: str, line: Timeline, reference_role: str, reference: Timeline) -> None:
    """All roles that have a time axis share one.

    Raises
    ------
    InputError : another number of steps, or other times.
    """
    joined = Piece(line.paths[0], line.values, None, line.units)
    model = Piece(reference.paths[0], reference.values, None, reference.units)
    values = in_units(role, joined, model).values
    step = float(np.min(np.diff(reference.values))) if reference.steps > 1 else 1.0
    if len(values) != reference.steps:
        what = f"{role} covers {line.span()}, {reference_role} covers {reference.span()}"
    elif np.all(np.abs(values - reference.values) <= _CLOSE * step):
        return
    else:
        place = int(np.argmax(np.abs(values - reference.values) > _CLOSE * step))
        what = (
            f"step {place + 1} of {role} is {line.units.date(line.values[place])}, of {reference_role} "
            f"{reference.units.date(reference.values[place])}"
        )
    raise InputError(
        f"the time axes of two roles differ: {what}", where=f"{line.paths[0]}: {role}",
        mend=f"give files of {role} on the time axis of {reference_role}"
        + (", or without a time dimension if it is constant in time" if role in ("phosphate", "silicate") else ""),
    )
