"""One run at a time on one result: a small file that says which host and process is at work, and since when."""

from __future__ import annotations

import json
import os
import socket
from dataclasses import asdict, dataclass
from datetime import UTC, datetime
from pathlib import Path

import psutil

from gridcarb.errors import Notice, OutputError


@dataclass(frozen=True)
class Holder:
    """Who holds a lock: host, process id, the second that process began (it tells a reused id apart), and since when."""

    host: str
    pid: int
    born: float
    since: str

    @classmethod
    def myself(cls) -> Holder:
        """This process, from now on."""
        pid = os.getpid()
        return cls(socket.gethostname(), pid, psutil.Process(pid).create_time(),
                   datetime.now(UTC).isoformat(timespec="seconds"))

    def is_dead(self) -> bool:
        """Whether the process surely lives no more; that of another host cannot be known from here."""
        if not self.is_of_this_host():
            return False
        try:
            born = float(psutil.Process(self.pid).create_time())
        except psutil.NoSuchProcess:
            return True
        except psutil.AccessDenied:
            return False
        # Births are reckoned from the boot time, which may shift by a fraction of a second.
        return abs(born - self.born) > 2

    def is_of_this_host(self) -> bool:
        """Whether the process can be looked at from here."""
        return self.host == socket.gethostname()

    def __str__(self) -> str:
        return f"process {self.pid} on {self.host}, since {self.since}"


def take(lock: Path, target: Path) -> tuple[Notice, ...]:
    """Take the lock of `target`, or raise `OutputError` naming who holds it.

    A lock left by a dead process of this host is cleaned away; the notice returned says so.
    """
    notices: tuple[Notice, ...] = ()
    if not _create(lock):
        holder = holder_of(lock)
        if holder is None or not holder.is_dead():
            raise _refusal(lock, target, holder)
        _clear(lock, target, holder)
        notices = (Notice("stale_lock", f"a run that no longer lives had left its lock ({holder}); it was removed"),)
        if not _create(lock):
            raise _refusal(lock, target, holder_of(lock))
    return notices


def _create(lock: Path) -> bool:
    try:
        handle = os.open(lock, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o644)
    except FileExistsError:
        return False
    with os.fdopen(handle, "w", encoding="utf-8") as file:
        json.dump(asdict(Holder.myself()), file)
    return True


def holder_of(lock: Path) -> Holder | None:
    """Who holds a lock; None if there is none that can be read."""
    try:
        return Holder(**json.loads(lock.read_text(encoding="utf-8")))
    except (OSError, ValueError, TypeError):
        return None


def _clear(lock: Path, target: Path, dead: Holder) -> None:
    """Remove the lock of `dead`, by a rename that only one of several processes can win."""
    aside = lock.with_name(f"{lock.name}.{os.getpid()}")
    try:
        lock.rename(aside)
    except FileNotFoundError:
        return
    taken = holder_of(aside)
    if taken != dead:
        # Between the look and the rename another run had cleaned up and taken the lock: give it back.
        aside.rename(lock)
        raise _refusal(lock, target, taken)
    aside.unlink()


def _refusal(lock: Path, target: Path, holder: Holder | None) -> OutputError:
    return OutputError(
        f"another run is at work on this result: {holder or 'its lock cannot be read'}",
        where=str(target),
        mend=f"wait for it to end, or choose another `output: {{folder: ...}}`; if it surely lives no more, delete {lock}",
    )
