"""What a report is made of: a lock, what its plan says, and the records that stand beside it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

import yaml

from beforehand.lock import Lock
from beforehand.rehearsing.reading import rehearsal_beside
from beforehand.screen.planned import Planned, planned
from beforehand.sealing import looks_path, read_looks

if TYPE_CHECKING:
    from beforehand.rehearsing.models import RehearsalRecord


@dataclass(frozen=True)
class Context:
    """A lock and what stands beside it.

    Attributes
    ----------
    lock : Lock
    name : str
        Of the lock's file.
    rehearsal : RehearsalRecord or None
        Of the same plan.
    refresh : mapping or None
        The record of a refresh of this very lock.
    looks : int or None
        Runs on this outcome that stand in the register beside it.
    """

    lock: Lock
    name: str
    rehearsal: RehearsalRecord | None = None
    refresh: Mapping[str, Any] | None = None
    looks: int | None = None

    @cached_property
    def plan(self) -> Planned:
        """Units, roles and levels of the plan."""
        return planned(self.lock)

    @property
    def written(self) -> Mapping[str, Any]:
        """The plan as it stands in the lock."""
        return self.lock.plan.written


def context_of(lock: Lock, path: Path) -> Context:
    """A lock with the rehearsal, refresh and looks that stand beside it and fit it.

    Parameters
    ----------
    lock : Lock
    path : Path
        Where it was read from.
    """
    plan = path.with_name(lock.plan.file)
    register = looks_path(plan)
    return Context(
        lock=lock,
        name=path.name,
        rehearsal=rehearsal_beside(lock, plan),
        refresh=_refresh_beside(lock, plan),
        looks=len(read_looks(register)) if register.is_file() else None,
    )


def _refresh_beside(lock: Lock, plan: Path) -> Mapping[str, Any] | None:
    """The refresh of this lock; None where there is none, or it is of another."""
    from beforehand.names import beside

    path = beside(plan, ".refresh.yaml")
    try:
        found = yaml.safe_load(path.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, yaml.YAMLError):
        return None
    if not isinstance(found, Mapping):
        return None
    sides = [found.get("old"), found.get("new")]
    locks = {side.get("lock") for side in sides if isinstance(side, Mapping)}
    return found if lock.digest in locks else None
