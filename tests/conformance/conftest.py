"""An independent checker of the conventions, run in this process and without a network."""

from __future__ import annotations

import socket
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest


@pytest.fixture
def no_network(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*arguments: object, **_: object) -> None:
        raise AssertionError(f"the network was asked for: {arguments}")

    for name in ("create_connection", "getaddrinfo", "gethostbyname"):
        monkeypatch.setattr(socket, name, refuse)
    monkeypatch.setattr(socket.socket, "connect", refuse)


@pytest.fixture
def complaints(no_network: None) -> Callable[[Path], list[str]]:
    """A function that gives what the checker finds wrong with a file, whatever weight it gives it."""
    return _complaints


def _complaints(path: Path) -> list[str]:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of the checker's own dependencies
        from compliance_checker.runner import CheckSuite

        suite = CheckSuite()
        suite.load_all_available_checkers()
        dataset = suite.load_dataset(str(path))
        try:
            groups, errors = suite.run_all(dataset, ["cf:1.11"])["cf:1.11"]
        finally:
            dataset.close()
    assert not errors
    assert len(groups) > 15, "the checker must really have checked"
    return [message for group in groups for message in _messages(group)]


def _messages(result: Any) -> list[str]:
    """The messages of every check that did not reach its full score."""
    if result.children:
        return [message for child in result.children for message in _messages(child)]
    passed = result.value[0] == result.value[1] if isinstance(result.value, tuple) else result.value
    return [] if passed else [f"{result.name}: {message}" for message in result.msgs or ["?"]]
