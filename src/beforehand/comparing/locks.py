"""Two locks side by side: plan, rows, rulings, coefficients and fit.

Only what a reviewer asks for is compared value by value; of everything else in the record it is said
whether it differs, section by section. ``beforehand.lock.difference`` lists every place.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from beforehand.comparing.answers import CoefficientPair, Figure, coefficients, figures
from beforehand.comparing.paths import RulingPair, flipped, one_sided, parting
from beforehand.comparing.plans import Change, plan_changes
from beforehand.lock import Lock, RulingRecord
from beforehand.plan import Plan, plan_from_mapping

# Compared elsewhere, or outside the record of what happened.
_NOT_SECTIONS = frozenset({"lock", "plan", "environment", "digest", "sealed_plan"})


@dataclass(frozen=True, slots=True, kw_only=True)
class StagePair:
    """Rows left at one stage of the two runs; None on the side that has no such stage."""

    stage: str
    old: int | None
    new: int | None


@dataclass(frozen=True, slots=True, kw_only=True)
class FatePair:
    """How one predictor ended in the two runs.

    Attributes
    ----------
    predictor : str
    old, new : str or None
        Verdicts; None on the side that does not have the predictor.
    old_transform, new_transform : str or None
        Rungs of the ladder under which it stands or stood.
    """

    predictor: str
    old: str | None
    new: str | None
    old_transform: str | None
    new_transform: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class HoldsPair:
    """Whether the answer holds under one alternative; None on the side that does not declare it."""

    alternative: str
    old: bool | None
    new: bool | None


@dataclass(frozen=True, slots=True, kw_only=True)
class DataPair:
    """The two tables.

    Attributes
    ----------
    old_fingerprint, new_fingerprint : str
    old_rows, new_rows : int
        Rows read.
    comparable : bool
        Whether the same label names the same row in both.
    """

    old_fingerprint: str
    new_fingerprint: str
    old_rows: int
    new_rows: int
    comparable: bool

    @property
    def same(self) -> bool:
        """Whether the same values were read."""
        return self.old_fingerprint == self.new_fingerprint


@dataclass(frozen=True, slots=True, kw_only=True)
class LockComparison:
    """Two locks side by side.

    Attributes
    ----------
    changes : tuple of Change
        Of the plan.
    old_status, new_status : str
    data : DataPair
    ledger : tuple of StagePair
        Stages with another number of rows.
    rows_came, rows_went : tuple of str
        Labels of rows that were removed and no longer are, and of those that are removed now.
    predictors : tuple of FatePair
        Predictors that end otherwise.
    parting : RulingPair or None
        The first ruling at which the two runs go different ways.
    flipped : tuple of RulingPair
        Rulings on the same thing with another verdict.
    only_old, only_new : tuple of RulingRecord
        Rulings that only one of the runs had to make.
    coefficients : tuple of CoefficientPair
    figures : tuple of Figure
    alternatives : tuple of HoldsPair
        Alternatives under which the answer no longer, or now, holds, and those on one side only.
    sections : tuple of str
        Top-level parts of the record in which anything differs.
    """

    changes: tuple[Change, ...]
    old_status: str
    new_status: str
    data: DataPair
    ledger: tuple[StagePair, ...]
    rows_came: tuple[str, ...]
    rows_went: tuple[str, ...]
    predictors: tuple[FatePair, ...]
    parting: RulingPair | None
    flipped: tuple[RulingPair, ...]
    only_old: tuple[RulingRecord, ...]
    only_new: tuple[RulingRecord, ...]
    coefficients: tuple[CoefficientPair, ...]
    figures: tuple[Figure, ...]
    alternatives: tuple[HoldsPair, ...]
    sections: tuple[str, ...]

    @property
    def same(self) -> bool:
        """Whether the plans say the same and no part of the record differs."""
        return not self.changes and not self.sections


def lock_changes(old: Lock, new: Lock) -> LockComparison:
    """Compare two locks.

    Parameters
    ----------
    old, new : Lock

    Returns
    -------
    LockComparison

    Raises
    ------
    PlanError
        When the plan in one of them is not one that this program reads.
    """
    only_old, only_new = one_sided(old.rulings, new.rulings)
    removed = [{row.row for row in lock.rows_removed} for lock in (old, new)]
    data = _data(old, new)
    return LockComparison(
        changes=()
        if old.plan.whole == new.plan.whole
        else plan_changes(plan_of_lock(old), plan_of_lock(new)),
        old_status=old.status,
        new_status=new.status,
        data=data,
        ledger=_ledger(old, new),
        rows_came=tuple(row.row for row in old.rows_removed if row.row not in removed[1]),
        rows_went=tuple(row.row for row in new.rows_removed if row.row not in removed[0]),
        predictors=_fates(old, new),
        parting=parting(old.rulings, new.rulings),
        flipped=flipped(old.rulings, new.rulings),
        only_old=only_old,
        only_new=only_new,
        coefficients=coefficients(old, new),
        figures=figures(old.answer, new.answer),
        alternatives=tuple(
            HoldsPair(alternative=name, old=first, new=second)
            for name, first, second in _side_by_side(_holds(old), _holds(new))
            if first != second
        ),
        sections=_sections(old, new),
    )


def plan_of_lock(lock: Lock, name: str | None = None) -> Plan:
    """The plan as it is written in a lock.

    Parameters
    ----------
    lock : Lock
    name : str, optional
        How faults name it; without it the plan's own file.

    Raises
    ------
    PlanError
        Where this program does not read it.
    """
    return plan_from_mapping(lock.plan.written, name or lock.plan.file)


def _data(old: Lock, new: Lock) -> DataPair:
    """The two tables, and whether their labels can be held against each other."""
    first, second = old.data, new.data
    same = first.fingerprint == second.fingerprint
    # A hashed label hangs on a key of its own; a numbered row is a row of that table only.
    comparable = first.labels == second.labels and (same or (first.labelled and second.labelled))
    return DataPair(
        old_fingerprint=first.fingerprint,
        new_fingerprint=second.fingerprint,
        old_rows=first.rows,
        new_rows=second.rows,
        comparable=comparable,
    )


def _ledger(old: Lock, new: Lock) -> tuple[StagePair, ...]:
    """Stages whose number of rows differs."""
    first, second = ({stage.stage: stage.rows for stage in lock.ledger} for lock in (old, new))
    return tuple(
        StagePair(stage=stage, old=before, new=now)
        for stage, before, now in _side_by_side(first, second)
        if before != now
    )


def _fates(old: Lock, new: Lock) -> tuple[FatePair, ...]:
    """Predictors that end otherwise, or in another form."""
    pairs = [
        FatePair(
            predictor=name,
            old=None if first is None else first.verdict,
            new=None if second is None else second.verdict,
            old_transform=None if first is None else first.transform,
            new_transform=None if second is None else second.transform,
        )
        for name, first, second in _side_by_side(old.predictors, new.predictors)
    ]
    return tuple(pair for pair in pairs if (pair.old, pair.old_transform) != (pair.new, pair.new_transform))


def _holds(lock: Lock) -> dict[str, bool]:
    """Under which alternatives the answer holds."""
    return {name: alternative.holds for name, alternative in lock.alternatives.items()}


def _side_by_side(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[tuple[str, Any, Any]]:
    """Every name of either mapping with both values, the old names first."""
    return [(name, old.get(name), new.get(name)) for name in dict.fromkeys([*old, *new])]


def _sections(old: Lock, new: Lock) -> tuple[str, ...]:
    """Parts of the record in which anything differs."""
    if old.digest and old.digest == new.digest:
        return ()
    return tuple(
        name
        for name in Lock.model_fields
        if name not in _NOT_SECTIONS and getattr(old, name) != getattr(new, name)
    )
