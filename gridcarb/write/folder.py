"""The life of a result folder: built beside its target, and given the final name only when complete."""

from __future__ import annotations

import os
import shutil
from pathlib import Path

from gridcarb.errors import Notice, OutputError
from gridcarb.write import lock
from gridcarb.write.disk import nearest_folder, room_for, sync_folder, unwritable
from gridcarb.write.journal import JOURNAL


class ResultFolder:
    """The folder `target`, its working copy ``<target>.partial`` and its lock ``<target>.lock``, all side by side.

    Parameters
    ----------
    target : the folder a complete result will have.
    replace : whether an earlier result of that name may give way, once the new one is complete.

    The order of use is `check` (before any compute; also for a plan), `begin`, then `complete` or `abandon`. Whatever
    happens in between, an earlier result stays as it was.
    """

    def __init__(self, target: Path, *, replace: bool = False) -> None:
        self.target = target.resolve()
        self.replace = replace
        self.partial = self._beside("partial")
        self.lock = self._beside("lock")
        self._aside = self._beside("replaced")

    def check(self) -> None:
        """Raise `OutputError` if the target may not be written; touches nothing."""
        if not self.target.name:
            raise unwritable(self.target, "it is the root of the file system")
        parent = nearest_folder(self.target.parent)
        if not parent.is_dir():
            raise unwritable(self.target, f"{parent} is a file")
        if not os.access(parent, os.W_OK | os.X_OK):
            raise unwritable(parent, "no permission")
        if not self.target.exists():
            return
        if not self.replace:
            raise OutputError(
                "a result of this name exists already", where=str(self.target),
                mend="write `replace: true` under `output` in the recipe, choose another folder, or move the result away",
            )
        if not _is_result(self.target):
            raise OutputError(
                f"it is not a result of gridcarb (it holds no {JOURNAL}), so it will not be replaced",
                where=str(self.target), mend="choose another `output: {folder: ...}` in the recipe",
            )

    def begin(self, *, keep_partial: bool = False) -> tuple[Notice, ...]:
        """Take the lock and make the working copy; give back what was decided on the way.

        keep_partial : go on in what an interrupted run left, instead of starting with an empty folder.
        """
        with room_for(self.target.parent, 0):
            try:
                self.target.parent.mkdir(parents=True, exist_ok=True)
                found = lock.take(self.lock, self.target)
            except (FileExistsError, NotADirectoryError) as error:
                raise unwritable(self.target.parent, error) from error
        try:
            found += self._recover()
            self.check()
            if not keep_partial:
                found += self.clear()
            with room_for(self.partial, 0):
                self.partial.mkdir(exist_ok=True)
        except BaseException:
            self._unlock()
            raise
        return found

    def clear(self) -> tuple[Notice, ...]:
        """Empty the working copy; say so if an interrupted run had left anything there."""
        left = self.partial.exists() and any(self.partial.iterdir())
        if self.partial.exists():
            shutil.rmtree(self.partial)
        with room_for(self.partial, 0):
            self.partial.mkdir()
        told = Notice("partial_removed", "an interrupted run had left an incomplete result; it was removed")
        return (told,) if left else ()

    def complete(self) -> Path:
        """Give the working copy its final name; an earlier result goes only after the new one stands."""
        self.check()
        sync_folder(self.partial)
        if self.target.exists():
            self.target.rename(self._aside)
            try:
                self.partial.rename(self.target)
            except BaseException:
                self._aside.rename(self.target)
                raise
            sync_folder(self.target.parent)
            shutil.rmtree(self._aside)
        else:
            self.partial.rename(self.target)
            sync_folder(self.target.parent)
        self._unlock()
        return self.target

    def abandon(self) -> Path:
        """Give up: the working copy stays for a look or a later start, the lock goes."""
        self._unlock()
        return self.partial

    def _recover(self) -> tuple[Notice, ...]:
        """Finish a replacement that died between its two renames, or after them."""
        if not self._aside.exists():
            return ()
        if self.target.exists():
            shutil.rmtree(self._aside)
            return (Notice("replaced_removed", "a result that had been replaced was still there; it was removed"),)
        self._aside.rename(self.target)
        return (Notice("result_restored", "an interrupted replacement was undone; the earlier result is back"),)

    def _beside(self, word: str) -> Path:
        # Not with_suffix: the name of a result may hold dots of its own.
        return self.target.parent / f"{self.target.name}.{word}"

    def _unlock(self) -> None:
        self.lock.unlink(missing_ok=True)


def _is_result(folder: Path) -> bool:
    return folder.is_dir() and ((folder / JOURNAL).is_file() or not any(folder.iterdir()))
