"""A shelf: a named, ordered registry, filled by importing one package and then closed."""

from __future__ import annotations

import importlib
import pkgutil
from collections.abc import Iterator, Mapping
from typing import Generic, TypeVar

from gridcarb.errors import UnknownWordError, did_you_mean

T = TypeVar("T")


class Shelf(Mapping[str, T], Generic[T]):
    """Entries by key, in the order they were put there.

    A key can be used once. A closed shelf takes nothing more. Asking for a word that is not there raises
    `UnknownWordError` with the nearest words.
    """

    def __init__(self, noun: str) -> None:
        self.noun = noun
        self._entries: dict[str, T] = {}
        self._closed = False

    def put(self, key: str, entry: T) -> T:
        """Put `entry` on the shelf under `key` and give it back."""
        if self._closed:
            raise RuntimeError(f"the shelf of {self.noun}s is closed; '{key}' came after loading")
        if key in self._entries:
            raise RuntimeError(f"two {self.noun}s are called '{key}'")
        self._entries[key] = entry
        return entry

    def close(self) -> None:
        self._closed = True

    def __getitem__(self, key: str) -> T:
        try:
            return self._entries[key]
        except KeyError:
            raise UnknownWordError(f"there is no {self.noun} '{key}'", mend=did_you_mean(str(key), self._entries)) from None

    def get(self, key: str, default: T | None = None) -> T | None:  # type: ignore[override]
        return self._entries.get(key, default)

    def __contains__(self, key: object) -> bool:
        return key in self._entries

    def __iter__(self) -> Iterator[str]:
        return iter(self._entries)

    def __len__(self) -> int:
        return len(self._entries)


def load_folder(package: str) -> None:
    """Import every module of `package`, by name, so that each can put its entries on a shelf."""
    folder = importlib.import_module(package)
    for module in sorted(info.name for info in pkgutil.iter_modules(folder.__path__)):
        importlib.import_module(f"{package}.{module}")
