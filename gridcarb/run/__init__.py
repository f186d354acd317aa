"""The run: the one place that joins the stages.

`audit_files` and `audit_recipe` tell everything about inputs, `prepare` turns a recipe into a plan from headers alone,
`conduct` carries the plan out, `derive` does the same work lazily on a dataset in memory.
"""

from __future__ import annotations

from gridcarb.run.audit import Audit, audit_files, audit_recipe
from gridcarb.run.conduct import conduct
from gridcarb.run.lazy import derive
from gridcarb.run.plan import Plan, prepare

__all__ = ["Audit", "Plan", "audit_files", "audit_recipe", "conduct", "derive", "prepare"]
