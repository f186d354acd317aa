"""How a run stands, from what lies on the disk alone."""

from __future__ import annotations

import json
import os
import socket
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from gridcarb.errors import OutputError
from gridcarb.run.status import Standing, status
from gridcarb.write.ledger import LEDGER, Ledger, Marker
from gridcarb.write.lock import Holder

NOBODY = 2**22 + 1
"""No process has this id: it is beyond the greatest."""


def lay(folder: Path, state: str, done: int, *, total: int = 10, ago: float = 100.0, **journal) -> Ledger:
    """A result folder of `total` blocks of 1000 cells, `done` of them finished, begun so many seconds ago."""
    ledger = Ledger(folder / LEDGER)
    folder.mkdir()
    layout = {"sizes": {"time": total, "x": 1000}, "block": {"time": 1, "x": 1000}, "chunks": {"time": 1, "x": 1000}}
    ledger.open({"settings": {}, "base": "", "files": {}, "versions": {}, "layout": layout, "begun": ""})
    for block in range(done):
        ledger.put(Marker(block, "", "", {}, 1000, {}, {}))
    begun = (datetime.now(UTC) - timedelta(seconds=ago)).isoformat()
    (folder / "journal.json").write_text(json.dumps({"state": state, "begun": begun, **journal}))
    return ledger


def held(result: Path, **words) -> None:
    holder = vars(Holder.myself()) | words
    result.with_name(f"{result.name}.lock").write_text(json.dumps(holder))


@pytest.fixture
def result(tmp_path) -> Path:
    return tmp_path / "result"


@pytest.fixture
def partial(result) -> Path:
    return result.with_name("result.partial")


def words(stands: Standing) -> dict[str, str]:
    told = stands.as_dict()
    assert json.loads(json.dumps(told, allow_nan=False)) == told
    return {label: text for section in stands.report().sections for label, text in section.rows}


def test_a_run_at_work_tells_its_speed_and_what_is_left(result, partial):
    lay(partial, "running", 4)
    held(result)
    stands = status(result)
    assert (stands.state, stands.done, stands.blocks, stands.cells) == ("running", 4, 10, 10_000)
    assert (stands.host, stands.pid, stands.seen) == (socket.gethostname(), os.getpid(), True)
    assert stands.cells_per_second == pytest.approx(40, rel=0.05)
    assert stands.seconds_left == pytest.approx(150, rel=0.05)
    assert words(stands)["blocks"] == "4 of 10 done"
    assert words(stands)["time left"] == "about 00 h 02 min"
    assert status(partial) == stands, "the working folder may be named as well"


def test_blocks_of_an_earlier_process_count_as_done_and_not_as_speed(result, partial):
    lay(partial, "running", 4, blocks_taken_up=3)
    held(result)
    assert status(result).cells_per_second == pytest.approx(10, rel=0.05)
    (partial / "journal.json").write_text(json.dumps({"state": "running", "begun": "2026-01-01T00:00:00+00:00",
                                                      "blocks_taken_up": 4}))  # fmt: skip
    assert status(result).cells_per_second is None


@pytest.mark.parametrize(("done", "state"), [(0, "beginning"), (10, "finishing")])
def test_before_the_first_block_and_after_the_last(result, partial, done, state):
    lay(partial, "running", done)
    held(result)
    assert status(result).state == state
    assert status(result).seconds_left is None


def test_a_lock_before_anything_else_is_a_beginning(result):
    held(result)
    assert status(result).state == "beginning"


def test_a_process_of_another_host_is_taken_to_live(result, partial):
    lay(partial, "running", 4)
    held(result, host="elsewhere", pid=NOBODY)
    stands = status(result)
    assert (stands.state, stands.seen) == ("running", False)
    assert words(stands)["process"] == f"{NOBODY} on elsewhere; whether it lives cannot be seen from here"


@pytest.mark.parametrize("lock", [True, False])
def test_one_that_died_without_a_word_is_interrupted(result, partial, lock):
    lay(partial, "running", 4)
    if lock:
        held(result, pid=NOBODY)
    stands = status(result)
    assert (stands.state, stands.seconds_left) == ("interrupted", None)
    assert "--resume" in words(stands)["to go on"]


def test_one_that_failed_tells_why_and_which_blocks(result, partial):
    ledger = lay(partial, "failed", 4, error={"kind": "BlockError", "text": "two blocks\ncould not be done"})
    ledger.put_failure(7, {"what": "the file is cut short", "where": "b.nc"})
    stands = status(result)
    assert (stands.state, stands.error) == ("failed", "two blocks\ncould not be done")
    assert stands.as_dict()["failed"] == [{"block": 8, "what": "the file is cut short", "where": "b.nc"}]
    assert words(stands)["block 8"] == "the file is cut short"
    assert words(stands)["ended with"] == "two blocks could not be done"


def test_one_that_is_complete(result, partial):
    lay(result, "complete", 10, ended="2026-12-01T00:00:00+00:00")
    stands = status(result)
    assert (stands.state, stands.done, stands.ended) == ("complete", 10, "2026-12-01T00:00:00+00:00")
    assert not stands.earlier
    lay(partial, "running", 2)
    held(result)
    assert status(result).earlier
    assert "stands" in words(status(result))["beside it"]


def test_nothing_of_that_name(result):
    with pytest.raises(OutputError, match="there is no result of that name"):
        status(result)
