"""Seals and looks: showing that a plan came before its results, and how often an outcome was met."""

from __future__ import annotations

from pathlib import Path

from beforehand.names import beside, looks_path, seal_path
from beforehand.sealing.holding import require_writable
from beforehand.sealing.looks import Look, add_look, plans_that_met, read_looks
from beforehand.sealing.making import seal_plan
from beforehand.sealing.seals import KINDS, SEEN, Amendment, Kind, Seal, Seen, append_seal, read_seals
from beforehand.sealing.standing import Standing, standing_of

__all__ = [
    "KINDS",
    "SEEN",
    "Amendment",
    "Kind",
    "Look",
    "Seal",
    "Seen",
    "Standing",
    "add_look",
    "append_seal",
    "beside",
    "looks_path",
    "plans_that_met",
    "read_looks",
    "read_seals",
    "require_writable",
    "seal_path",
    "seal_plan",
    "standing_of",
    "verify_chains",
]


def verify_chains(plan_path: Path) -> None:
    """Check every link of the seals and looks beside a plan, where there are any.

    Raises
    ------
    LockError
        With the place at which a chain breaks.
    """
    read_seals(seal_path(plan_path))
    read_looks(looks_path(plan_path))
