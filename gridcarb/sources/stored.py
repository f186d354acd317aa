"""What every open file or store offers: its variables without values, and parts of their values as stored."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
import numpy.typing as npt

from gridcarb.errors import InputError

Key = tuple[Any, ...]
"""One integer, slice with a positive step or sorted 1-D integer array for each dimension; arrays select each dimension
by itself."""

Lengths = tuple[tuple[int, ...], "np.dtype[Any]", tuple[int, ...] | None]

POINTERS = ("coordinates", "bounds", "climatology")


@dataclass(frozen=True)
class Head:
    """One variable without its values; `origin` is the file it lies in, where that is another than the header's."""

    name: str
    dims: tuple[str, ...]
    shape: tuple[int, ...]
    dtype: np.dtype[Any]
    attrs: Mapping[str, Any]
    chunks: tuple[int, ...] | None = None
    compression: str = ""
    origin: str = ""


class Stored(Protocol):
    """An open file or store, at one of its groups; the caller holds the lock of its kind."""

    group: str
    attrs: Mapping[str, Any]

    def heads(self) -> dict[str, Head]:
        """All variables by name."""
        ...

    def read(self, name: str, key: Key) -> npt.NDArray[Any]:
        """Part of a variable; KeyError if there is no such variable."""
        ...

    def layout(self, name: str) -> Lengths:
        """Shape, type and chunks of a variable, None where it is contiguous; KeyError if there is no such variable."""
        ...

    def close(self) -> None:
        """Let go of the file."""
        ...


def words(text: object) -> list[str]:
    """The words of an attribute that lists variables."""
    return text.split() if isinstance(text, str) else []


def choose_group(holders: Mapping[str, list[Head]], where: str) -> str:
    """The group to read when none is named: the only one that holds fields; groups above it lend it their variables.

    Parameters
    ----------
    holders : group ('' for the top level) -> the variables that lie in it itself.

    Raises
    ------
    InputError : the fields lie in several groups that are not one below the other.
    """
    filled = sorted(group for group, heads in holders.items() if any(not _describes(head) for head in heads))
    if "" in filled or not filled:
        return ""
    deepest = max(filled, key=len)
    if all(f"{deepest}/".startswith(f"{group}/") for group in filled):
        return deepest
    raise InputError(
        f"the fields of the file lie in several groups ({', '.join(filled)})", where=where,
        mend="name the group behind the file, as in `inputs: {files: [" + f"{where}#{filled[0]}" + "]}`",
    )


def _describes(head: Head) -> bool:
    """Whether a variable looks like a part of a grid and not like a field."""
    placing = head.attrs.get("standard_name") in ("latitude", "longitude")
    return placing or len(head.dims) <= 1 or head.dtype.kind not in "iuf"


def no_group(group: str, known: list[str], where: str) -> InputError:
    """The error for a group that is not there."""
    return InputError(f"there is no group '{group}'", where=where,
                      mend="correct `inputs: files`; the groups are " + (", ".join(known[:20]) or "none"))
