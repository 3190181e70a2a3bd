"""How far the columns of a refreshed table have drifted from those of the old one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from beforehand.fit.descriptives import shape_of
from beforehand.plan import Plan
from beforehand.table import Column, Table


@dataclass(frozen=True, slots=True, kw_only=True)
class Drift:
    """One column in two tables; what does not apply to its kind, or cannot be computed, is None.

    Attributes
    ----------
    column : str
    role : str
        ``outcome`` or ``predictor``.
    old_missing, new_missing : float
        Shares of missing cells.
    standardized_difference : float or None
        Difference of the means in standard deviations of the old table.
    ks, ks_p : float or None
        Kolmogorov and Smirnov's largest distance of the two distributions, and its p.
    total_variation : float or None
        Half the sum of the differences of the levels' shares.
    levels_gone : tuple of str
        Levels without a row in the new table that had some in the old one.
    """

    column: str
    role: str
    old_missing: float
    new_missing: float
    standardized_difference: float | None
    ks: float | None
    ks_p: float | None
    total_variation: float | None
    levels_gone: tuple[str, ...]


def drifts(plan: Plan, old: Table, new: Table) -> tuple[Drift, ...]:
    """Drift of the outcome and of every predictor, in plan order."""
    names = [(plan.outcome.column, "outcome"), *((p.column, "predictor") for p in plan.predictors)]
    return tuple(_drift(name, role, old.columns[name], new.columns[name]) for name, role in names)


def _drift(name: str, role: str, old: Column, new: Column) -> Drift:
    if old.kind == "number":
        return _number(name, role, old, new)
    before, after = _shares(old), _shares(new)
    levels = dict.fromkeys([*before, *after])
    apart = sum(abs(before.get(level, 0.0) - after.get(level, 0.0)) for level in levels) / 2.0
    return Drift(
        column=name, role=role, old_missing=_missing(old), new_missing=_missing(new),
        standardized_difference=None, ks=None, ks_p=None,
        total_variation=apart if before and after else None,
        levels_gone=tuple(level for level in before if before[level] > 0 and not after.get(level)),
    )  # fmt: skip


def _number(name: str, role: str, old: Column, new: Column) -> Drift:
    """Means against the old spread, and the two distributions as wholes."""
    from scipy.stats import ks_2samp

    before, after = old.values[~np.isnan(old.values)], new.values[~np.isnan(new.values)]
    difference = ks = p = None
    if len(before) and len(after):
        found = ks_2samp(before, after)
        ks, p = float(found.statistic), float(found.pvalue)
        first = shape_of(before)
        if len(before) > 1 and first.sd > 0:
            difference = (shape_of(after).mean - first.mean) / first.sd
    return Drift(
        column=name, role=role, old_missing=_missing(old), new_missing=_missing(new),
        standardized_difference=difference, ks=ks, ks_p=p, total_variation=None, levels_gone=(),
    )  # fmt: skip


def _missing(column: Column) -> float:
    gaps = np.isnan(column.values) if column.kind == "number" else column.values < 0
    return float(gaps.mean()) if len(gaps) else 0.0


def _shares(column: Column) -> dict[str, float]:
    """Share of each level among the cells that are not missing."""
    codes = column.values[column.values >= 0].astype(np.int64)
    if not len(codes):
        return {}
    counts = np.bincount(codes, minlength=len(column.levels))
    return {level: int(count) / len(codes) for level, count in zip(column.levels, counts, strict=True)}
