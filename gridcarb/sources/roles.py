"""Which variable plays which role: by CF standard name first, then by the names of the conventions, or as told."""

from __future__ import annotations

import functools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import xarray as xr

from gridcarb.errors import Faults, InputError, Notice, UnknownWordError, did_you_mean
from gridcarb.fields import REQUIRED_ROLES, ROLES
from gridcarb.sources.collection import FileRecord
from gridcarb.sources.conventions import CONVENTIONS
from gridcarb.sources.headers import Header
from gridcarb.sources.stored import Head
from gridcarb.sources.zarr_store import heads_of

TOLD = "as told"


@dataclass(frozen=True)
class Candidate:
    """A variable that can play a role: how it was recognised, its levels (0: no vertical dimension), its files."""

    variable: str
    order: int
    how: str
    levels: int
    headers: tuple[Header, ...]

    @property
    def head(self) -> Head:
        """The variable as the first of its files has it."""
        return self.headers[0].heads[self.variable]

    def describe(self) -> str:
        """For the question which of several it is to be."""
        said = str(self.head.attrs.get("standard_name") or self.head.attrs.get("long_name") or "")
        levels = f"{self.levels} levels" if self.levels else "no levels"
        return f"'{self.variable}' ({said + ', ' if said else ''}{levels})"


def role_of_standard_name(standard_name: object) -> str | None:
    """The role a CF standard name stands for."""
    for convention in CONVENTIONS.values():
        if convention.attribute == "standard_name":
            for role, known in convention.words.items():
                if standard_name in known:
                    return role
    return None


def candidates(role: str, headers: Sequence[Header]) -> list[Candidate]:
    """The variables known best as `role` in any of the files; several if they are known equally well."""
    return [_candidate(name, order, how, headers) for name, (order, how) in known_as(role, headers).items()]


def known_as(role: str, headers: Sequence[Header]) -> dict[str, tuple[int, str]]:
    """Name -> rank and manner of the variables known best as a role or measure."""
    found: dict[str, tuple[int, str]] = {}
    for header in headers:
        for name, head in header.heads.items():
            match = None if name in found else roles_of(head).get(role)
            if match and name not in header.pointed and name not in head.dims:
                found[name] = match
    best = min((order for order, _ in found.values()), default=0)
    return {name: match for name, match in found.items() if match[0] == best}


def roles_of(head: Head) -> Mapping[str, tuple[int, str]]:
    """Role or measure -> rank and manner in which a variable is known as it."""
    standard_name = head.attrs.get("standard_name")
    if head.dtype.kind not in "iuf":
        return {}
    return _roles_of_words(head.name.lower(), standard_name.strip() if isinstance(standard_name, str) else "")


@functools.lru_cache(maxsize=10_000)
def _roles_of_words(name: str, standard_name: str) -> Mapping[str, tuple[int, str]]:
    """A standard name of something else rules out what the name says."""
    found: dict[str, tuple[int, str]] = {}
    for convention in sorted(CONVENTIONS.values(), key=lambda entry: entry.order):
        by_name = convention.attribute == "name"
        for role, known in convention.words.items():
            if (name if by_name else standard_name) in known and not (by_name and standard_name):
                found.setdefault(role, (convention.order, convention.how()))
    return found


def _candidate(name: str, order: int, how: str, headers: Sequence[Header]) -> Candidate:
    holders = tuple(header for header in headers if name in header.heads)
    vertical = holders[0].axes_of(name).vertical
    head = holders[0].heads[name]
    levels = head.shape[head.dims.index(vertical)] if vertical else 0
    return Candidate(name, order, how, levels, holders)


def told(role: str, name: str, headers: Sequence[Header]) -> Candidate:
    """The variable the user named.

    Raises
    ------
    InputError : it is in none of the files, or its standard_name says it is another role.
    """
    where = _files(headers)
    if not any(name in header.heads for header in headers):
        known = sorted({known for header in headers for known in _fields_of(header)})
        raise InputError(
            f"there is no variable '{name}' to be the {role}", where=where,
            mend=f"correct `inputs: {{{role}: {name}}}` in the recipe; {did_you_mean(name, known)}",
        )
    candidate = _candidate(name, 0, TOLD, headers)
    other = role_of_standard_name(candidate.head.attrs.get("standard_name"))
    if other and other != role:
        raise InputError(
            f"the recipe says '{name}' is the {role}, but its standard_name "
            f"'{candidate.head.attrs['standard_name']}' says {other}",
            where=candidate.headers[0].place(name),
            mend=f"write `inputs: {{{other}: {name}}}` (are two roles swapped?), or correct the standard_name",
        )
    return candidate


def _fields_of(header: Header) -> list[str]:
    """Variables that are no coordinates."""
    return [
        name for name, head in header.heads.items() if name not in header.pointed and head.dims and name not in head.dims
    ]


