"""From settings to a checked collection: headers only, every disagreement told before any number is computed."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from gridcarb.axes import grid_kind
from gridcarb.errors import Faults, GridcarbError, InputError, Notice
from gridcarb.fields import ROLES
from gridcarb.sources import grid as grids
from gridcarb.sources import timeline
from gridcarb.sources.collection import Collection, FileRecord, RoleSource, TimeReading
from gridcarb.sources.conventions import MEASURES
from gridcarb.sources.dates import Units, stamps
from gridcarb.sources.describing import coordinates_of, names_kept
from gridcarb.sources.handles import look_again
from gridcarb.sources.headers import Header, read_header
from gridcarb.sources.lending import Lender, borrowed
from gridcarb.sources.locate import locate
from gridcarb.sources.measures import Measures, find_measures
from gridcarb.sources.parts import Part, TimeRules, field_of, whole_part
from gridcarb.sources.places import split
from gridcarb.sources.roles import Candidate, settle
from gridcarb.sources.settings import InputsSettings

REFERENCE = "temperature"


@dataclass(frozen=True, eq=False)
class Looked:
    """What the headers gave: path -> header or the error it failed with; role or measure -> headers of its files."""

    files: Mapping[str, Header | GridcarbError]
    groups: Mapping[str, Sequence[Header]]

    @property
    def records(self) -> dict[str, FileRecord]:
        """Path (with its group) -> record of those that could be read."""
        return {found.path: found.record for found in self.files.values() if isinstance(found, Header)}


@dataclass(frozen=True, eq=False)
class Explored:
    """Everything that could be made out: what was chosen for each role and measure, and the collection of what fits."""

    looked: Looked
    chosen: Mapping[str, Candidate]
    measures: Measures
    collection: Collection | None


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
    found = explore(settings, base, faults).collection
    faults.tell()
    assert found is not None  # or there would have been a fault
    return found


def explore(settings: InputsSettings, base: Path, faults: Faults) -> Explored:
    """As `gather`, with every error put by in `faults`."""
    look_again()
    looked = _look(settings, base, faults)
    if not any(looked.groups[role] for role in ROLES):
        return Explored(looked, {}, Measures(), None)
    told = {role: name for role in ROLES if (name := settings.role(role).variable)}
    chosen, notices = settle({role: looked.groups[role] for role in ROLES}, told, faults)
    rules = TimeRules(settings.time_gaps, settings.months)
    parts: dict[str, Part] = {}
    for role, one in chosen.items():
        alone = bool(settings.role(role).files)
        part = faults.attempt(whole_part, role, one, looked.groups[role], alone, rules)
        parts |= {role: part} if part else {}
    reference = parts.get(REFERENCE) or next(iter(parts.values()), None)
    if reference is None:
        return Explored(looked, chosen, Measures(), None)
    fitting: dict[str, Part] = {}
    for role, part in parts.items():
        told_of_it = faults.attempt(_checked, role, part, reference)
        if told_of_it is not None:
            notices += told_of_it
            fitting[role] = part
    measures = find_measures(looked.groups, settings, reference, rules, faults)
    notices += [*measures.notices, *_group_notices(looked), *_month_notices(reference)]
    notices += borrowed(reference.headers)
    collection = faults.attempt(_collection, fitting, reference, measures, looked.records, notices)
    return Explored(looked, chosen, measures, collection)


def _look(settings: InputsSettings, base: Path, faults: Faults) -> Looked:
    """Find and read all headers."""
    keys = [key for key in (*ROLES, *MEASURES) if settings.role(key).files]
    paths = {"": faults.attempt(locate, settings.files, base)}
    paths |= {key: faults.attempt(locate, settings.role(key).files, base) for key in keys}
    if all(found == [] for found in paths.values()):
        faults.put(InputError("the recipe names no input files", where="inputs",
                              mend="write `inputs: {files: [data/*.nc]}`"))
    files: dict[str, Header | GridcarbError] = {}
    for path in dict.fromkeys(path for group in paths.values() for path in group or ()):
        try:
            files[path] = read_header(path)
        except GridcarbError as error:
            files[path] = error
            faults.put(error)
    whole = {path: header for path, header in files.items() if isinstance(header, Header)}
    lender = Lender(list(whole.values()))
    whole = {path: lender.completed(header) for path, header in whole.items()}
    groups = {
        key: [whole[path] for path in paths.get(key, paths[""]) or () if path in whole] for key in (*ROLES, *MEASURES)
    }
    return Looked({**files, **whole}, groups)


def _collection(
    parts: Mapping[str, Part], reference: Part, measures: Measures, records: Mapping[str, FileRecord],
    notices: Sequence[Notice],
) -> Collection:
    names = [*names_kept(reference), *measures.names()]
    coordinates = coordinates_of(reference, names_kept(reference))
    coordinates |= {name: source for name, source in measures.sources(reference, names).items() if name not in coordinates}
    roles = {
        role: RoleSource(role, part.variable, part.how, field_of(part, reference, names)) for role, part in parts.items()
    }
    arrays = [source.array for source in roles.values()] + list(coordinates.values())
    paths = dict.fromkeys(segment.path for array in arrays for segment in array.segments)
    field = next(roles[role].array for role, part in parts.items() if part is reference)
    sizes = dict(zip(field.dims, field.shape, strict=True))
    return Collection(
        roles=roles, coordinates=coordinates, axes=reference.axes,
        kind=grid_kind(reference.headers[0].skeleton(reference.variable), reference.axes), sizes=sizes,
        files=tuple(records[path] for path in paths), attributes=dict(reference.headers[0].attrs), notices=tuple(notices),
        measures=measures.by_kind(), time=_time_reading(reference),
    )


def _time_reading(part: Part) -> TimeReading | None:
    """What the time axis says, also where it is a single moment without a dimension."""
    name, line = part.axes.time_coordinate, part.line
    if line is not None:
        said = str(part.headers[0].heads[name].attrs.get("units", "")).strip() if name else ""
        where = "unknown" if line.bounds is None else stamps(line.values, line.bounds, line.climatological)
        return TimeReading(
            name or "", part.axes.time, line.units.units, line.units.calendar, line.steps, line.units.date(line.values[0]),
            line.units.date(line.values[-1]), line.bounds is not None, line.climatological, where,
            said if said != line.units.units else "",
        )
    values = part.headers[0].whole(name) if name else None
    if name is None or values is None or not values.size:
        return None
    attrs, steps = part.headers[0].heads[name].attrs, values.ravel()
    units = Units.of(attrs)
    return TimeReading(name, None, units.units, units.calendar, 1, units.date(min(steps)), units.date(max(steps)),
                       "bounds" in attrs, "climatology" in attrs, "unknown", "")


def _group_notices(looked: Looked) -> list[Notice]:
    """Groups that were entered without being named."""
    entered = {path: header.path for path, header in looked.files.items()
               if isinstance(header, Header) and header.path != path and split(header.path)[1]}
    if not entered:
        return []
    path, first = next(iter(entered.items()))
    more = f" (and {len(entered) - 1} more files)" if len(entered) > 1 else ""
    return [Notice("group-entered", f"the fields of {path} lie in its group '{split(first)[1]}'{more}, which is read",
                   f"inputs: {{files: [{first}]}}")]


def _month_notices(part: Part) -> list[Notice]:
    found = _time_reading(part)
    if found is None or not found.told_in:
        return []
    return [Notice("months-in-days", f"times in '{found.told_in}' are told in '{found.units}', as the recipe says")]


def _checked(role: str, part: Part, reference: Part) -> list[Notice]:
    """Time axis and grid against the reference; what was let pass is told."""
    if part is reference:
        return list(part.line.notices) if part.line else []
    grids.refuse_difference(role, part.grid, REFERENCE, reference.grid)
    if part.line and reference.line:
        timeline.refuse_difference(role, part.line, REFERENCE, reference.line)
    elif part.line:
        raise InputError(
            f"{role} changes in time ({part.line.span()}), {REFERENCE} has no time dimension",
            where=part.headers[0].place(part.variable), mend=f"give files of {REFERENCE} on the same time axis",
        )
    elif reference.line:
        return [Notice(
            "constant-in-time",
            f"{role} has no time dimension: the same values are used at all {reference.line.steps} times",
            f"inputs: {{{role}: {part.variable}}}",
        )]
    return []
