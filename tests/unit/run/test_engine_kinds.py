"""The kinds of engine: which one a recipe asks for, and what hosts and queues are told."""

from __future__ import annotations

import asyncio
import base64
import json
import pickle
import re
from types import SimpleNamespace
from typing import Any

import pytest
from dask.utils import parse_bytes
from pydantic import ValidationError

from gridcarb import errors
from gridcarb.errors import EngineError, GridcarbError, UnknownWordError
from gridcarb.recipe.engine import EngineSettings, spoken_engine
from gridcarb.run.engines import open_crew, queue
from gridcarb.run.engines.dask_crew import own_scheduler
from gridcarb.run.engines.hosts import words as hosts_words

HOSTS = EngineSettings(hosts=("alpha", "beta", "gamma"), python="/opt/python")


@pytest.mark.parametrize(("words", "kind", "machines"), [
    ({}, "threads", 1), ({"kind": "processes"}, "processes", 1), ({"address": "tcp://host:8786"}, "scheduler", 1),
    ({"hosts": ["a", "b"]}, "hosts", 2), ({"queue": {"system": "slurm", "jobs": 5}}, "queue", 5),
    ({"kind": "threads", "hosts": ["a", "b"]}, "threads", 1),
    ({"kind": "scheduler", "address": "tcp://host:1", "hosts": ["a", "b"]}, "scheduler", 1),
])
def test_the_kind_is_stated_or_told_by_its_key(words, kind, machines) -> None:
    settings = EngineSettings.model_validate(words)
    assert (settings.chosen, settings.machines) == (kind, machines)


@pytest.mark.parametrize(("words", "told"), [
    ({"kind": "scheduler"}, "needs `address`"), ({"kind": "hosts"}, "needs `hosts`"), ({"kind": "queue"}, "needs `queue`"),
    ({"address": "tcp://host:1", "hosts": ["a"]}, "more than one kind of engine is told: address, hosts"),
])
def test_a_kind_without_its_key_or_two_at_once_are_refused(words, told) -> None:
    with pytest.raises(ValidationError, match=told):
        EngineSettings.model_validate(words)


def test_engines_on_the_command_line() -> None:
    assert spoken_engine("processes") == {"kind": "processes"}
    assert spoken_engine("tls://host:8786") == {"kind": "scheduler", "address": "tls://host:8786"}
    with pytest.raises(UnknownWordError, match="procesess") as caught:
        spoken_engine("procesess")
    assert "did you mean 'processes'" in caught.value.mend


def test_a_scheduler_that_does_not_answer(monkeypatch) -> None:
    monkeypatch.setattr("gridcarb.run.engines.dask_crew._PATIENCE", "0.3s")
    address = "tcp://127.0.0.1:1"
    with pytest.raises(EngineError, match="no dask scheduler answers") as caught:
        open_crew(EngineSettings(address=address), 1, None, lambda _: None).__enter__()
    assert address in caught.value.where
    assert "dask scheduler" in caught.value.mend


def test_the_first_host_holds_the_scheduler_and_all_have_workers() -> None:
    words = hosts_words(HOSTS, 3)
    assert words["hosts"] == ["alpha", "alpha", "beta", "gamma"]
    assert words["worker_options"] == {"n_workers": 3, "nthreads": 1}
    assert words["remote_python"] == "/opt/python"