def settle(
    groups: Mapping[str, Sequence[Header]], names: Mapping[str, str], faults: Faults
) -> tuple[dict[str, Candidate], list[Notice]]:
    """One variable for every role that has one; roles with two, or none where one is needed, are put by as faults.

    Parameters
    ----------
    groups : role -> headers of the files it may lie in.
    names : role -> variable, as the user told.
    """
    sought = {role: faults.attempt(_known, role, headers, names.get(role)) for role, headers in groups.items()}
    found = {role: several for role, several in sought.items() if several}
    lacking = [role for role in REQUIRED_ROLES if sought.get(role, []) == []]
    faults.attempt(_refuse_missing, lacking, groups)
    found, notices = _of_one_depth(found)
    settled = {role: faults.attempt(_only, role, found[role]) for role in ROLES if found.get(role)}
    chosen = {role: one for role, one in settled.items() if one}
    notices += [
        Notice("role-by-name", f"{role} is '{one.variable}', recognised {one.how}: it has no standard_name",
               f"inputs: {{{role}: {one.variable}}}")
        for role, one in chosen.items() if one.how.startswith("by name")
    ]
    return chosen, notices


def _known(role: str, headers: Sequence[Header], name: str | None) -> list[Candidate]:
    return candidates(role, headers) if name is None else [told(role, name, headers)]


def _of_one_depth(found: dict[str, list[Candidate]]) -> tuple[dict[str, list[Candidate]], list[Notice]]:
    """Water columns where every needed role has one, else surface fields: never a mixture."""
    deep = all(any(one.levels for one in found[role]) for role in REQUIRED_ROLES if role in found)
    kept, notices = {}, []
    for role, several in found.items():
        fitting = [one for one in several if bool(one.levels) == deep or one.how == TOLD]
        aside = [one for one in several if one not in fitting]
        kept[role] = several if role in REQUIRED_ROLES and not fitting else fitting
        if aside and kept[role] is fitting:
            names = ", ".join(f"'{one.variable}'" for one in aside)
            reason = "has no levels while the other roles have" if deep else "has levels while other roles have none"
            state = f"inputs: {{{role}: {fitting[0].variable}}}" if fitting else f"reading: {{{role}: assume zero}}"
            notices.append(Notice("left-aside", f"{names} was not taken as {role}: it {reason}", state))
    return kept, notices


def _only(role: str, several: Sequence[Candidate]) -> Candidate:
    if len(several) == 1:
        return several[0]
    lines = " or ".join(f"`inputs: {{{role}: {one.variable}}}`" for one in several)
    raise InputError(
        f"{len(several)} variables could be the {role}: " + ", ".join(one.describe() for one in several),
        where="; ".join(dict.fromkeys(_files(one.headers) for one in several)), mend=f"write {lines} in the recipe",
    )


def _refuse_missing(missing: Sequence[str], groups: Mapping[str, Sequence[Header]]) -> None:
    if not missing:
        return
    headers = [header for role in missing for header in groups[role]]
    there = sorted({name for header in headers for name in _fields_of(header)})
    raise InputError(
        f"no variable is known as {' or '.join(missing)}", where=_files(headers),
        mend="name it, for example `inputs: {" + missing[0] + ": NAME}` in the recipe, or add its files; the files hold "
        + (", ".join(there[:30]) or "no fields") + (" ..." if len(there) > 30 else ""),
    )


def _files(headers: Sequence[Header]) -> str:
    paths = list(dict.fromkeys(header.path for header in headers if header.path))
    return ", ".join(paths[:2]) + (f" and {len(paths) - 2} more" if len(paths) > 2 else "")


def find_roles(ds: xr.Dataset, names: Mapping[str, str] | None = None) -> dict[str, str]:
    """Role -> variable name in a dataset in memory (decoded or raw), by the same rules as for files.

    Parameters
    ----------
    ds : any dataset; only its header is read.
    names : role -> variable name where the rules do not find it.

    Raises
    ------
    UnknownWordError : `names` speaks of something that is no role.
    InputError : no dataset, or a needed role has no variable, two, or one whose standard_name contradicts.
    """
    if not isinstance(ds, xr.Dataset):
        raise InputError(f"this is a {type(ds).__name__}, not an xarray Dataset", where="dataset",
                         mend="give one Dataset that holds temperature, salinity, DIC and alkalinity")
    for word in names or {}:
        if word not in ROLES:
            raise UnknownWordError(f"there is no role '{word}'", mend=did_you_mean(word, ROLES))
    header = Header("", heads_of(ds.variables), ds.attrs, {}, FileRecord("", 0, 0, ""))
    faults = Faults()
    chosen, _ = settle(dict.fromkeys(ROLES, (header,)), names or {}, faults)
    faults.tell()
    return {role: one.variable for role, one in chosen.items()}
