"""From the words of a recipe to paths."""

from __future__ import annotations

import glob
import os
from collections.abc import Sequence
from pathlib import Path

from gridcarb.errors import InputError, near_words
from gridcarb.sources.places import is_url, join, localised, reached, split


def locate(patterns: Sequence[str], base: Path) -> list[str]:
    """Absolute paths (or URLs) of all files and stores meant, each once, in the order given (globs sorted).

    Parameters
    ----------
    patterns : paths, globs (`**` crosses folders) or URLs that fsspec opens; paths are relative to `base`, `~` is the home
        folder. `#GROUP` behind any of them names a group of the files.

    Raises
    ------
    InputError : a glob without a match, a path with nothing there, or a URL that cannot be reached.
    """
    found: dict[str, str] = {}
    for pattern in patterns:
        for name, match in _matches(localised(pattern), base):
            # Links keep their names, which say more than what they point at; a file meant twice counts once.
            found.setdefault(name, match)
    return list(found.values())


def _matches(pattern: str, base: Path) -> list[tuple[str, str]]:
    """Every file meant: its true name, and the name it is called by."""
    if is_url(pattern):
        store, group = split(pattern)
        matches = _behind_url(store)
        return [(join(match, group), join(match, group)) for match in matches]
    named = str(base.absolute() / Path(pattern).expanduser())
    # A name may hold the sign of a group itself.
    full, group = (named, "") if glob.has_magic(named) and glob.glob(named, recursive=True) else split(named)
    if Path(full).exists():
        matches = [full]
    elif glob.has_magic(full):
        matches = sorted(glob.glob(full, recursive=True))
    else:
        raise InputError("there is no such file", where=full, mend=_near(full))
    if not matches:
        raise InputError(f"no file matches '{pattern}'", where=full, mend=_near(full))
    return [(join(os.path.realpath(match), group), join(os.path.normpath(match), group)) for match in matches]


def _behind_url(url: str) -> list[str]:
    with reached(url) as (system, inner):
        if not glob.has_magic(inner):
            return [url.rstrip("/")]
        matches = [system.unstrip_protocol(match) for match in sorted(system.glob(inner.rstrip("/")))]
    if not matches:
        raise InputError("no file matches the URL", where=url, mend="correct `inputs: files` in the recipe")
    return matches


def _near(full: str) -> str:
    """What is there instead, as far up as something exists."""
    folder = Path(full).parent
    while glob.has_magic(str(folder)) or not folder.exists():
        folder = folder.parent
    names = sorted(name for name in os.listdir(folder) if not name.startswith(".")) if folder.is_dir() else []
    shown = (near_words(Path(full).name, names) or names)[:8]
    listing = ", ".join(shown) + " ..." * (len(shown) < len(names))
    return f"correct `inputs: files` in the recipe (paths are relative to it); {folder} holds {listing or 'nothing'}"
