"""A second making of parts of a result, aside from it: to compare with, and to mend from."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from tempfile import TemporaryDirectory

from gridcarb.errors import GridcarbError
from gridcarb.recipe import Recipe
from gridcarb.recipe.model import Origin
from gridcarb.run.charter import Charter
from gridcarb.run.frame import make_store
from gridcarb.run.marking import marker_of
from gridcarb.run.plan import STORE, Plan, prepare
from gridcarb.run.task import run_block
from gridcarb.write.ledger import Marker
from gridcarb.write.proof import Proof


class Workshop:
    """An empty store of the same frame, in which blocks are made again from the inputs.

    Raises
    ------
    GridcarbError : the inputs can no longer be read as they were.
    """

    def __init__(self, charter: Charter, folder: Path) -> None:
        self._charter = charter
        plan = planned(charter, folder / "result", figures=False)
        self.plan = replace(plan, layout=charter.grid_layout())
        self.store = folder / STORE
        job = self.plan.job(folder)
        self._job = replace(job, recipe=charter.recipe_digest, inputs=charter.inputs_digest)
        self.obstacles = charter.differences(Charter.of(self.plan, charter.began))

    def lay_foundation(self) -> None:
        """Make the store."""
        make_store(self.plan, self.store, self._charter.began)

    def redo(self, block: int) -> Marker:
        """Make a block again, in the store of the workshop; gives the marker it deserves."""
        return marker_of(self._job, run_block(self._job, block))

    def files(self, marker: Marker) -> Iterator[tuple[Path, str]]:
        """Place inside the store and checksum of each chunk file of a block that was made again; "" for no file."""
        for _, path, checksum in Proof(self.store).files(marker):
            yield path.relative_to(self.store), checksum


def planned(charter: Charter, folder: Path, *, figures: bool) -> Plan:
    """The plan of a charter for another folder; paths of its recipe mean what they meant."""
    settings = dict(charter.settings)
    settings["output"] = {**settings["output"], "folder": str(folder), "replace": True}
    if not figures:
        settings["figures"] = []
    return prepare(Recipe.model_validate(settings, context=Origin(Path(charter.base))))


@contextmanager
def workshop(charter: Charter) -> Iterator[Workshop | list[str]]:
    """A workshop for the time being, or the reasons why the result cannot be made again here."""
    with TemporaryDirectory(prefix="gridcarb-") as folder:
        try:
            found = Workshop(charter, Path(folder))
            if not found.obstacles:
                found.lay_foundation()
        except GridcarbError as error:
            yield [str(error).replace("\n", "; ")]
            return
        yield found.obstacles or found
