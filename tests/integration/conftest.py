"""Recipes for files that a test has written, and runs of them in this process, from headers to the finished result."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import Any

import pytest

from gridcarb.cli.progress import watcher
from gridcarb.recipe import Recipe, check
from gridcarb.run import conduct, prepare
from gridcarb.run.conduct import Outcome
from gridcarb.sources import close_all

RecipeFor = Callable[..., Recipe]
Run = Callable[..., Outcome]


@pytest.fixture(autouse=True)
def _nothing_stays_open() -> Iterator[None]:
    yield
    close_all()


@pytest.fixture
def recipe_for(tmp_path: Path) -> RecipeFor:
    """Make a recipe for files: two fields in double precision, a block a time step; sections are laid over it."""

    def make(files: Sequence[Path], **sections: Any) -> Recipe:
        base: dict[str, Any] = {
            "recipe": 1, "inputs": {"files": [str(path) for path in files]},
            "chemistry": {"fields": ["ph_total_scale", "aragonite_saturation"]},
            "output": {"folder": str(tmp_path / "result"), "precision": "float64"},
            "engine": {"workers": 1, "block": {"time": 1}},
        }
        for section, words in sections.items():
            base[section] = {**base.get(section, {}), **words} if isinstance(words, dict) else words
        if base["engine"].get("block"):  # of such a small grid the planner would make one chunk
            base["output"].setdefault("chunks", base["engine"]["block"])
        return check(json.dumps(base))

    return make


@pytest.fixture
def run(recipe_for: RecipeFor) -> Run:
    """Do the main job on files; arguments as those of `recipe_for`."""

    def do(files: Sequence[Path], **sections: Any) -> Outcome:
        return conduct(prepare(recipe_for(files, **sections)), watcher(quiet=True))

    return do
