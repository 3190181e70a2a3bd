"""The whole comparison of two sides: the plans, and the records where both sides have one."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable
from dataclasses import dataclass

from beforehand.comparing.locks import LockComparison, lock_changes
from beforehand.comparing.plans import Change, plan_changes
from beforehand.comparing.rules import GRADES_IN_ORDER, Grade
from beforehand.comparing.sides import Side, read_side
from beforehand.faults import Fault, InputError
from beforehand.lock import Lock
from beforehand.plan import Plan


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """Two sides compared.

    Attributes
    ----------
    old, new : str
        As the caller named them.
    changes : tuple of Change
        Of the plan, in the order of the language.
    locks : LockComparison or None
        Where both sides have a lock.
    """

    old: str
    new: str
    changes: tuple[Change, ...]
    locks: LockComparison | None

    @property
    def same(self) -> bool:
        """Whether nothing differs."""
        return not self.changes and (self.locks is None or self.locks.same)

    @property
    def counts(self) -> dict[Grade, int]:
        """How many changes have each grade."""
        return {grade: sum(one.grade == grade for one in self.changes) for grade in GRADES_IN_ORDER}

    def fails(self, grades: Iterable[str]) -> bool:
        """Whether a change has one of these grades; with none named, whether anything differs."""
        wanted = set(grades)
        return any(one.grade in wanted for one in self.changes) if wanted else not self.same


def comparison(old: Side, new: Side, locks: tuple[Lock, Lock] | None = None) -> Comparison:
    """Compare two sides.

    Parameters
    ----------
    old, new : Side
    locks : pair of Lock, optional
        Records of both sides where the sides themselves are not both locks.
    """
    if locks is None and old.lock is not None and new.lock is not None:
        locks = old.lock, new.lock
    of_locks = None if locks is None else lock_changes(*locks)
    changes = plan_changes(old.plan, new.plan) if of_locks is None else of_locks.changes
    return Comparison(old=old.name, new=new.name, changes=changes, locks=of_locks)


def compared(
    old: str | os.PathLike[str], new: str | os.PathLike[str], run: Callable[[Plan], Lock] | None = None
) -> Comparison:
    """Read two sides and compare them.

    Parameters
    ----------
    old, new : path
        As of ``read_side``.
    run : callable, optional
        Makes the record of a plan; with it the records are compared also where a side is a plan.

    Raises
    ------
    InputError, PlanError, LockError
        A side cannot be read, or nothing is left to run.
    """
    sides = read_side(old), read_side(new)
    if run is None:
        return comparison(*sides)
    if all(side.lock is not None for side in sides):
        what = "is of no use for two locks, which hold their results already"
        raise InputError([Fault(file="--data", line=None, place="", what=what, code="data_unused")])
    first, second = (run(side.plan) if side.lock is None else side.lock for side in sides)
    return comparison(*sides, locks=(first, second))
