"""The journal of a run: everything needed to understand a result, and to make it again."""

from __future__ import annotations

import platform
from collections.abc import Sequence
from datetime import UTC, datetime
from importlib.metadata import version
from typing import TYPE_CHECKING

from gridcarb.chemistry import CONSTANTS
from gridcarb.citations import CITATIONS
from gridcarb.errors import Notice
from gridcarb.run.contents import audit_data
from gridcarb.run.report import plan_data

if TYPE_CHECKING:
    from gridcarb.run.plan import Plan

_LIBRARIES = ("gridcarb", "numpy", "numba", "xarray", "dask", "zarr", "netCDF4", "gsw", "cftime", "matplotlib", "cartopy")


def journal_head(plan: Plan, begun: datetime, notices: Sequence[Notice], resumed: int | None = None) -> dict[str, object]:
    """What is known before the first block; `notices` are those of the plan and of the begin.

    resumed : blocks that an interrupted run had finished; None if there was none.
    """
    recipe = plan.recipe
    return {
        "state": "running",
        "begun": begun.isoformat(timespec="seconds"),
        "blocks_taken_up": resumed,
        "recipe": {"path": str(recipe.path) if recipe.path else None, "sha256": recipe.digest, "text": recipe.text},
        "files": [
            {"path": each.path, "bytes": each.size, "mtime_ns": each.mtime_ns, "fingerprint": each.fingerprint}
            for each in plan.collection.files
        ],
        "versions": {"python": platform.python_version(), **{name: version(name) for name in _LIBRARIES}},
        "constants": _constants(recipe.chemistry.constants),
        "engine": {"kind": recipe.engine.chosen, **recipe.engine.model_dump(exclude_none=True)},
        "plan": plan_data(plan, notices),
        "audit": audit_data(plan.survey, plan.findings),
    }


def journal_tail(state: str, **more: object) -> dict[str, object]:
    """What is added when a run is over: state is "complete", "failed" or "interrupted"."""
    return {"state": state, "ended": datetime.now(UTC).isoformat(timespec="seconds"), **more}


def _constants(key: str) -> dict[str, object]:
    chosen = CONSTANTS[key]
    cited = chosen.citations()
    keys = dict.fromkeys(citation for keys in cited.values() for citation in keys)
    return {
        "key": chosen.key,
        "title": chosen.title,
        "from": {name: list(keys) for name, keys in cited.items()},
        "citations": {citation: CITATIONS[citation].text for citation in keys},
        "valid_for": {"temperature": list(chosen.temperature_range), "salinity": list(chosen.salinity_range)},
    }
