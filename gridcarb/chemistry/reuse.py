"""Reusing scratch rows: a row whose last reader has passed is handed to the next result, so that a tile's working set
stays in the cache."""

from __future__ import annotations

from collections.abc import Iterable, Sequence


def assign_rows(
    work: Sequence[tuple[tuple[int, ...], tuple[int, ...]]], fixed: int, kept: Iterable[int]
) -> tuple[dict[int, int], int]:
    """Give every name a row.

    Parameters
    ----------
    work : (names written, names read) of each step, in order.
    fixed : names 0 ... fixed-1 are inputs; their rows are their own numbers and are never reused.
    kept : names that must survive to the end.

    Returns
    -------
    name -> row, and the number of rows.
    """
    last_read = {name: place for place, (_, reads) in enumerate(work) for name in reads}
    last_read.update(dict.fromkeys(kept, len(work)))
    rows = {name: name for name in range(fixed)}
    free: list[int] = []
    count = fixed
    for place, (writes, reads) in enumerate(work):
        for name in writes:
            if free:
                rows[name] = free.pop()
            else:
                rows[name], count = count, count + 1
        spent = {name for name in (*reads, *writes) if name >= fixed and last_read.get(name, place) <= place}
        free.extend(sorted(rows[name] for name in spent))
    return rows, count