def test_the_command_that_goes_over_ssh(monkeypatch) -> None:
    """As far as it goes without a host: SSH is stood in for by one who writes down what it is given."""
    asyncssh = pytest.importorskip("asyncssh")
    from distributed.deploy.ssh import Worker

    called: list[tuple[str, str]] = []

    class Line:
        async def readline(self) -> str:
            return "Start worker at: tcp://alpha:1"

    class Connection:
        def __init__(self, host: str) -> None:
            self.host = host

        async def wait_closed(self) -> None:
            pass

        def close(self) -> None:
            pass

        async def run(self, _: str) -> Any:
            return SimpleNamespace(exit_status=0)

        async def create_process(self, command: str) -> Any:
            called.append((self.host, command))
            return SimpleNamespace(stderr=Line(), kill=lambda: None)

    async def connect(host: str, **_: object) -> Connection:
        return Connection(host)

    async def start() -> None:
        words = hosts_words(HOSTS, 2)
        started = Worker("tcp://alpha:8786", "beta", {}, words["worker_options"], remote_python=words["remote_python"])
        await started.start()
        await started.close()

    monkeypatch.setattr(asyncssh, "connect", connect)
    with own_scheduler():
        asyncio.run(start())
    ((host, command),) = called
    assert host == "beta"
    assert " /opt/python -m distributed.cli.dask_spec tcp://alpha:8786 --spec " in command
    told = json.loads(re.search(r"--spec '(.*)'$", command).group(1))
    assert [worker["opts"] for worker in told.values()] == [{"nthreads": 1}] * 2
    config = json.loads(base64.urlsafe_b64decode(re.search(r"CONFIG=\"?([\w=-]+)", command).group(1)))
    assert config["distributed"]["nanny"]["pre-spawn-environ"]["OMP_NUM_THREADS"] == 1


@pytest.mark.parametrize(("system", "lines"), [
    ("slurm", [r"#SBATCH -p wide", r"#SBATCH -A ocean", r"#SBATCH -t 02:30:00",
               r"#SBATCH --cpus-per-task=4", r"#SBATCH --mem=\d"]),
    ("pbs", [r"#PBS -q wide", r"#PBS -A ocean", r"#PBS -l walltime=02:30:00", r"#PBS -l select=1:ncpus=4:mem=\d"]),
    ("sge", [r"#\$ -q wide", r"#\$ -P ocean", r"#\$ -l h_rt=02:30:00"]),
    ("lsf", [r"#BSUB -q wide", r"#BSUB -P \"?ocean", r"#BSUB -W 02:30", r"#BSUB -n 4"]),
])
@pytest.mark.filterwarnings("ignore::FutureWarning", "ignore::DeprecationWarning")
def test_the_job_script(system, lines) -> None:
    pytest.importorskip("dask_jobqueue")
    asked = {"system": system, "jobs": 3, "name": "wide", "account": "ocean", "walltime": "02:30:00", "interface": "lo",
             "directives": ["--exclusive"], "before": ["module load python"]}  # fmt: skip
    settings = EngineSettings.model_validate({"workers": 4, "memory": "6 GB", "queue": asked, "python": "/opt/python"})
    with queue.cluster(settings, 4) as jobs:
        script = jobs.job_script()
    for line in (*lines, r"--exclusive", r"(?m)^module load python$", r"/opt/python -m distributed.cli.dask_worker tcp://127.0.0.1:"):
        assert re.search(line, script), f"{line}\n{script}"
    assert re.search(r"--nthreads 1 .*--nworkers 4 ", script), script
    each = parse_bytes(re.search(r"--memory-limit (\S+)", script).group(1))
    assert each == pytest.approx(6e9 / 4 + queue.PROGRAM_BYTES, rel=0.1)


def test_a_queue_without_its_library_says_what_to_install(monkeypatch) -> None:
    monkeypatch.setitem(__import__("sys").modules, "dask_jobqueue", None)
    with pytest.raises(EngineError) as caught:
        queue.cluster(EngineSettings.model_validate({"queue": {"system": "pbs"}}), 1)
    assert "gridcarb[queue]" in caught.value.mend


def test_every_error_comes_back_from_a_worker_as_it_was() -> None:
    family = [kind for kind in vars(errors).values() if isinstance(kind, type) and issubclass(kind, GridcarbError)]
    assert len(family) > 6
    for kind in family:
        error = kind("what", where="where", mend="mend")
        error.others = (errors.InputError("another"),)
        error.add_note("traceback")
        back = pickle.loads(pickle.dumps(error))
        assert (type(back), str(back), back.__notes__) == (kind, str(error), ["traceback"])
        assert (back.what, back.where, back.mend) == ("what", "where", "mend")
