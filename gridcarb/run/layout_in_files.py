"""How the fields lie in their files, and what that means for reading them."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from gridcarb.run.findings import Finding
from gridcarb.sources import ArraySource, Collection
from gridcarb.write.disk import sized

_LARGE = 32 * 2**20
"""A chunk of more bytes (uncompressed) makes small blocks dear: each decompresses the whole of every chunk it needs."""

_SMALL = 16 * 2**10
"""Chunks of fewer bytes cost more in looking up than in reading."""

_MANY = 10_000


def chunk_findings(collection: Collection) -> Iterator[Finding]:
    """One finding for every way in which the roles are stored."""
    groups: dict[tuple[tuple[str, ...], tuple[int, ...] | None, str], list[str]] = {}
    for role, source in collection.roles.items():
        array = source.array
        groups.setdefault((array.dims, array.chunks, array.dtype), []).append(role)
    for roles in groups.values():
        array = collection.roles[roles[0]].array
        text, cure = _contiguous(array) if array.chunks is None else _chunked(array, array.chunks, collection)
        yield Finding("fine", "chunks", f"{', '.join(roles)}: {text}", cure=cure)


def _contiguous(array: ArraySource) -> tuple[str, str]:
    files = len(array.segments)
    return f"contiguous, {sized(array.nbytes)} in {files} file{'s' * (files != 1)}; any slice is read by itself", ""


def _chunked(array: ArraySource, chunks: tuple[int, ...], collection: Collection) -> tuple[str, str]:
    shape = dict(zip(array.dims, chunks, strict=True))
    size = math.prod(chunks) * np.dtype(array.dtype).itemsize
    count = math.prod(math.ceil(length / chunk) for length, chunk in zip(array.shape, chunks, strict=True) if chunk)
    text = " x ".join(f"{dim} {length}" for dim, length in shape.items()) or "one value"
    text = f"chunks of {text} ({sized(size)} uncompressed), {count:,} in all"
    steps = shape.get(collection.axes.time or "", 1)
    if size > _LARGE:
        return f"{text}; a block that needs any part of a chunk decompresses the whole of it", (
            f"let blocks hold whole chunks (`engine: {{block: {{time: {steps}}}}}` and `memory`), or rewrite the files in "
            "chunks of 1 to 16 MB"
        )
    if size < _SMALL and count > _MANY:
        return f"{text}; so many small chunks take longer to find than to read", "rewrite the files in chunks of 1 to 16 MB"
    return text, ""
