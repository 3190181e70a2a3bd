"""Names of the files that belong to a plan."""

from __future__ import annotations

import os
from pathlib import Path

_PLAN_ENDS = (".plan.yaml", ".plan.yml", ".yaml", ".yml")


def beside(plan: str | os.PathLike[str], ending: str) -> Path:
    """The file of a plan's name with another ending, such as ``.seal.yaml``, beside the plan."""
    path = Path(plan)
    end = next((end for end in _PLAN_ENDS if path.name.endswith(end) and path.name != end), "")
    return path.with_name(path.name.removesuffix(end) + ending)


def seal_path(plan: str | os.PathLike[str]) -> Path:
    """``NAME.seal.yaml`` beside ``NAME.plan.yaml``."""
    return beside(plan, ".seal.yaml")


def looks_path(plan: str | os.PathLike[str]) -> Path:
    """``NAME.looks`` beside ``NAME.plan.yaml``."""
    return beside(plan, ".looks")
