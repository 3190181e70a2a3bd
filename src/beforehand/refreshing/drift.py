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
    old_out_of_range, new_out_of_range : float
        Shares of cells outside the declared range, where the plan takes them as missing.
    standardized_difference : float or None
        Difference of the means in standard deviations of the old table.
    ks, ks_p : float or None
        Kolmogorov and Smirnov's largest distance of the two distributions, and its p.
    total_variation : float or None
        Half the sum of the differences of the levels' shares.
    levels_new, levels_gone : tuple of str
        Levels with rows in the new table only, and in the old one only.
    """

    column: str
    role: str
    old_missing: float
    new_missing: float
    old_out_of_range: float
    new_out_of_range: float
    standardized_difference: float | None
    ks: float | None
    ks_p: float | None
    total_variation: float | None
    levels_new: tuple[str, ...]
    levels_gone: tuple[str, ...]


def drifts(plan: Plan, old: Table, new: Table) -> tuple[Drift, ...]:
    """Drift of the outcome and of every predictor, in plan order."""
    names = [(plan.outcome.column, "outcome"), *((p.column, "predictor") for p in plan.predictors)]
    return tuple(_drift(name, role, old, new) for name, role in names)


def _drift(name: str, role: str, first: Table, second: Table) -> Drift:
    if first.columns[name].kind == "number":
        return _number(name, role, first, second)
    old, new = first.columns[name], second.columns[name]
    before, after = _shares(old), _shares(new)
    levels = dict.fromkeys([*before, *after])
    apart = sum(abs(before.get(level, 0.0) - after.get(level, 0.0)) for level in levels) / 2.0
    return Drift(
        column=name, role=role, old_missing=_missing(old), new_missing=_missing(new),
        old_out_of_range=0.0, new_out_of_range=0.0, standardized_difference=None, ks=None, ks_p=None,
        total_variation=apart if before and after else None,
        levels_new=tuple(level for level in after if after[level] > 0 and not before.get(level)),
        levels_gone=tuple(level for level in before if before[level] > 0 and not after.get(level)),
    )  # fmt: skip


def _number(name: str, role: str, first: Table, second: Table) -> Drift:
    """Means against the old spread, and the two distributions as wholes."""
    from scipy.stats import ks_2samp

    old, new = first.columns[name], second.columns[name]
    before, after = old.values[~np.isnan(old.values)], new.values[~np.isnan(new.values)]
    difference = ks = p = None
    if len(before) and len(after):
        found = ks_2samp(before, after)
        ks, p = float(found.statistic), float(found.pvalue)
        shape = shape_of(before)
        if len(before) > 1 and shape.sd > 0:
            difference = (shape_of(after).mean - shape.mean) / shape.sd
    return Drift(
        column=name, role=role, old_missing=_missing(old), new_missing=_missing(new),
        old_out_of_range=_outside(first, name), new_out_of_range=_outside(second, name),
        standardized_difference=difference, ks=ks, ks_p=p, total_variation=None, levels_new=(),
        levels_gone=(),
    )  # fmt: skip


def _outside(table: Table, name: str) -> float:
    return table.out_of_range.get(name, 0) / table.n_rows if table.n_rows else 0.0


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
