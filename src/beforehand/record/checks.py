"""The checks of a lock: descriptives, missing data, collinearity, assumptions, influence."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Any

import numpy as np

from beforehand.fit.descriptives import describe
from beforehand.lock import (
    AssumptionCheck,
    Checks,
    Condition,
    Correlation,
    Descriptive,
    FillRecord,
    Inflation,
    InfluenceRow,
    JointComparison,
    MissingRecord,
)
from beforehand.running import Trail
from beforehand.steps.bench import Checked
from beforehand.steps.influence import InfluenceRecord, KeptRow
from beforehand.steps.records import RecordedCheck
from beforehand.steps.state import column_name
from beforehand.table import Column, Table

Labels = Callable[[str], str]


def checks_of(trail: Trail, labels: Labels) -> Checks:
    """Descriptives, collinearity, assumption checks and influence, by stage."""
    record = trail.bench.record
    found = record.tables.get("influence")
    influence = found if isinstance(found, InfluenceRecord) else None
    return Checks(
        descriptives=tuple(_descriptives(trail)),
        missing=tuple(
            MissingRecord(
                predictor=one.predictor,
                missing=one.missing,
                share=one.share,
                rows_left=one.rows_left,
                standardized_difference=one.standardized_difference,
            )
            for one in trail.base.missing
            if one.missing
        ),
        fills=tuple(
            FillRecord(
                predictor=fill.predictor, method=fill.method, value=fill.shown, cells=len(fill.positions)
            )
            for fill in trail.base.fills
        ),
        correlations=tuple(
            Correlation(stage=one.stage, first=first, second=second, r=r)
            for one in record.collinearity
            for first, second, r in one.correlations
        ),
        inflation=tuple(
            Inflation(stage=one.stage, predictor=name, vif=vif)
            for one in record.collinearity
            for name, vif in one.inflation
        ),
        condition=tuple(
            Condition(
                stage=one.stage,
                index=index,
                shares={
                    column_name(key): float(share)
                    for key, share in zip(one.condition.keys, shares, strict=True)
                },
            )
            for one in record.collinearity
            for index, shares in zip(one.condition.indices, one.condition.shares, strict=True)
        ),
        assumptions=tuple(_check(check) for check in record.checks),
        influence=tuple(_influence_rows(influence, labels)) if influence else (),
        jointly_without_flagged=_joint(influence),
    )


def _check(recorded: RecordedCheck) -> AssumptionCheck:
    """One assumption check with what came out."""
    check = recorded.check
    made = Checked(recorded.id, check, recorded.alpha, recorded.fit)
    verdict: Any = "not_applicable" if check.statistic is None else ("failed" if made.failed else "passed")
    return AssumptionCheck(
        id=recorded.id,
        stage=recorded.stage,
        check=check.name,
        subject=recorded.subject,
        fit=recorded.fit,
        statistic=check.statistic,
        df=check.df,
        p=check.p,
        alpha=recorded.alpha,
        verdict=verdict,
        because=check.not_applicable or None,
    )


def _descriptives(trail: Trail) -> Iterable[Descriptive]:
    """The outcome and every predictor, as read, among the eligible rows."""
    units = {p.column: p.unit for p in trail.plan.predictors}
    units[trail.plan.outcome.column] = trail.plan.outcome.unit
    for name in (trail.plan.outcome.column, *(p.column for p in trail.plan.predictors)):
        yield _descriptive(trail.table.columns[name], units[name], trail.table)


def _descriptive(column: Column, unit: str | None, table: Table) -> Descriptive:
    """One column: moments and quartiles of a number, counts of a category's levels."""
    if column.kind == "number":
        seen = describe(column.values)
        return Descriptive(
            column=column.name, kind="number", unit=unit, n=seen.n, missing=seen.missing, mean=seen.mean,
            sd=seen.sd, minimum=seen.minimum, lower_quartile=seen.lower_quartile, median=seen.median,
            upper_quartile=seen.upper_quartile, maximum=seen.maximum, skewness=seen.skewness,
            kurtosis=seen.kurtosis, levels={},
        )  # fmt: skip
    codes = column.values[column.values >= 0].astype(np.int64)
    counts = np.bincount(codes, minlength=len(column.levels))
    return Descriptive(
        column=column.name, kind="category", unit=unit, n=len(codes), missing=table.n_rows - len(codes),
        mean=None, sd=None, minimum=None, lower_quartile=None, median=None, upper_quartile=None,
        maximum=None, skewness=None, kurtosis=None,
        levels={level: int(count) for level, count in zip(column.levels, counts, strict=True)},
    )  # fmt: skip


def _influence_rows(found: InfluenceRecord, labels: Labels) -> Iterable[InfluenceRow]:
    """Rows that left, then flagged rows that stayed, as many one by one as the plan records."""
    for row, ruling in found.removed:
        yield _influence_row(row, ruling, labels, stays=False)
    for row in found.kept:
        yield _influence_row(row, found.kept_ruling, labels, stays=True)


def _influence_row(row: KeptRow, ruling: str | None, labels: Labels, *, stays: bool) -> InfluenceRow:
    """One flagged row with what leaving it out changes."""
    measures, comparison = row.measures, row.comparison
    return InfluenceRow(
        row=labels(row.label),
        ruling=ruling,
        leverage=measures.get("leverage"),
        studentized_residual=measures.get("studentized_residual"),
        cooks_distance=measures.get("cooks_distance"),
        dffits=measures.get("dffits"),
        change_r_squared=comparison.change_r_squared,
        change_coefficient=comparison.change_coefficient,
        of=comparison.of or None,
        significance_changes=comparison.significance_changes,
        sign_changes=comparison.sign_changes,
        stays=stays,
    )


def _joint(found: InfluenceRecord | None) -> JointComparison | None:
    """All flagged rows that stayed, left out together."""
    if found is None or found.joint is None:
        return None
    rows, fitted, change_r_squared, change_coefficient, of = found.joint
    return JointComparison(
        rows=rows,
        fit=fitted.id,
        change_r_squared=change_r_squared,
        change_coefficient=change_coefficient,
        of=of or None,
    )
