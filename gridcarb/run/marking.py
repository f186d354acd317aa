"""Marking a block as finished: the last thing its task does."""

from __future__ import annotations

from typing import cast

from gridcarb.errors import OutputError
from gridcarb.products.ranges import Ranges
from gridcarb.run.task import Job, Record, run_block
from gridcarb.write.ledger import LEDGER, Ledger, Marker

STATUS = "solution_status"


def do_block(job: Job, number: int, parts: int = 1) -> Record:
    """Do a block and mark it in the ledger beside the store. Doing it twice leaves the same bytes and the same mark."""
    record = run_block(job, number, parts)
    try:
        Ledger(job.store.parent / LEDGER).put(marker_of(job, record))
    except OutputError as error:
        error.where = f"{error.where} ({job.name(number)})"
        raise
    return record


def marker_of(job: Job, record: Record) -> Marker:
    """The marker of a block that is done."""
    status = cast(Ranges, record.tallies["ranges"]).shares[STATUS].report()
    return Marker(
        record.number, job.recipe, job.inputs, {dim: (part.start, part.stop) for dim, part in record.region.items()},
        record.cells, {key: written.values for key, written in record.checksums.items()},
        {key: written.chunks for key, written in record.checksums.items()},
        {word: count for word, count in status.items() if count}, record.masked, record.seconds, record.tallies,
    )
