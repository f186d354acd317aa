"""The journal of a run as a JSON file, written whole or not at all."""

from __future__ import annotations

import json
import os
from collections.abc import Mapping
from dataclasses import asdict, is_dataclass
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np

from gridcarb.write.disk import room_for, settle

JOURNAL = "journal.json"
"""The name of the journal in a result folder; it is also what a result folder is known by."""


def write_journal(path: Path, content: Mapping[str, object]) -> None:
    """Write `content` to `path` under a temporary name, then rename.

    NumPy numbers, dataclasses, paths and times are turned into plain JSON. NaN and infinity have no JSON form and
    raise ValueError: a journal states None instead.
    """
    text = json.dumps(content, indent=2, ensure_ascii=False, allow_nan=False, default=_plain) + "\n"
    encoded = text.encode("utf-8")
    temporary = path.with_name(f".{path.name}.{os.getpid()}")
    try:
        with room_for(path, len(encoded)):
            temporary.write_bytes(encoded)
            settle(temporary, path)
    finally:
        temporary.unlink(missing_ok=True)


def read_journal(path: Path) -> dict[str, Any]:
    """The journal at `path`; empty if there is none that can be read."""
    try:
        found = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return found if isinstance(found, dict) else {}


def _plain(value: object) -> Any:
    if isinstance(value, (np.generic, np.ndarray)):
        return value.tolist()
    if isinstance(value, datetime):
        return value.isoformat()
    if isinstance(value, Path):
        return str(value)
    if is_dataclass(value) and not isinstance(value, type):
        return asdict(value)
    if isinstance(value, (set, frozenset)):
        return sorted(value)
    raise TypeError(f"a journal cannot hold a {type(value).__name__}")
