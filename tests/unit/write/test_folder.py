from __future__ import annotations

import json
import os
import socket
import subprocess
import sys
from pathlib import Path

import pytest

from gridcarb.errors import OutputError
from gridcarb.write import lock
from gridcarb.write.folder import ResultFolder
from gridcarb.write.journal import JOURNAL


def finished(target: Path, text: str) -> Path:
    folder = ResultFolder(target, replace=True)
    folder.begin()
    (folder.partial / JOURNAL).write_text(text)
    return folder.complete()


def test_only_a_complete_result_bears_the_name(tmp_path):
    folder = ResultFolder(tmp_path / "deep" / "result.v1")
    folder.check()
    assert not (tmp_path / "deep").exists()
    assert folder.begin() == ()
    (folder.partial / JOURNAL).write_text("new")
    assert not folder.target.exists()
    assert {path.name for path in (tmp_path / "deep").iterdir()} == {"result.v1.partial", "result.v1.lock"}
    assert folder.complete() == folder.target
    assert {path.name for path in (tmp_path / "deep").iterdir()} == {"result.v1"}
    assert (folder.target / JOURNAL).read_text() == "new"


def test_an_existing_result_is_refused_unless_told(tmp_path):
    target = finished(tmp_path / "r", "old")
    for action in ("check", "begin"):
        with pytest.raises(OutputError, match="exists already") as caught:
            getattr(ResultFolder(target), action)()
        assert "replace: true" in caught.value.mend
        assert caught.value.where == str(target)
    assert {path.name for path in tmp_path.iterdir()} == {"r"}
    finished(target, "new")
    assert (target / JOURNAL).read_text() == "new"
    assert {path.name for path in tmp_path.iterdir()} == {"r"}


def test_a_folder_of_another_kind_is_never_replaced(tmp_path):
    (tmp_path / "data").mkdir()
    (tmp_path / "data" / "precious.nc").write_text("x")
    (tmp_path / "file").write_text("y")
    for name in ("data", "file"):
        with pytest.raises(OutputError, match="not a result"):
            ResultFolder(tmp_path / name, replace=True).check()
    (tmp_path / "empty").mkdir()
    finished(tmp_path / "empty", "new")
    assert (tmp_path / "data" / "precious.nc").exists()


def test_a_given_up_run_keeps_what_it_wrote_and_the_old_result(tmp_path):
    target = finished(tmp_path / "r", "old")
    folder = ResultFolder(target, replace=True)
    folder.begin()
    (folder.partial / "half").write_text("half")
    assert folder.abandon() == folder.partial
    assert (target / JOURNAL).read_text() == "old"
    assert (folder.partial / "half").exists()
    assert not folder.lock.exists()
    folder.begin(keep_partial=True)
    assert (folder.partial / "half").exists()
    folder.abandon()
    assert [notice.code for notice in folder.begin()] == ["partial_removed"]
    assert list(folder.partial.iterdir()) == []


def test_a_rename_that_fails_puts_the_old_result_back(tmp_path, monkeypatch):
    target = finished(tmp_path / "r", "old")
    folder = ResultFolder(target, replace=True)
    folder.begin()
    rename = Path.rename

    def failing(self, other):
        if self == folder.partial:
            raise OSError("invented failure")
        return rename(self, other)

    monkeypatch.setattr(Path, "rename", failing)
    with pytest.raises(OSError, match="invented failure"):
        folder.complete()
    assert (target / JOURNAL).read_text() == "old"
    assert folder.partial.exists()


def test_a_death_between_the_two_renames_is_mended(tmp_path):
    target = finished(tmp_path / "r", "old")
    folder = ResultFolder(target, replace=True)
    target.rename(folder._aside)
    assert [notice.code for notice in folder.begin()] == ["result_restored"]
    assert (target / JOURNAL).read_text() == "old"
    folder.abandon()
    folder._aside.mkdir()
    assert "replaced_removed" in [notice.code for notice in folder.begin(keep_partial=True)]
    assert not folder._aside.exists()


def test_a_result_that_appears_meanwhile_is_not_run_over(tmp_path):
    folder = ResultFolder(tmp_path / "r")
    folder.begin()
    (tmp_path / "r").mkdir()
    (tmp_path / "r" / JOURNAL).write_text("of another")
    with pytest.raises(OutputError, match="exists already"):
        folder.complete()
    assert (tmp_path / "r" / JOURNAL).read_text() == "of another"
    assert folder.partial.exists()


