"""The order that goes to the workers: the path of the job and its digest. Each worker reads the job once."""

from __future__ import annotations

import functools
import hashlib
import pickle
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from gridcarb.chemistry.program import program
from gridcarb.errors import EngineError
from gridcarb.held_memory import hold_memory
from gridcarb.run.charter import numeric_versions
from gridcarb.run.marking import do_block
from gridcarb.run.task import Job, Record
from gridcarb.write.disk import room_for

_NAME = "job.pickle"
_LOCK = threading.Lock()


@dataclass(frozen=True)
class BlockOrder:
    """A job on disk, which all workers can read.

    path : the file.
    digest : SHA-256 of its contents: a worker never takes an earlier job, or anyone else's file, for this one.
    """

    path: str
    digest: str

    def ready(self) -> None:
        """Read the job and compile its chemistry; from here on this process holds the memory of its blocks."""
        hold_memory()
        job = self._job()
        program(job.constants, tuple(entry.key for entry in job.fields if entry.part == "derived"), job.solved_in)

    def __call__(self, number: int, parts: int) -> Record:
        """Do block `number` and mark it."""
        return do_block(self._job(), number, parts)

    def _job(self) -> Job:
        with _LOCK:  # of many threads that ask at once, one reads
            return _job_at(self.path, self.digest)


@contextmanager
def placed_order(job: Job, folder: Path) -> Iterator[BlockOrder]:
    """The order for a job, which lies in `folder` meanwhile: a place all workers see."""
    content = pickle.dumps((numeric_versions(), job), protocol=pickle.HIGHEST_PROTOCOL)
    path = folder / _NAME
    with room_for(path, len(content)):
        path.write_bytes(content)
    try:
        yield BlockOrder(str(path), hashlib.sha256(content).hexdigest())
    finally:
        path.unlink(missing_ok=True)


@functools.lru_cache(maxsize=1)
def _job_at(path: str, digest: str) -> Job:
    """The job, if the file is the one of the order and this worker's program is the one that wrote it.

    Raises
    ------
    EngineError : it is not.
    """
    try:
        content = Path(path).read_bytes()
    except OSError as error:
        raise EngineError(
            f"this worker cannot read the result folder ({error.strerror})", where=path,
            mend="give a result folder, and inputs, that all workers see under the same path",
        ) from None
    if hashlib.sha256(content).hexdigest() != digest:
        raise EngineError("the job in the result folder is another than was ordered", where=path,
                          mend="let one run at a time work on a result")
    versions, job = pickle.loads(content)
    here = numeric_versions()
    if versions != here:
        differing = [f"{name} {versions.get(name)} there, {here.get(name)} here" for name in here
                     if versions.get(name) != here.get(name)]  # fmt: skip
        raise EngineError(
            f"this worker's program is not the one the run was begun with: {'; '.join(differing)}", where=path,
            mend="install the same versions for the run and all its workers",
        )
    found: Job = job
    return found
