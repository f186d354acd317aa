"""Input conventions: by which words each role is known. One file a convention, words kept as data.

A convention with a smaller `order` is believed first; two variables known equally well are a question for the user.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from gridcarb.fields import FIELDS
from gridcarb.shelf import Shelf, load_folder

MEASURES: tuple[str, ...] = ("area", "volume", "thickness", "sea_fraction", "basin", "sea_floor_depth")
"""What a file may tell of the cells themselves, beside their place."""


@dataclass(frozen=True)
class Convention:
    """One table of words.

    key : its name on the shelf.
    title : how a person would say it, as in "by name (title)".
    order : rank among the conventions, smallest first.
    attribute : what the words are compared with: the attribute standard_name, or the variable's name (in lower case).
    words : role, or kind of measure -> words.
    """

    key: str
    title: str
    order: int
    attribute: Literal["standard_name", "name"]
    words: Mapping[str, tuple[str, ...]]

    def __post_init__(self) -> None:
        for role in self.words:
            if role not in MEASURES:
                FIELDS[role]

    def how(self) -> str:
        """The kind of match, in words."""
        return "by standard_name" if self.attribute == "standard_name" else f"by name ({self.title})"


CONVENTIONS: Shelf[Convention] = Shelf("convention")


def declare(entry: Convention) -> Convention:
    """Put a convention on the shelf."""
    return CONVENTIONS.put(entry.key, entry)


load_folder(__name__)
CONVENTIONS.close()
