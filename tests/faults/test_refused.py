"""Places a result cannot go, and inputs that fail under the run: plain words, a code, nothing lost."""

from __future__ import annotations

import os
import shutil
import signal

import pytest


def error_lines(said: str) -> list[str]:
    """The last three lines: where, what, how to mend it."""
    return said.splitlines()[-3:]


def test_a_full_disk(place, tiny_disk) -> None:
    here = place(tiny_disk, output={"replace": True})
    earlier = here.put_earlier_result()
    run = here.begin()
    assert run.wait() == 4, run.said
    where, what, mend = error_lines(run.said)
    assert str(here.partial) in where
    assert "of 60)" in where
    assert what.startswith("the disk is full: about ")
    assert mend.startswith("to mend it: free some space")
    assert "Traceback" not in run.said
    assert here.contents() == earlier
    assert not here.lock.exists()


def test_a_result_that_exists_is_refused_unless_told(place) -> None:
    here = place()
    earlier = here.put_earlier_result()
    run = here.begin()
    assert run.wait() == 4
    where, what, mend = error_lines(run.said)
    assert (where, what) == (str(here.result), "a result of this name exists already")
    assert "`replace: true`" in mend
    assert here.contents() == earlier
    assert not here.partial.exists()


def test_a_file_in_the_way(place) -> None:
    here = place()
    blocker = here.folder / "blocker"
    blocker.write_text("a file, not a folder")
    run = here.begin("--result", str(blocker / "result"))
    assert run.wait() == 4
    where, what, mend = error_lines(run.said)
    assert str(blocker) in where
    assert "nothing can be written here" in what
    assert "output: {folder: ...}" in mend
    assert blocker.read_text() == "a file, not a folder"


def test_a_folder_without_permission(place) -> None:
    here = place()
    shut = here.folder / "shut"
    shut.mkdir(mode=0o500)
    if os.access(shut, os.W_OK):
        pytest.skip("this user may write everywhere, like root")
    run = here.begin("--result", str(shut / "result"))
    assert run.wait() == 4
    assert "no permission" in error_lines(run.said)[1]


def test_two_runs_on_one_result(place) -> None:
    here = place()
    first = here.begin_and_reach_the_middle()
    assert not here.result.exists(), "no result bears its name before it is complete"
    second = here.begin()
    first.process.send_signal(signal.SIGSTOP)  # it holds its lock for as long as the second looks
    assert second.wait() == 4
    first.process.send_signal(signal.SIGCONT)
    where, what, mend = error_lines(second.said)
    assert where == str(here.result)
    holder = f"process {first.process.pid} on {os.uname().nodename}, since 2"
    assert what.startswith("another run is at work on this result: ")
    assert holder in what
    assert "choose another" in mend
    assert first.wait() == 0, first.said
    assert here.journal(here.result)["state"] == "complete"


def test_an_input_cut_short_under_the_run(place, ocean_file, tmp_path) -> None:
    moving = shutil.copy(ocean_file, tmp_path / "moving.nc")
    here = place(files=moving)
    run = here.begin_and_reach_the_middle()
    os.truncate(moving, moving.stat().st_size // 3)
    assert run.wait() in (3, 6), run.said
    where, _, mend = error_lines(run.said)
    assert str(moving) in where
    assert "(block " in where
    assert "of 60)" in where
    assert "changed after the run began" in mend
    assert "Traceback" not in run.said
    assert not here.result.exists()
    told = here.journal(here.partial)
    assert told["state"] == "failed"
    assert where in told["error"]["text"]
    assert f"the incomplete result was left in {here.partial}" in run.said
