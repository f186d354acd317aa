"""From the words of a recipe to paths."""

from __future__ import annotations

import glob
import os
from collections.abc import Sequence
from pathlib import Path

from gridcarb.errors import InputError, near_words


def locate(patterns: Sequence[str], base: Path) -> list[str]:
    """Absolute paths of all files and stores meant, each once, in the order given (globs sorted).

    Parameters
    ----------
    patterns : paths or globs (`**` crosses folders), relative to `base`; `~` is the home folder.

    Raises
    ------
    InputError : a glob without a match, or a path with nothing there.
    """
    found: dict[str, str] = {}
    for pattern in patterns:
        full = str(base.absolute() / Path(pattern).expanduser())
        if Path(full).exists():
            matches = [full]
        elif glob.has_magic(full):
            matches = sorted(glob.glob(full, recursive=True))
        else:
            raise InputError("there is no such file", where=full, mend=_near(full))
        if not matches:
            raise InputError(f"no file matches '{pattern}'", where=full, mend=_near(full))
        for match in matches:
            # Links keep their names, which say more than what they point at; a file meant twice counts once.
            found.setdefault(os.path.realpath(match), os.path.normpath(match))
    return list(found.values())


def _near(full: str) -> str:
    """What is there instead, as far up as something exists."""
    folder = Path(full).parent
    while glob.has_magic(str(folder)) or not folder.exists():
        folder = folder.parent
    names = sorted(name for name in os.listdir(folder) if not name.startswith(".")) if folder.is_dir() else []
    shown = (near_words(Path(full).name, names) or names)[:8]
    listing = ", ".join(shown) + " ..." * (len(shown) < len(names))
    return f"correct `inputs: files` in the recipe (paths are relative to it); {folder} holds {listing or 'nothing'}"
