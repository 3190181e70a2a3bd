"""Names of the files that belong to a plan."""

from __future__ import annotations

from pathlib import Path

_PLAN_ENDS = (".plan.yaml", ".plan.yml", ".yaml", ".yml")


def lock_beside(plan: Path) -> Path:
    """``NAME.lock.yaml`` beside ``NAME.plan.yaml``."""
    end = next((end for end in _PLAN_ENDS if plan.name.endswith(end) and plan.name != end), "")
    return plan.with_name(plan.name.removesuffix(end) + ".lock.yaml")


def plan_beside(table: Path) -> Path:
    """``NAME.plan.yaml`` beside a table ``NAME.csv``."""
    return table.with_name((table.stem or table.name) + ".plan.yaml")
