"""The `engine` section of a recipe: which machines do the blocks, and how much of them a run may use."""

from __future__ import annotations

from typing import Annotated, Literal, get_args

from dask.utils import parse_bytes
from pydantic import Field, StringConstraints, model_validator

from gridcarb.errors import UnknownWordError, did_you_mean
from gridcarb.settings import Settings

Kind = Literal["threads", "processes", "scheduler", "hosts", "queue"]
Memory = Annotated[str, StringConstraints(pattern=r"(?i)^\d+(\.\d+)? ?[kMGT]i?B$")]
Count = Annotated[int, Field(ge=1, strict=True)]
Word = Annotated[str, StringConstraints(min_length=1, strip_whitespace=True)]


class BlockSettings(Settings):
    """A stated block size, for those who know better than the planner; rounded up to whole chunks of the store."""

    time: Count | None = Field(None, description="time steps of one block; default: chosen by the planner")
    cells: Count | None = Field(None, description="grid columns of one block; default: chosen by the planner")


class QueueSettings(Settings):
    """Jobs of a batch queue, each holding `workers` that share `memory`."""

    system: Literal["slurm", "pbs", "sge", "lsf", "oar"] = Field(description="kind of batch system")
    jobs: Count = Field(1, description="jobs to ask for")
    name: Word | None = Field(None, description="queue or partition; default: that of the system")
    account: Word | None = Field(None, description="account or project the time is charged to")
    walltime: Word | None = Field(None, description="longest time of a job, in the system's own way of writing it")
    interface: Word | None = Field(None, description="network interface the workers are to use, such as 'ib0'")
    directives: tuple[Word, ...] = Field((), description="further lines of the head of the job script")
    before: tuple[Word, ...] = Field((), description="shell lines before the worker starts, such as 'module load ...'")


class EngineSettings(Settings):
    """Which machines do the blocks, and how much of them. Nothing here changes a number of the result."""

    kind: Kind | None = Field(None, description=(
        "who does the blocks; default: whichever of `address`, `hosts` and `queue` is given, else threads"))
    workers: Count | None = Field(None, description=(
        "blocks computed at the same time, on each host or in each job; default: one a core of this machine"))
    memory: Memory | None = Field(None, description=(
        "memory the workers of one machine share, such as '2 GB'; default: chosen by the planner"))
    block: BlockSettings | None = Field(None, description="stated block size; default: chosen by the planner")
    retries: Annotated[int, Field(ge=0, le=10, strict=True)] = Field(
        1, description="how often a block that failed is tried again, before it is done in halves")
    address: Word | None = Field(None, description="of a dask scheduler that runs already, such as tcp://host:8786")
    hosts: tuple[Word, ...] | None = Field(
        None, min_length=1, description="hosts to start workers on over SSH; the first one holds the scheduler as well")
    python: Word | None = Field(None, description="the Python on the hosts or in the jobs; default: the path of this one")
    queue: QueueSettings | None = Field(None, description=QueueSettings.__doc__)

    @model_validator(mode="after")
    def _one_kind(self) -> EngineSettings:
        """A kind that is stated needs its own key only: those of other kinds may wait for another day."""
        given = [key for key in _NEEDED.values() if getattr(self, key) is not None]
        if self.kind in _NEEDED and _NEEDED[self.kind] not in given:
            raise UnknownWordError(f"`kind: {self.kind}` needs `{_NEEDED[self.kind]}`", mend=_EXAMPLES[self.kind])
        if self.kind is None and len(given) > 1:
            raise UnknownWordError(f"more than one kind of engine is told: {', '.join(given)}", mend=(
                "write `kind: ...` under `engine`, one of: " + ", ".join(key for key in _NEEDED if _NEEDED[key] in given)))
        return self

    @property
    def chosen(self) -> Kind:
        """The kind stated, or the one whose key is given."""
        given: Kind = next((kind for kind, key in _NEEDED.items() if getattr(self, key) is not None), "threads")
        return self.kind or given

    @property
    def memory_bytes(self) -> int | None:
        """The memory allowed, in bytes (kB, MB, GB, TB count in thousands, KiB ... in 1024); None if not stated."""
        return None if self.memory is None else int(parse_bytes(self.memory))

    @property
    def machines(self) -> int:
        """Hosts or jobs that each have `workers` of their own; 1 where they are all counted together."""
        if self.chosen == "hosts":
            return len(self.hosts or ())
        return self.queue.jobs if self.chosen == "queue" and self.queue else 1


_NEEDED: dict[Kind, str] = {"scheduler": "address", "hosts": "hosts", "queue": "queue"}
_EXAMPLES: dict[Kind, str] = {
    "scheduler": "write `address: tcp://host:8786` under `engine`",
    "hosts": "write `hosts: [one, two]` under `engine`",
    "queue": "write `queue: {system: slurm, jobs: 4}` under `engine`",
}


def spoken_engine(words: str) -> dict[str, object]:
    """What `--engine` lays over the section: a kind, or the address of a scheduler."""
    if "://" in words:
        return {"kind": "scheduler", "address": words}
    if words not in get_args(Kind):
        raise UnknownWordError(
            f"'{words}' is no engine", where="--engine",
            mend=f"{did_you_mean(words, get_args(Kind))}; or give the address of a scheduler, such as tcp://host:8786",
        )
    return {"kind": words}
