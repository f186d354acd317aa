"""A run that is killed or stopped leaves an earlier result alone, and the next run works."""

from __future__ import annotations

import os
import signal

import pytest


def test_killed_in_the_middle(place) -> None:
    here = place(output={"replace": True})
    earlier = here.put_earlier_result()
    run = here.begin_and_reach_the_middle()
    assert here.contents() == earlier, "the earlier result stands while the new one is made"
    assert run.end(signal.SIGKILL) == -signal.SIGKILL
    assert here.contents() == earlier
    assert here.journal(here.partial)["state"] == "running"
    after = here.begin("--anew")
    assert after.wait() == 0, after.said
    said = " ".join(after.said.split())
    assert f"had left its lock (process {run.process.pid} on {os.uname().nodename}" in said
    assert "had left an incomplete result; it was removed" in said
    assert "Warning" not in after.said
    assert here.journal(here.result)["state"] == "complete"
    assert sorted(path.name for path in here.folder.iterdir() if path.name.startswith("result")) == ["result"]
    assert "fields.nc" not in here.contents(), "nothing of the earlier result is mixed into the new one"


@pytest.mark.parametrize(("number", "code", "words"), [
    (signal.SIGINT, 130, "stopped by Ctrl-C"), (signal.SIGTERM, 143, "stopped by SIGTERM"),
])
def test_stopped_in_the_middle(place, number, code, words) -> None:
    here = place(output={"replace": True})
    earlier = here.put_earlier_result()
    run = here.begin_and_reach_the_middle()
    assert run.end(number) == code
    assert words in run.said
    assert f"the incomplete result was left in {here.partial}" in run.said
    assert f"of 60 blocks are done: `gridcarb run {here.recipe} --resume` goes on from there" in run.said
    assert "Traceback" not in run.said
    assert here.contents() == earlier
    assert not here.lock.exists()
    told = here.journal(here.partial)
    assert (told["state"], told["error"]["text"]) == ("interrupted", words)
