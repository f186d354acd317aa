"""Errors and notices: the two ways gridcarb speaks up.

An error says *where*, *what* and *how to mend it*, in three lines. Every class takes only keyword arguments with
defaults besides the first, so that an error survives pickling between workers.

A notice is a decision the program took for the user. It is printed once, kept in the journal and written into the
outputs, always with the words that would state the decision in a recipe.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Callable, Iterable
from dataclasses import asdict, dataclass
from typing import ParamSpec, TypeVar

P = ParamSpec("P")
R = TypeVar("R")


class GridcarbError(Exception):
    """The root of the family.

    Parameters
    ----------
    what : what is wrong, in one sentence.
    where : file, recipe line, variable or block it concerns.
    mend : what the user can do about it.

    `others` holds what else was found wrong by the same checks, so that all of it can be mended at once.
    """

    exit_code = 1
    others: tuple[GridcarbError, ...] = ()
    words_for_others = "and {} more:"

    def __init__(self, what: str = "", *, where: str = "", mend: str = "") -> None:
        super().__init__(what)
        self.what = what
        self.where = where
        self.mend = mend

    def __str__(self) -> str:
        lines = [line for line in (self.where, self.what) if line]
        if self.mend:
            lines.append(f"to mend it: {self.mend}")
        if self.others:
            lines.append(self.words_for_others.format(len(self.others)))
        return "\n".join([*lines, *(str(other) for other in self.others)])


class UnknownWordError(GridcarbError, ValueError):
    """A field, set or key nobody declared."""

    exit_code = 2


class UnitsError(GridcarbError, ValueError):
    """Units that are missing, cannot be read, or do not fit the quantity."""

    exit_code = 3


class InputError(GridcarbError, ValueError):
    """Input data that cannot be read, or cannot be understood safely."""

    exit_code = 3


class OutputError(GridcarbError, OSError):
    """A result that exists already, cannot be written, or no longer fits on the disk."""

    exit_code = 4

    def __str__(self) -> str:
        return GridcarbError.__str__(self)


class BudgetError(GridcarbError):
    """A run that would not fit the memory it was allowed."""

    exit_code = 5


class BlockError(GridcarbError):
    """A block of a run that failed."""

    exit_code = 6
    words_for_others = "the first {} of them:"


class EngineError(GridcarbError):
    """Workers that cannot be reached, or cannot do what a run asks of them."""

    exit_code = 7


class DamageError(GridcarbError):
    """A result that is not as it was written."""

    exit_code = 8


@dataclass(frozen=True)
class Fault:
    """One fault of a recipe: its line (1-based, 0 if unknown), dotted key path, what is wrong, how to mend it."""

    line: int
    key: str
    what: str
    mend: str = ""

    def render(self, source: str) -> str:
        place = f"{source}:{self.line}" if self.line else source
        text = f"{place}: {self.key}\n    {self.what}" if self.key else f"{place}\n    {self.what}"
        return f"{text}\n    to mend it: {self.mend}" if self.mend else text


class RecipeError(GridcarbError, ValueError):
    """A recipe with faults; all of them are told at once."""

    exit_code = 2

    def __init__(self, what: str = "", *, where: str = "", mend: str = "", faults: tuple[Fault, ...] = ()) -> None:
        super().__init__(what, where=where, mend=mend)
        self.faults = faults

    def __str__(self) -> str:
        return "\n".join([self.what, *(fault.render(self.where) for fault in self.faults)])


class Faults:
    """Errors put by, so that the first does not hide the next.

    The checks go on with what is whole; `tell` raises what was found, the rest of it in the `others` of the first.
    """

    def __init__(self) -> None:
        self.found: list[GridcarbError] = []

    def attempt(self, function: Callable[P, R], /, *args: P.args, **words: P.kwargs) -> R | None:
        """What `function` gives; None if it raised, and the error is put by."""
        try:
            return function(*args, **words)
        except GridcarbError as error:
            self.put(error)
            return None

    def put(self, error: GridcarbError) -> None:
        """Put an error by, and those it brings along as their own; one fault of several places is told once, with all."""
        others, error.others = error.others, ()
        for each in (error, *others):
            same = next((known for known in self.found if _gist(known) == _gist(each)), None)
            if same is None:
                self.found.append(each)
            elif each.where not in same.where:
                path, _, name = each.where.rpartition(": ")
                same.where += f", {name}" if path and same.where.startswith(f"{path}: ") else f"; {each.where}"

    def tell(self) -> None:
        """Raise what was found, if anything."""
        if self.found:
            first, *rest = self.found
            first.others = tuple(rest)
            raise first


def _gist(error: GridcarbError) -> list[str]:
    """The words of an error without those that name its place: the same for one fault met in several roles."""
    names = set(re.findall(r"\w+", error.where.partition("; ")[0].rpartition(": ")[2]))
    return [word for word in re.findall(r"\w+|\S", error.what) if word not in names]


@dataclass(frozen=True)
class Notice:
    """A decision taken for the user.

    code : a short stable word, the same for every occurrence.
    text : what was decided, and why.
    state : the recipe line that would state it (or change it).
    """

    code: str
    text: str
    state: str = ""

    def as_dict(self) -> dict[str, str]:
        return asdict(self)


class NoticeWarning(UserWarning):
    """A notice, as the Python face gives it."""


def near_words(word: str, known: Iterable[str], most: int = 3) -> list[str]:
    """The known words that look most like `word`, best first."""
    words = list(known)
    lowered = {w.lower(): w for w in reversed(words)}
    found = difflib.get_close_matches(word.lower(), list(lowered), n=most, cutoff=0.55)
    return [lowered[w] for w in found]


def did_you_mean(word: str, known: Iterable[str]) -> str:
    """A sentence that suggests near words, or lists the known ones when they are few."""
    words = list(known)
    near = near_words(word, words)
    if near:
        return "did you mean " + " or ".join(f"'{w}'" for w in near) + "?"
    return "known here: " + ", ".join(words[:20]) + (" ..." if len(words) > 20 else "")
