"""Names of the files that belong to a plan."""

from __future__ import annotations

from pathlib import Path

from beforehand.names import beside


def lock_beside(plan: Path) -> Path:
    """``NAME.lock.yaml`` beside ``NAME.plan.yaml``."""
    return beside(plan, ".lock.yaml")


def plan_beside(table: Path) -> Path:
    """``NAME.plan.yaml`` beside a table ``NAME.csv``."""
    return table.with_name((table.stem or table.name) + ".plan.yaml")