def test_an_unwritable_place_is_refused_before_anything(tmp_path, monkeypatch):
    (tmp_path / "file").write_text("")
    with pytest.raises(OutputError, match="is a file"):
        ResultFolder(tmp_path / "file" / "r").check()
    with pytest.raises(OutputError, match="root of the file system"):
        ResultFolder(Path(tmp_path.anchor)).check()
    monkeypatch.setattr(os, "access", lambda *_: False)
    with pytest.raises(OutputError, match="no permission") as caught:
        ResultFolder(tmp_path / "new" / "r").check()
    assert caught.value.where == str(tmp_path)
    assert not (tmp_path / "new").exists()


def test_a_parent_that_refuses_the_folder_is_said(tmp_path, monkeypatch):
    def refuse(self, *_, **__):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "mkdir", refuse)
    with pytest.raises(OutputError, match="nothing can be written here"):
        ResultFolder(tmp_path / "new" / "r").begin()


def test_a_second_run_is_refused_while_the_first_lives(tmp_path):
    first = ResultFolder(tmp_path / "r")
    first.begin()
    (first.partial / "half").write_text("half")
    with pytest.raises(OutputError, match=f"process {os.getpid()} on {socket.gethostname()}, since 20"):
        ResultFolder(tmp_path / "r", replace=True).begin()
    assert (first.partial / "half").exists()
    assert first.lock.exists()


def test_a_run_in_another_process_holds_the_lock_until_it_dies(tmp_path):
    code = (
        "import sys; from pathlib import Path; from gridcarb.write.folder import ResultFolder;"
        "ResultFolder(Path(sys.argv[1])).begin(); print('ready', flush=True); sys.stdin.read()"
    )
    other = subprocess.Popen([sys.executable, "-c", code, str(tmp_path / "r")], stdin=subprocess.PIPE,
                             stdout=subprocess.PIPE, text=True)
    with other:
        assert other.stdout.readline().strip() == "ready"
        with pytest.raises(OutputError, match=f"process {other.pid} "):
            ResultFolder(tmp_path / "r").begin()
        other.kill()
    notices = ResultFolder(tmp_path / "r").begin()
    assert [notice.code for notice in notices] == ["stale_lock"]
    assert str(other.pid) in notices[0].text


def write_lock(path: Path, **changes) -> None:
    me = lock.Holder.myself()
    path.write_text(json.dumps({"host": me.host, "pid": me.pid, "born": me.born, "since": me.since} | changes))


def test_a_reused_process_number_is_told_apart(tmp_path):
    folder = ResultFolder(tmp_path / "r")
    write_lock(folder.lock, born=1.0)
    assert [notice.code for notice in folder.begin()] == ["stale_lock"]


def test_a_lock_of_another_host_or_a_torn_one_is_respected(tmp_path):
    folder = ResultFolder(tmp_path / "r")
    write_lock(folder.lock, host="another-host", pid=2**30)
    with pytest.raises(OutputError, match="another-host") as caught:
        folder.begin()
    assert f"delete {folder.lock}" in caught.value.mend
    folder.lock.write_text("{")
    with pytest.raises(OutputError, match="cannot be read"):
        folder.begin()


def test_two_cleaners_of_one_stale_lock_do_not_both_win(tmp_path, monkeypatch):
    folder = ResultFolder(tmp_path / "r")
    write_lock(folder.lock, born=1.0)
    stale = lock.holder_of(folder.lock)
    write_lock(folder.lock, host="the-faster-one")  # it took the lock after the look, before the rename
    monkeypatch.setattr(lock, "holder_of", lambda path, read=lock.holder_of: stale if path == folder.lock else read(path))
    with pytest.raises(OutputError, match="the-faster-one"):
        folder.begin()
    assert json.loads(folder.lock.read_text())["host"] == "the-faster-one"


def test_a_failed_start_gives_the_lock_back(tmp_path):
    target = finished(tmp_path / "r", "old")
    with pytest.raises(OutputError):
        ResultFolder(target).begin()
    assert not ResultFolder(target).lock.exists()
