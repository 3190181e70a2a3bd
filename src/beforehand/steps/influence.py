"""The influence step: flagged rows, largest Cook's distance first, each compared with and without.

A measure only flags. What removes a row is a change in the answer that the plan declared, and at
most the declared share of rows; with and without both stay in the record whatever the verdict.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from beforehand.plan import Limit, Plan
from beforehand.steps.bench import Bench, Comparison, Fitted, Measures
from beforehand.steps.collinearity import rounded
from beforehand.steps.dependence import remove_dependent
from beforehand.steps.keeping import Keeping
from beforehand.steps.rulings import Ruling, Rulings
from beforehand.steps.state import RowDeparture, State

STEP = "influence"


@dataclass(frozen=True, slots=True)
class KeptRow:
    """A flagged row that stays: its measures and what leaving it out would change."""

    label: str
    measures: dict[str, float]
    comparison: Comparison


@dataclass(frozen=True, slots=True)
class InfluenceRecord:
    """What the step leaves in the record beside its rulings."""

    # The first of those that stay, as many as the plan records one by one.
    kept: tuple[KeptRow, ...]
    kept_ruling: str | None
    removed: tuple[tuple[KeptRow, str], ...]
    joint: tuple[int, Fitted, float, float, str] | None


def influence(state: State, plan: Plan, bench: Bench) -> tuple[State, tuple[Ruling, ...]]:
    """Remove one row at a time, with all measures taken afresh after each."""
    rulings = Rulings(STEP, state.rulings_made)
    # Rounded up, so that a small share of a small table is one row, and 0 % is none.
    most = math.ceil(rounded(plan.influence.at_most * state.rows.n))
    removed: list[tuple[KeptRow, str]] = []
    while True:
        model = bench.design(state)
        if not model.terms or model.rows.n - model.p < 2:
            break
        fitted = bench.fit(model, "working model")
        if fitted.fit.exact:
            rulings.add("influence", "all rows", "exact_fit", fits=(fitted.id,))
            break
        measures = bench.measures(fitted, dfbetas=plan.influence.flag_when.dfbetas is not None)
        flagged = _flagged(measures, plan, model.rows.n, model.p)
        compared = bench.without_each(fitted, measures, flagged, plan.alpha)
        found = _first_change(compared, state, plan, bench, fitted, measures)
        if found is None:
            _stay(compared, measures, fitted, plan, bench, rulings, removed)
            break
        comparison, ground, value, limit = found
        kept_row = _kept_row(comparison, measures, bench)
        if len(removed) >= most:
            rulings.add(
                "influence.at_most", kept_row.label, "cap_reached", fits=(fitted.id,),
                evidence={"removed": len(removed), "most": most, "share": plan.influence.at_most},
                limit=plan.influence.at_most,
            )  # fmt: skip
            state = replace(state, cap_reached=True)
            _stay(compared, measures, fitted, plan, bench, rulings, removed)
            break
        state = _leave(
            comparison, ground, value, limit, kept_row, len(flagged), state, bench, fitted, rulings, removed
        )
        state = replace(state, rulings_made=rulings.count)
        state, more = remove_dependent(state, plan, bench, STEP)
        rulings.made.extend(more)
        if state.status:
            break
    return replace(state, rulings_made=rulings.count), tuple(rulings.made)


def _passes(
    values: NDArray[np.float64] | None, limit: Limit | None, n: int, p: int
) -> NDArray[np.bool_] | bool:
    """Which values pass a limit, by size; a limit that is not set flags nothing."""
    if limit is None or values is None:
        return False
    with np.errstate(invalid="ignore"):
        return np.abs(values) > limit.value(n, p)


def _flagged(measures: Measures, plan: Plan, n: int, p: int) -> NDArray[np.int64]:
    """Indices of flagged rows: rows of leverage 1 first, then by falling Cook's distance."""
    when = plan.influence.flag_when
    flags = (
        _passes(measures.cooks_distance, when.cooks_distance, n, p)
        | _passes(measures.leverage, when.leverage, n, p)
        | _passes(measures.studentized, when.studentized_residual, n, p)
        | _passes(measures.dffits, when.dffits, n, p)
        | _passes(measures.largest_dfbetas, when.dfbetas, n, p)
        | _passes(measures.covariance_ratio - 1.0, when.covariance_ratio, n, p)
        | measures.sole
    )
    indices = np.flatnonzero(flags)
    cook = np.where(measures.sole, np.inf, measures.cooks_distance)[indices]
    # Ties to twelve digits go by the canonical order of rows, which np.lexsort keeps stable.
    digits = np.array([rounded(value) if np.isfinite(value) else value for value in cook.tolist()])
    return indices[np.argsort(-digits, kind="stable")].astype(np.int64)


def _first_change(
    compared: Sequence[Comparison],
    state: State,
    plan: Plan,
    bench: Bench,
    fitted: Fitted,
    measures: Measures,
) -> tuple[Comparison, str, float | None, float | None] | None:
    """The first row, in order, that changes the answer as much as the plan declares."""
    when = plan.influence.remove_when
    keeping = Keeping(plan)
    for comparison in compared:
        if comparison.change_coefficient is None:
            # Without this row a coefficient does not exist: a change without limit, unless the
            # predictor that hangs on it may not leave.
            if not (comparison.of and keeping.always(comparison.of)):
                return comparison, "sole", None, None
            continue
        if when.coefficient is not None and comparison.change_coefficient >= when.coefficient:
            return comparison, "coefficient", comparison.change_coefficient, when.coefficient
        change = abs(comparison.change_r_squared or 0.0)
        if when.r_squared is not None and change >= when.r_squared:
            return comparison, "r_squared", change, when.r_squared
        if when.significance_changes and comparison.significance_changes:
            return comparison, "significance_changes", None, None
        if when.sign_changes and comparison.sign_changes:
            return comparison, "sign_changes", None, None
    return None


