"""A run that died or found no room goes on with --resume, and leaves the bytes of one that was never disturbed."""

from __future__ import annotations

import json
import os
import random
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from gridcarb.run.status import status

BLOCKS = 60
BLOCK = {"time": 1, "cells": 20}
SMALL = {"engine": {"workers": 2, "block": BLOCK}}


@pytest.fixture(autouse=True, scope="module")
def _one_date():
    """Runs that are compared tell the same date in the history of their store."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("SOURCE_DATE_EPOCH", "1800000000")
        yield


@pytest.fixture(scope="module")
def undisturbed(ocean_file, tmp_path_factory) -> dict[str, bytes]:
    """Every file of the store of a run that nothing happened to, in blocks of the same size."""
    folder = tmp_path_factory.mktemp("undisturbed")
    recipe = folder / "recipe.yaml"
    recipe.write_text(json.dumps({
        "recipe": 1, "inputs": {"files": str(ocean_file)}, "reading": {"density": "1026 kg m-3"},
        "chemistry": {"fields": ["ph_total_scale"]}, **SMALL,
        "output": {"folder": str(folder / "result"), "netcdf": False, "chunks": BLOCK},
    }))
    command = [sys.executable, "-c", "from gridcarb.cli.main import main; main()", "run", str(recipe), "--quiet"]
    subprocess.run(command, check=True, timeout=90)
    return store_files(folder / "result")


def store_files(result: Path) -> dict[str, bytes]:
    store = result / "fields.zarr"
    return {str(path.relative_to(store)): path.read_bytes() for path in sorted(store.rglob("*")) if path.is_file()}


def assert_same_files(found: dict[str, bytes], wanted: dict[str, bytes]) -> None:
    assert list(found) == list(wanted)
    assert [name for name in wanted if found[name] != wanted[name]] == []


def marks(partial: Path) -> int:
    return len(list((partial / "ledger").glob("[0-9]*/*.json")))


def wait_for_marks(here, run, wanted: int) -> None:
    until = time.monotonic() + 60
    while marks(here.partial) < wanted:
        assert run.process.poll() is None, f"ended before {wanted} blocks were done:\n{run.said}"
        assert time.monotonic() < until, run.said
        time.sleep(0.002)


def test_killed_at_random_blocks_and_resumed(place, undisturbed) -> None:
    here = place(**SMALL)
    seed = random.randrange(10**6)
    print(f"random seed {seed}")
    first, second = sorted(random.Random(seed).sample(range(1, BLOCKS - 10), 2))

    run = here.begin()
    wait_for_marks(here, run, first)
    run.process.send_signal(signal.SIGSTOP)
    stands = status(here.result)
    assert (stands.state, stands.blocks) == ("running", BLOCKS)
    assert (stands.pid, stands.host) == (run.process.pid, os.uname().nodename)
    assert first <= stands.done < BLOCKS
    assert run.end(signal.SIGKILL) == -signal.SIGKILL
    stands = status(here.result)
    assert (stands.state, stands.seconds_left) == ("interrupted", None)

    plain = here.begin()
    assert plain.wait() == 4, plain.said
    assert f"has finished {stands.done} blocks, which would be lost" in plain.said
    assert f"`gridcarb run {here.recipe} --resume`" in plain.said
    assert marks(here.partial) == stands.done

    again = here.begin("--resume")
    wait_for_marks(here, again, max(second, stands.done + 1))
    again.end(signal.SIGKILL)
    done = marks(here.partial)
    last = here.begin("--resume")
    assert last.wait() == 0, last.said
    assert f"{done} of {BLOCKS} blocks are done" in last.said
    assert f"{BLOCKS - done} block" in last.said
    assert_same_files(store_files(here.result), undisturbed)
    assert sorted(path.name for path in here.folder.iterdir() if path.name.startswith("result")) == ["result"]
    counts = here.journal(here.result)["products"]["ranges"]["solution_status"]
    assert sum(counts.values()) == 6 * 5 * 10 * 20
    assert status(here.result).state == "complete"


def test_a_disk_that_was_full_and_has_room_again(place, tiny_disk, undisturbed) -> None:
    here = place(tiny_disk, **SMALL)
    run = here.begin()
    assert run.wait() == 4, run.said
    assert "the disk is full" in run.said
    done = marks(here.partial)
    assert 0 < done < BLOCKS
    assert f"{done} of {BLOCKS} blocks are done" in run.said
    assert status(here.result).state in ("failed", "interrupted")
    subprocess.run(["mount", "-o", "remount,size=20m", str(tiny_disk)], check=True)
    again = here.begin("--resume")
    assert again.wait() == 0, again.said
    assert_same_files(store_files(here.result), undisturbed)
    assert here.journal(here.result)["blocks_taken_up"] <= done
