"""Findings: everything an audit has to say, each fine, assumed or a stop."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import asdict, dataclass
from typing import Literal

from gridcarb.errors import GridcarbError, Notice
from gridcarb.harmonise import Decision

Level = Literal["fine", "assumed", "stop"]
LEVELS: tuple[Level, ...] = ("fine", "assumed", "stop")
"""From the best to the worst."""


@dataclass(frozen=True)
class Finding:
    """One thing found.

    level : fine (known from the files or the recipe), assumed (decided for the user), stop (nothing is computed before it
        is mended).
    subject : what it is about, in a word or two.
    text : what was found.
    where : file and variable, '' where it concerns all.
    cure : how to mend a stop, how to state what was assumed, how to make better what is fine; '' if there is nothing to do.
    """

    level: Level
    subject: str
    text: str
    where: str = ""
    cure: str = ""

    def as_dict(self) -> dict[str, str]:
        """For machines."""
        return asdict(self)

    def lines(self) -> list[str]:
        """For people: what, where and the cure."""
        verbs = {"stop": "to mend it", "assumed": "to state it", "fine": "better"}
        told = [f"{self.where}: {self.text}" if self.where else self.text]
        return told + ([f"{verbs[self.level]}: {self.cure}"] if self.cure else [])


def stops(subject: str, errors: Iterable[GridcarbError]) -> list[Finding]:
    """What would end a run."""
    return [Finding("stop", subject, error.what, error.where, error.mend) for error in errors]


def assumptions(notices: Iterable[Notice]) -> list[Finding]:
    """What was decided for the user, each once."""
    each = {(notice.code, notice.text): notice for notice in notices}
    return [
        Finding("assumed", notice.code.replace("_", " ").replace("-", " "), notice.text, cure=notice.state)
        for notice in each.values()
    ]


def readings(decisions: Iterable[Decision]) -> list[Finding]:
    """How things are read, and because of what."""
    return [Finding("fine", each.subject, f"{each.reading} ({each.because})") for each in decisions]


def worst(findings: Sequence[Finding]) -> Level:
    """The worst level among the findings."""
    return max((finding.level for finding in findings), key=LEVELS.index, default="fine")
