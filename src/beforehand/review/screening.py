"""The screening of a table under a plan, blind to the outcome.

What the plan will do to missing cells is asked of the missing-data step itself, so that the review
and a run cannot disagree. Of the outcome only the missing cells are counted.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from beforehand.fit.conditioning import inflation_of
from beforehand.fit.moments import moments_of
from beforehand.plan import Plan
from beforehand.review.columns import NO_COLUMNS, Columns, column_findings, columns_of
from beforehand.review.findings import Finding, caution, note, percent
from beforehand.review.size import ColumnCount, Detectable, column_counts, detectable, size_findings
from beforehand.steps.designing import Designer
from beforehand.steps.missing_data import Base, missing_data
from beforehand.steps.source import TableSource
from beforehand.steps.state import State, blocks_of
from beforehand.table import Stage, Table

# A table that loses a larger share of its rows to gaps answers the question for the others only.
MANY_ROWS_LOST = 0.10

Answer = Literal["fill", "remove_predictor", "remove_rows", "stop"]


@dataclass(frozen=True, slots=True, kw_only=True)
class MissingShare:
    """What is missing of one predictor, and what the plan does about it.

    Attributes
    ----------
    missing : int
        Cells, among the rows with an outcome.
    share : float
        Of the rows with an outcome.
    answer : str
        ``fill``, ``remove_predictor``, ``remove_rows``, or ``stop`` where the run stops for it.
    """

    predictor: str
    missing: int
    share: float
    answer: Answer


@dataclass(frozen=True, slots=True, kw_only=True)
class Screening:
    """What a table allows under a plan; nothing of it depends on a value of the outcome.

    Attributes
    ----------
    ledger : tuple of Stage
        Rows read, after each line of eligibility, and with an outcome.
    read, eligible, with_outcome, complete : int
        Rows; ``complete`` after the plan's fills and removals of predictors.
    missing : tuple of MissingShare
        Predictors with missing cells, in plan order.
    coefficients : tuple of ColumnCount
        Of the full model, without the intercept.
    n_coefficients : int
        With the intercept.
    rows_per_coefficient : float or None
        None for a model without coefficients.
    columns : Columns
    detectable : Detectable or None
    findings : tuple of Finding
    """

    ledger: tuple[Stage, ...]
    read: int
    eligible: int
    with_outcome: int
    complete: int
    missing: tuple[MissingShare, ...]
    coefficients: tuple[ColumnCount, ...]
    n_coefficients: int
    rows_per_coefficient: float | None
    columns: Columns
    detectable: Detectable | None
    findings: tuple[Finding, ...]


def screened(plan: Plan, table: Table) -> Screening:
    """Screening a table under a plan.

    Parameters
    ----------
    table : Table
        As read under this plan.
    """
    state, base, _ = missing_data(plan, table, declared="missing_data" in plan.steps)
    source = TableSource.of(table, base)
    model = Designer(plan, source).model(state)
    columns = NO_COLUMNS
    inflation: tuple[tuple[str, float], ...] = ()
    if model.rows.n and model.keys:
        moments = moments_of(source, model.keys)
        columns, independent = columns_of(plan, source, model, moments)
        if independent.keys and model.rows.n > independent.p:
            found = inflation_of(moments, blocks_of(independent), intercept=independent.intercept)
            inflation = tuple((term.name, found[term.name]) for term in independent.terms if term.single)
    n, p = model.rows.n, model.p
    effect = detectable(plan, n, p, inflation)
    missing = _missing(state, base)
    findings = (
        *_row_findings(plan, table, base, state),
        *_missing_findings(plan, missing),
        *size_findings(plan, n, p, effect),
        *column_findings(plan, columns),
    )
    return Screening(
        ledger=table.ledger,
        read=table.ledger[0].rows if table.ledger else table.n_rows,
        eligible=table.n_rows,
        with_outcome=base.with_outcome,
        complete=n,
        missing=missing,
        coefficients=column_counts(model),
        n_coefficients=p,
        rows_per_coefficient=n / p if p else None,
        columns=columns,
        detectable=effect,
        findings=findings,
    )


def _missing(state: State, base: Base) -> tuple[MissingShare, ...]:
    """What is missing of each predictor, with what the step did about it."""
    filled = {fill.predictor for fill in base.fills}

    def answer(name: str) -> Answer:
        if name in filled:
            return "fill"
        if name not in state.working:
            return "remove_predictor"
        return "stop" if state.status else "remove_rows"

    return tuple(
        MissingShare(
            predictor=one.predictor, missing=one.missing, share=one.share, answer=answer(one.predictor)
        )
        for one in base.missing
        if one.missing
    )


def _row_findings(plan: Plan, table: Table, base: Base, state: State) -> Iterator[Finding]:
    """Rows that leave before the first fit."""
    without = table.n_rows - base.with_outcome
    if without:
        yield note(
            "rows-without-outcome", "outcome.column",
            f"{without:,} of {table.n_rows:,} eligible rows {_leave(without, 'has', 'have')} no "
            f"{plan.outcome.column} and {_leave(without)}.",
        )  # fmt: skip
    if not base.with_outcome:
        yield caution("no-rows", "eligibility", "No eligible row has an outcome, so nothing can be fitted.")
        return
    if state.status:
        yield caution(
            "run-would-stop", "missing_data.fill",
            "The run would stop at missing_data: a predictor that a rule keeps is missing in more than "
            f"{percent(plan.missing_data.remove_predictor_above)} of the rows and has no fill.",
        )  # fmt: skip
    lost = base.with_outcome - len(base.kept)
    if lost:
        say = caution if lost > MANY_ROWS_LOST * base.with_outcome else note
        yield say(
            "rows-incomplete", "missing_data.otherwise",
            f"{lost:,} of {base.with_outcome:,} rows with an outcome ({percent(lost / base.with_outcome)}) "
            f"{_leave(lost, 'is', 'are')} incomplete and {_leave(lost)}.",
        )  # fmt: skip


def _leave(count: int, one: str = "leaves", many: str = "leave") -> str:
    """The verb form for so many rows."""
    return one if count == 1 else many


def _missing_findings(plan: Plan, missing: tuple[MissingShare, ...]) -> Iterator[Finding]:
    """What happens to each predictor with missing cells, and fills that do nothing."""
    fill = plan.missing_data.fill
    limit = plan.missing_data.remove_predictor_above
    for one in missing:
        name, share = one.predictor, percent(one.share)
        if one.answer == "fill":
            how = fill[name] if isinstance(fill[name], str) else "a value"
            yield note(
                "missing-filled", f"missing_data.fill.{name}", f"{name}: {share} missing, filled by {how}."
            )
        elif one.answer == "remove_predictor":
            unused = " Its fill is never used." if name in fill else ""
            yield caution(
                "missing-leaves", "missing_data.remove_predictor_above",
                f"{name}: {share} missing is above {percent(limit)}, so the predictor leaves.{unused}",
            )  # fmt: skip
        elif one.answer == "remove_rows":
            yield note(
                "missing-without-fill", "missing_data.fill",
                f"{name}: {share} missing and no fill, so these rows leave.",
            )  # fmt: skip
    gaps = {one.predictor for one in missing}
    for name in fill:
        if "missing_data" in plan.steps and name not in gaps:
            yield note(
                "fill-not-needed", f"missing_data.fill.{name}", f"{name} has a fill and no cell is missing."
            )
