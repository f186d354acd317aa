"""What a process spares itself while it does blocks: giving memory back and asking for it again, and looking for rubbish.

The C library maps every large array anew, and the system clears each of its pages: with arrays of a few megabytes this
costs a third of a block's time. While blocks are done, freed memory is therefore held, and afterwards given back. Threads
share one heap instead of hoarding their own, if that is asked for before there are any. Nothing is done where the C
library is not the GNU one. And the interpreter's search for rubbish leaves out all that was there before the first block.
"""

from __future__ import annotations

import ctypes
import functools
import gc
import platform
from typing import Any

_TRIM_THRESHOLD, _TOP_PAD, _MMAP_THRESHOLD, _ARENA_MAX = -1, -2, -3, -8
"""Numbers of the settings in malloc.h of the GNU C library."""

_NEVER = 2**31 - 1
_PAD = 64 * 2**20
_USUAL = 2**25
"""What its thresholds grow to by themselves as large arrays come and go."""


def share_one_heap() -> None:
    """Have all threads that begin from now on take their memory from one heap."""
    library = _c_library()
    if library is not None:
        library.mallopt(_ARENA_MAX, 1)


def hold_memory() -> None:
    """From now on, freed memory stays with this process, and what is there now is not searched for rubbish."""
    gc.freeze()
    share_one_heap()
    library = _c_library()
    if library is not None:
        for setting, value in ((_MMAP_THRESHOLD, _NEVER), (_TRIM_THRESHOLD, _NEVER), (_TOP_PAD, _PAD)):
            library.mallopt(setting, value)


def give_back_memory() -> None:
    """Give back what is free, and hold nothing any more."""
    gc.unfreeze()
    library = _c_library()
    if library is not None:
        for setting, value in ((_MMAP_THRESHOLD, _USUAL), (_TRIM_THRESHOLD, 2 * _USUAL), (_TOP_PAD, 0)):
            library.mallopt(setting, value)
        library.malloc_trim(0)


@functools.cache
def _c_library() -> Any:
    """The GNU C library this process runs on; None if it is another."""
    if platform.libc_ver()[0] != "glibc":
        return None
    library = ctypes.CDLL(None)
    return library if hasattr(library, "mallopt") and hasattr(library, "malloc_trim") else None
