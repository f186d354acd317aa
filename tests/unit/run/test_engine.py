"""Every task once, answers in the calling thread, the first error raised when nothing is at work any more."""

from __future__ import annotations

import threading
import time

import pytest

from gridcarb.run import engine
from gridcarb.run.engine import run_tasks


def test_every_number_is_called_once_with_the_job() -> None:
    job, calls, answers = object(), [], []

    def task(given: object, number: int) -> int:
        assert given is job
        calls.append(number)
        return number * number

    run_tasks(task, job, range(40), workers=3, done=answers.append)
    assert sorted(calls) == list(range(40))
    assert sorted(answers) == [number * number for number in range(40)]


def test_done_is_called_in_the_calling_thread_and_tasks_elsewhere() -> None:
    here, callers, workers = threading.get_ident(), set(), set()
    run_tasks(lambda _, number: workers.add(threading.get_ident()), None, range(8), workers=2,
              done=lambda _: callers.add(threading.get_ident()))
    assert callers == {here}
    assert here not in workers
    assert len(workers) <= 2


def test_no_more_than_the_workers_at_a_time() -> None:
    lock, at_work, most = threading.Lock(), 0, 0

    def task(_: object, number: int) -> None:
        nonlocal at_work, most
        with lock:
            at_work += 1
            most = max(most, at_work)
        time.sleep(0.002)
        with lock:
            at_work -= 1

    run_tasks(task, None, range(30), workers=3, done=lambda _: None)
    assert most == 3


def test_a_job_is_not_looked_into() -> None:
    """A job may hold whatever looks like work to dask; it arrives as it was."""
    job = {"inner": [1, 2], "others": (len, "abc")}
    seen = []
    run_tasks(lambda given, _: seen.append(given), job, range(2), workers=1, done=lambda _: None)
    assert all(given is job for given in seen)


def test_long_runs_go_in_slabs(monkeypatch) -> None:
    monkeypatch.setattr(engine, "_SLAB_PER_WORKER", 3)
    graphs = []
    compute = engine.dask.compute

    def counting(*tasks, **words):
        graphs.append(len(tasks))
        return compute(*tasks, **words)

    monkeypatch.setattr(engine.dask, "compute", counting)
    answers: list[int] = []
    run_tasks(lambda _, number: number, None, range(14), workers=2, done=answers.append)
    assert graphs == [6, 6, 2]
    assert sorted(answers) == list(range(14))


def test_the_first_error_ends_the_rest_and_nothing_is_at_work_afterwards() -> None:
    begun, ended, done = [], [], []

    def task(_: object, number: int) -> int:
        begun.append(number)
        if len(begun) == 5:
            raise ValueError(f"task {number}")
        time.sleep(0.02)
        ended.append(number)
        return number

    with pytest.raises(ValueError, match="task") as caught:
        run_tasks(task, None, range(1000), workers=3, done=done.append)
    failed = int(str(caught.value).split()[1])
    assert len(begun) < 20
    assert sorted(ended) == sorted(set(begun) - {failed})
    assert set(done) <= set(ended)
    assert not [thread for thread in threading.enumerate() if thread.name.startswith("ThreadPoolExecutor")]


def test_an_error_of_done_ends_the_run_too() -> None:
    def refuse(_: object) -> None:
        raise RuntimeError("no more")

    with pytest.raises(RuntimeError, match="no more"):
        run_tasks(lambda _, number: number, None, range(100), workers=2, done=refuse)


def test_ctrl_c_waits_for_what_is_at_work() -> None:
    begun, ended = [], []

    def task(_: object, number: int) -> None:
        begun.append(number)
        time.sleep(0.05 if number % 2 else 0.001)
        ended.append(number)

    def interrupt(_: object) -> None:
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run_tasks(task, None, range(100), workers=4, done=interrupt)
    assert sorted(ended) == sorted(begun)
    assert len(begun) < 20
