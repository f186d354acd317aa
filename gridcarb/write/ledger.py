"""The ledger of a result: one small marker for each finished block, written last, that says what the block left.

A missing chunk and a chunk of land look alike in a store, so "it exists" proves nothing; a marker does. It is written
under a temporary name and renamed, after everything it vouches for. Markers lie a thousand to a folder, so that of a
million blocks each is found without a search, and many workers write at once without reading each other's.
"""

from __future__ import annotations

import base64
import io
import json
import os
import pickle
import threading
import zlib
from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass, field, replace
from pathlib import Path
from typing import Any

from gridcarb.errors import OutputError
from gridcarb.write.disk import room_for, settle

LEDGER = "ledger"
"""The name of the ledger in a result folder."""

_CHARTER = "charter.json"
_FAILED = "failed"
_SUFFIX = ".json"
_TO_A_FOLDER = 1000


@dataclass(frozen=True)
class Marker:
    """What a finished block left.

    block : its number, 0-based.
    recipe, inputs : digests of what the run was made of, as in the charter.
    region : dimension -> (start, stop).
    cells : how many cells it has.
    values : field -> checksum of its numbers, as stored.
    chunks : field -> checksum of each chunk file of the region, in the order of the chunks; "" for one of nothing but
        fill, which has no file.
    status : status word -> number of cells.
    masked : rule -> number of cells masked by it.
    seconds : leg of the task -> seconds.
    tallies : product -> its share of the summary.
    """

    block: int
    recipe: str
    inputs: str
    region: Mapping[str, tuple[int, int]]
    cells: int
    values: Mapping[str, str]
    chunks: Mapping[str, tuple[str, ...]]
    status: Mapping[str, int] = field(default_factory=dict)
    masked: Mapping[str, int] = field(default_factory=dict)
    seconds: Mapping[str, float] = field(default_factory=dict)
    tallies: Mapping[str, Any] = field(default_factory=dict)

    def slices(self) -> dict[str, slice]:
        """The region as slices of the whole grid."""
        return {dim: slice(*ends) for dim, ends in self.region.items()}


class DamagedMarkerError(ValueError):
    """A marker that cannot be read, or is not of this block and run."""


