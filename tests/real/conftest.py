"""Where the shared real data lie; without them these tests are skipped."""

from __future__ import annotations

from pathlib import Path

import pytest

FOLDER = Path(__file__).parents[2].parent / "shared" / "data"


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    absent = pytest.mark.skip(reason="the shared real data are not beside the checkout (../shared/data)")
    for item in items:
        if Path(__file__).parent in item.path.parents:
            item.add_marker(pytest.mark.real)
            if not FOLDER.is_dir():
                item.add_marker(absent)


@pytest.fixture(scope="session")
def data() -> Path:
    return FOLDER
