"""Every library the package imports is declared: the tests' own libraries must not stand in for one that is forgotten."""

from __future__ import annotations

import ast
import re
import sys
import tomllib
from collections.abc import Iterator
from importlib.metadata import packages_distributions
from pathlib import Path

ROOT = Path(__file__).parents[2]


def imported(path: Path) -> Iterator[str]:
    """The libraries a file names in an import, wherever it stands."""
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            yield from (alias.name.partition(".")[0] for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module:
            yield node.module.partition(".")[0]


def spelled(name: str) -> str:
    return re.sub(r"[-_.]+", "-", re.split(r"[<>=!~\[; ]", name)[0]).lower()


def test_what_is_imported_is_declared() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]
    optional = [name for extra, names in project["optional-dependencies"].items() if extra != "test" for name in names]
    declared = {spelled(name) for name in [*project["dependencies"], *optional]}
    owners = packages_distributions()
    names = {name for path in (ROOT / "gridcarb").rglob("*.py") for name in imported(path)}
    others = sorted(names - set(sys.stdlib_module_names) - {"gridcarb"})
    assert len(others) > 15
    missing = [name for name in others if not {spelled(owner) for owner in owners.get(name, [])} & declared]
    assert missing == []
