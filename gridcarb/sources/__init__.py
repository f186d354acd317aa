"""Sources: a lazy dataset from files, with nothing changed in it.

`gather` reads headers and checks that all files fit together, `survey` tells all that is there and all that is wrong;
`open_collection` gives the numbers as stored, under the names of the roles; `find_roles` applies the same rules to a
dataset in memory; `keep_chunks` lets blocks share what they read; `close_all` lets go of all that reading has kept.
"""

from __future__ import annotations

from gridcarb.sources.collection import ArraySource, Collection, FileRecord, RoleSource, Segment
from gridcarb.sources.gather import gather
from gridcarb.sources.kept_chunks import chunks_kept, close_all, keep_chunks
from gridcarb.sources.lazy import open_collection
from gridcarb.sources.roles import find_roles
from gridcarb.sources.settings import InputsSettings, RoleInput
from gridcarb.sources.survey import Chance, FileSurvey, Survey, VariableSurvey, survey

__all__ = [
    "ArraySource", "Chance", "Collection", "FileRecord", "FileSurvey", "InputsSettings", "RoleInput", "RoleSource",
    "Segment", "Survey", "VariableSurvey", "chunks_kept", "close_all", "find_roles", "gather", "keep_chunks",
    "open_collection", "survey",
]
