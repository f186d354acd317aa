"""How long a NetCDF classic file must be.

The NetCDF library opens a classic file (CDF-1, CDF-2, CDF-5) that was cut short without complaint and hands out
whatever lies in its buffers for the missing end. The header says where every variable lies, so the length can be
checked (format: NetCDF User Guide, appendix "File format specifications").
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import BinaryIO

_SIZES = {1: 1, 2: 1, 3: 2, 4: 4, 5: 4, 6: 8, 7: 1, 8: 2, 9: 4, 10: 8, 11: 8}
"""Bytes of one value of each nc_type."""

_STREAMING = (2**32 - 1, 2**64 - 1)


class _Reader:
    """Big-endian numbers and the padded items of a classic header."""

    def __init__(self, stream: BinaryIO, version: int) -> None:
        self.stream = stream
        self.count_bytes = 8 if version == 5 else 4
        self.offset_bytes = 4 if version == 1 else 8

    def integer(self, length: int = 4) -> int:
        raw = self.stream.read(length)
        if len(raw) < length:
            raise EOFError
        return int.from_bytes(raw, "big")

    def count(self) -> int:
        return self.integer(self.count_bytes)

    def skip_padded(self, length: int) -> None:
        self.stream.seek(length + -length % 4, 1)

    def list_length(self) -> int:
        self.integer()
        return self.count()

    def skip_attributes(self) -> None:
        for _ in range(self.list_length()):
            self.skip_padded(self.count())
            size = _SIZES[self.integer()]
            self.skip_padded(size * self.count())


def expected_length(path: Path) -> int | None:
    """The least number of bytes the file must have; None if its header leaves that open.

    Raises
    ------
    EOFError : the header itself is cut short.
    """
    with path.open("rb") as file:
        head = file.read(4)
        reader = _Reader(file, head[3])
        records = reader.count()
        dims = []
        for _ in range(reader.list_length()):
            reader.skip_padded(reader.count())
            dims.append(reader.count())
        reader.skip_attributes()
        variables = [_variable(reader, dims) for _ in range(reader.list_length())]
        header_end = file.tell()
    if records in _STREAMING:
        return None
    recording = [(begin, size) for begin, size, is_record in variables if is_record]
    stride = recording[0][1] if len(recording) == 1 else sum(size + -size % 4 for _, size in recording)
    ends = [begin + size for begin, size, is_record in variables if not is_record]
    ends += [begin + (records - 1) * stride + size for begin, size in recording if records]
    return max([header_end, *ends])


def _variable(reader: _Reader, dims: list[int]) -> tuple[int, int, bool]:
    """Where a variable begins, its bytes (of one record, if it has records), whether it has records."""
    reader.skip_padded(reader.count())
    shape = [dims[reader.count()] for _ in range(reader.count())]
    reader.skip_attributes()
    size = _SIZES[reader.integer()]
    reader.count()  # vsize: redundant, and too small for variables above 4 GB
    begin = reader.integer(reader.offset_bytes)
    is_record = bool(shape) and shape[0] == 0
    return begin, size * math.prod(shape[1:] if is_record else shape), is_record
