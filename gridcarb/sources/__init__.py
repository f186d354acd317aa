"""Sources: a lazy dataset from files, with nothing changed in it.

`gather` reads headers and checks that all files fit together; `open_collection` gives the numbers as stored, under the
names of the roles; `find_roles` applies the same rules to a dataset in memory; `close_all` lets go of the files that
reading has kept open.
"""

from __future__ import annotations

from gridcarb.sources.collection import ArraySource, Collection, FileRecord, RoleSource, Segment
from gridcarb.sources.gather import gather
from gridcarb.sources.handles import close_all
from gridcarb.sources.lazy import open_collection
from gridcarb.sources.roles import find_roles
from gridcarb.sources.settings import InputsSettings, RoleInput

__all__ = [
    "ArraySource", "Collection", "FileRecord", "InputsSettings", "RoleInput", "RoleSource", "Segment", "close_all",
    "find_roles", "gather", "open_collection",
]