def _leave(
    comparison: Comparison,
    ground: str,
    value: float | None,
    limit: float | None,
    row: KeptRow,
    flagged: int,
    state: State,
    bench: Bench,
    fitted: Fitted,
    rulings: Rulings,
    removed: list[tuple[KeptRow, str]],
) -> State:
    """The row leaves; the fit without it is put in the record beside the one with it."""
    rows = state.rows.without((comparison.position,))
    fits: tuple[str, ...] = (fitted.id,)
    if ground != "sole":
        without = bench.fit(replace(fitted.model, rows=rows), f"without row {row.label}")
        fits = (fitted.id, without.id)
    ruling = rulings.add(
        f"influence.remove_when.{ground}" if ground != "sole" else "influence.remove_when",
        row.label,
        f"row_leaves_{ground}",
        fits=fits,
        evidence=_evidence(row) | {"flagged": flagged},
        value=value,
        limit=limit,
    )
    removed.append((row, ruling.id))
    gone = RowDeparture(label=row.label, step=STEP, ruling=ruling.id)
    return replace(state, rows=rows, row_departures=(*state.row_departures, gone))


def _evidence(row: KeptRow) -> dict[str, float | int | str | bool | None]:
    """Measures and changes of one row, under their names."""
    comparison = row.comparison
    numbers: dict[str, float | int | str | bool | None] = dict(row.measures)
    numbers["change_r_squared"] = comparison.change_r_squared
    numbers["change_coefficient"] = comparison.change_coefficient
    numbers["of"] = comparison.of
    if comparison.significance_changes:
        numbers["significance_changes"] = ", ".join(comparison.significance_changes)
    if comparison.sign_changes:
        numbers["sign_changes"] = ", ".join(comparison.sign_changes)
    return numbers


def _kept_row(comparison: Comparison, measures: Measures, bench: Bench) -> KeptRow:
    """A row's measures by name; one that does not exist for it is left out."""
    place = int(np.searchsorted(measures.positions, comparison.position))
    named = {
        "leverage": measures.leverage,
        "studentized_residual": measures.studentized,
        "cooks_distance": measures.cooks_distance,
        "dffits": measures.dffits,
    }
    numbers = {name: float(values[place]) for name, values in named.items()}
    return KeptRow(
        label=bench.label(comparison.position),
        measures={name: value for name, value in numbers.items() if math.isfinite(value)},
        comparison=comparison,
    )


def _stay(
    compared: Sequence[Comparison],
    measures: Measures,
    fitted: Fitted,
    plan: Plan,
    bench: Bench,
    rulings: Rulings,
    removed: list[tuple[KeptRow, str]],
) -> None:
    """Rule on the flagged rows that stay, and leave them all out together once."""
    if not compared:
        rulings.add("influence.flag_when", "all rows", "none_flagged", fits=(fitted.id,))
        bench.keep_check("influence", lambda: InfluenceRecord((), None, tuple(removed), None))
        return
    changes = [c.change_coefficient for c in compared if c.change_coefficient is not None]
    evidence: dict[str, float | int | str | bool | None] = {
        "rows": len(compared),
        "largest_change_coefficient": max(changes, default=None),
        "largest_change_r_squared": max((abs(c.change_r_squared or 0.0) for c in compared), default=None),
    }
    ruling = rulings.add(
        "influence.remove_when", "flagged rows", "flagged_rows_stay", fits=(fitted.id,), evidence=evidence
    )

    def record() -> InfluenceRecord:
        shown = compared[: plan.influence.record_at_most]
        return InfluenceRecord(
            kept=tuple(_kept_row(comparison, measures, bench) for comparison in shown),
            kept_ruling=ruling.id,
            removed=tuple(removed),
            joint=_together(compared, fitted, bench),
        )

    bench.keep_check("influence", record)


def _together(
    compared: Sequence[Comparison], fitted: Fitted, bench: Bench
) -> tuple[int, Fitted, float, float, str] | None:
    """All flagged rows that stayed left out at once, since rows can hide each other."""
    model = fitted.model
    positions = tuple(sorted(c.position for c in compared))
    rows = model.rows.without(positions)
    without_rows = replace(model, rows=rows)
    if rows.n - model.p < 1 or bench.dependence(without_rows) is not None:
        return None
    without = bench.fit(without_rows, "without all flagged rows together")
    largest, of = 0.0, ""
    for with_row, left in zip(fitted.fit.coefficients, without.fit.coefficients, strict=True):
        if with_row.key is None or with_row.standard_error == 0:
            continue
        shift = abs(with_row.estimate - left.estimate) / with_row.standard_error
        if shift > largest:
            largest, of = shift, " × ".join(factor.column for factor in with_row.key.factors)
    return len(positions), without, without.fit.r_squared - fitted.fit.r_squared, largest, of