class Ledger:
    """The markers in `folder`, and the charter: what the run is made of."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    def open(self, charter: Mapping[str, Any]) -> None:
        """Begin a ledger, or put another charter into it."""
        self.folder.mkdir(exist_ok=True)
        content = {**charter, "check": _check(charter)}
        _write(self.folder / _CHARTER, json.dumps(content, indent=1, ensure_ascii=False), lasting=True)

    def charter(self) -> dict[str, Any] | None:
        """What `open` was given; None if there is none that can be read."""
        try:
            found = json.loads((self.folder / _CHARTER).read_text(encoding="utf-8"))
        except (OSError, ValueError):
            return None
        return found if isinstance(found, dict) and found.pop("check", None) == _check(found) else None

    def place(self, block: int) -> Path:
        """Where the marker of a block lies."""
        return self.folder / f"{block // _TO_A_FOLDER:04d}" / f"{block:07d}{_SUFFIX}"

    def put(self, marker: Marker) -> None:
        """Mark a block as finished; everything it vouches for must be written. Marking it twice is no harm."""
        content = asdict(replace(marker, tallies={})) | {"tallies": _packed(marker.tallies)}
        content["check"] = _check(content)
        _write(self.place(marker.block), json.dumps(content, ensure_ascii=False))
        self._failure(marker.block).unlink(missing_ok=True)

    def get(self, block: int) -> Marker | None:
        """The marker of a block; None if it has none.

        Raises
        ------
        DamagedMarkerError : with what is wrong with it.
        """
        try:
            content = json.loads(self.place(block).read_bytes())
            if content.pop("check", None) != _check(content):
                raise DamagedMarkerError("its own checksum is not right")
            marker = Marker(**content | {
                "region": {dim: tuple(ends) for dim, ends in content["region"].items()},
                "chunks": {key: tuple(sums) for key, sums in content["chunks"].items()},
                "tallies": _unpacked(content["tallies"]),
            })
        except FileNotFoundError:
            return None
        except DamagedMarkerError:
            raise
        except Exception as error:
            raise DamagedMarkerError(f"it cannot be read ({type(error).__name__})") from error
        if marker.block != block:
            raise DamagedMarkerError(f"it is the marker of block {marker.block + 1}")
        return marker

    def drop(self, block: int) -> None:
        """Take back that a block is finished."""
        self.place(block).unlink(missing_ok=True)

    def blocks(self) -> Iterator[tuple[int, float]]:
        """Number of every block with a marker, sound or not, and the time it was written (s)."""
        for folder in sorted(self._folders()):
            with os.scandir(folder) as entries:
                for entry in sorted(entries, key=lambda entry: entry.name):
                    stem = entry.name.removesuffix(_SUFFIX)
                    if stem.isdecimal() and entry.name.endswith(_SUFFIX):
                        yield int(stem), entry.stat().st_mtime

    def count(self) -> int:
        """How many blocks have a marker. Names are counted and no marker is read, so this is quick on any ledger."""
        return sum(name[:1].isdecimal() for folder in self._folders() for name in os.listdir(folder))

    def last(self) -> float | None:
        """When the last block was marked (s since the epoch); None before the first."""
        return max((folder.stat().st_mtime for folder in self._folders()), default=None)

    def put_failure(self, block: int, told: Mapping[str, str]) -> None:
        """Note that a block failed and why; the note goes when the block is marked as finished."""
        _write(self._failure(block), json.dumps(dict(told), ensure_ascii=False))

    def failures(self) -> dict[int, dict[str, str]]:
        """Block -> why it failed, in order."""
        found = {}
        for path in sorted((self.folder / _FAILED).glob(f"[0-9]*{_SUFFIX}")):
            try:
                found[int(path.stem)] = dict(json.loads(path.read_text(encoding="utf-8")))
            except (OSError, ValueError):
                found[int(path.stem)] = {"what": "the note of this failure cannot be read"}
        return found

    def sweep(self) -> None:
        """Remove what writers that were killed have left half written."""
        for path in self.folder.rglob(".*"):
            path.unlink(missing_ok=True)

    def _failure(self, block: int) -> Path:
        return self.folder / _FAILED / f"{block:07d}{_SUFFIX}"

    def _folders(self) -> list[Path]:
        try:
            return [entry for entry in self.folder.iterdir() if entry.name.isdecimal()]
        except FileNotFoundError:
            return []


def _write(path: Path, text: str, *, lasting: bool = False) -> None:
    """Write whole or not at all; `lasting`: on the disk before it goes on.

    A marker is not brought to the disk by itself, which would cost more than a small block does: a resumed run looks again
    at what was written last before the end.
    """
    encoded = text.encode("utf-8")
    temporary = path.with_name(f".{path.name}.{os.getpid()}.{threading.get_ident()}")
    try:
        with room_for(path, len(encoded)):
            path.parent.mkdir(parents=True, exist_ok=True)
            temporary.write_bytes(encoded)
            if lasting:
                settle(temporary, path)
            else:
                temporary.replace(path)
    except OutputError:
        temporary.unlink(missing_ok=True)
        raise


def _packed(tallies: Mapping[str, Any]) -> str:
    """Tallies promise to be picklable, and are as exact as they were."""
    return base64.b64encode(zlib.compress(pickle.dumps(dict(tallies), protocol=5))).decode("ascii")


def _unpacked(text: str) -> dict[str, Any]:
    found: dict[str, Any] = _Reader(io.BytesIO(zlib.decompress(base64.b64decode(text)))).load()
    return found


class _Reader(pickle.Unpickler):
    """A result may come from anyone: nothing but tallies and arrays is made of what its markers say."""

    def find_class(self, module_name: str, global_name: str, /) -> Any:
        tally = module_name.startswith("gridcarb.products.") and global_name.isidentifier()
        if not tally and f"{module_name}.{global_name}" not in _OF_ARRAYS:
            raise pickle.UnpicklingError(f"{module_name}.{global_name} has no place in a marker")
        return super().find_class(module_name, global_name)


_OF_ARRAYS = frozenset({
    "numpy.ndarray", "numpy.dtype", "numpy._core.multiarray._reconstruct", "numpy._core.multiarray.scalar",
    "numpy._core.numeric._frombuffer",
})
"""What pickled arrays and numbers of NumPy are put together with."""


def _check(content: Mapping[str, Any]) -> str:
    """CRC-32 of a marker or charter without its check, in one spelling."""
    return f"crc32:{zlib.crc32(json.dumps(content, sort_keys=True).encode()):08x}"
