from __future__ import annotations

import errno
import json
import os
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import pytest

from gridcarb.errors import Notice, OutputError
from gridcarb.write.journal import write_journal


def test_everything_a_run_tells_becomes_plain_json(tmp_path):
    path = tmp_path / "journal.json"
    write_journal(path, {
        "count": np.int64(3), "mean": np.float64(2.5), "list": np.arange(2), "path": Path("a/b"), "µ": {"b", "a"},
        "when": datetime(2020, 1, 2, tzinfo=UTC), "notice": Notice("code", "text"), "none": None,
    })
    assert json.loads(path.read_text(encoding="utf-8")) == {
        "count": 3, "mean": 2.5, "list": [0, 1], "path": "a/b", "µ": ["a", "b"], "when": "2020-01-02T00:00:00+00:00",
        "notice": {"code": "code", "text": "text", "state": ""}, "none": None,
    }
    assert [file.name for file in tmp_path.iterdir()] == ["journal.json"]


@pytest.mark.parametrize(("content", "error"), [({"x": float("nan")}, ValueError), ({"x": object()}, TypeError)])
def test_what_has_no_json_form_is_refused_and_the_old_journal_stays(tmp_path, content, error):
    path = tmp_path / "journal.json"
    write_journal(path, {"a": 1})
    with pytest.raises(error):
        write_journal(path, content)
    assert json.loads(path.read_text()) == {"a": 1}


@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EDQUOT])
def test_a_full_disk_leaves_the_old_journal(tmp_path, monkeypatch, number):
    path = tmp_path / "journal.json"
    write_journal(path, {"a": 1})

    def full(handle):
        raise OSError(number, "full")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(OutputError, match="disk is full"):
        write_journal(path, {"a": 2})
    assert json.loads(path.read_text()) == {"a": 1}
    assert [file.name for file in tmp_path.iterdir()] == ["journal.json"]


def test_another_error_of_the_system_passes_unchanged(tmp_path):
    with pytest.raises(FileNotFoundError):
        write_journal(tmp_path / "nowhere" / "journal.json", {})
