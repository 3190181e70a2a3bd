"""The missing-data step: blind to the outcome but for the rows that have none.

It turns a table into the base of the run: which rows stay, which cells are filled with what.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import Factor, Key
from beforehand.fit.dependence import dependence
from beforehand.fit.descriptives import shape_of
from beforehand.fit.moments import ArraySource, moments_of
from beforehand.fit.tableau import tableau_of
from beforehand.plan import FillValue, Plan
from beforehand.steps.keeping import Keeping, product_name
from beforehand.steps.learned import NOTHING, Learned
from beforehand.steps.rulings import Ruling, Rulings
from beforehand.steps.state import RowDeparture, Rows, State
from beforehand.table import Column, Table

STEP = "missing_data"

# Rows that leave are listed one by one up to so many; beyond, the ruling carries their number.
LISTED_ROWS = 10_000

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, kw_only=True)
class Filled:
    """Cells of one predictor that were missing and now hold a value.

    ``positions`` are rows of the table; ``values`` numbers, or codes of levels for a category.
    ``shown`` is the one value where there is one.
    """

    predictor: str
    method: str
    positions: NDArray[np.int64]
    values: NDArray[np.float64]
    shown: float | str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Missing:
    """What was missing in one predictor, and how the rows that left for it differ."""

    predictor: str
    missing: int
    share: float
    rows_left: int
    standardized_difference: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Base:
    """The rows and cells on which everything after this step stands.

    Attributes
    ----------
    kept : positions in the table, ascending, shape (n,)
    fills : tuple of Filled
    missing : tuple of Missing
    with_outcome, complete : int
        Rows with an outcome; rows that are complete after the fills.
    """

    kept: NDArray[np.int64]
    fills: tuple[Filled, ...]
    missing: tuple[Missing, ...]
    with_outcome: int


def missing_data(
    plan: Plan, table: Table, *, declared: bool, learned: Learned = NOTHING, described: bool = True
) -> tuple[State, Base, tuple[Ruling, ...]]:
    """Remove predictors that are too empty, fill what has a fill, remove what is still incomplete.

    Parameters
    ----------
    declared : bool
        Whether the plan's ``steps`` name this step. Without it no predictor leaves and no cell is
        filled, and incomplete rows still leave, since no fit can use them.
    described : bool
        Whether rows that leave are described beside those that stay; no ruling rests on that.
    """
    rulings = Rulings(STEP, 0)
    working = tuple(p.column for p in plan.predictors) + tuple(product_name(p) for p in plan.products)
    state = State(rows=Rows(0), working=working)
    outcome = table.columns[plan.outcome.column]
    has_outcome = ~missing_mask(outcome)
    state = _rows_without_outcome(state, table, has_outcome, plan, rulings)
    masks = {p.column: missing_mask(table.columns[p.column]) & has_outcome for p in plan.predictors}
    rows = int(has_outcome.sum())
    fills: list[Filled] = []
    if declared and rows:
        state = _too_empty(state, plan, masks, rows, rulings)
        if not state.status:
            fills = _fill(state, plan, table, masks, has_outcome, rulings, learned)
    filled = {fill.predictor for fill in fills}
    incomplete = np.zeros(table.n_rows, dtype=bool)
    for name in state.working:
        if name in masks and name not in filled:
            incomplete |= masks[name]
    stays = has_outcome & ~incomplete
    missing = tuple(
        _missing(predictor.column, table, masks, has_outcome, incomplete, stays, rows, described)
        for predictor in plan.predictors
    )
    state = _incomplete_rows(state, table, incomplete, missing, rows, rulings)
    kept = np.flatnonzero(stays).astype(np.int64)
    base = Base(kept=kept, fills=tuple(fills), missing=missing, with_outcome=rows)
    state = replace(state, rows=Rows(len(kept)), rulings_made=rulings.count)
    return state, base, tuple(rulings.made)


def missing_mask(column: Column) -> Mask:
    """Which cells of a column are missing, shape (n_rows,)."""
    return np.isnan(column.values) if column.kind == "number" else column.values < 0


def _departures(table: Table, gone: Mask, ruling: str) -> tuple[RowDeparture, ...]:
    """The rows that leave by one ruling, one by one up to a stated number."""
    positions = np.flatnonzero(gone)[:LISTED_ROWS]
    return tuple(
        RowDeparture(label=str(table.labels[place]), step=STEP, ruling=ruling) for place in positions
    )


def _rows_without_outcome(
    state: State, table: Table, has_outcome: Mask, plan: Plan, rulings: Rulings
) -> State:
    """Rows whose outcome is missing leave first; nothing may fill an outcome."""
    gone = int((~has_outcome).sum())
    if not gone:
        return state
    ruling = rulings.add(
        "missing_data.otherwise", plan.outcome.column, "rows_without_outcome",
        evidence={"rows": gone, "of": table.n_rows},
    )  # fmt: skip
    return replace(
        state, row_departures=(*state.row_departures, *_departures(table, ~has_outcome, ruling.id))
    )


def _too_empty(state: State, plan: Plan, masks: Mapping[str, Mask], rows: int, rulings: Rulings) -> State:
    """A predictor missing in more than the limit leaves, unless kept; a kept one needs a fill."""
    keeping = Keeping(plan)
    limit = plan.missing_data.remove_predictor_above
    clause = "missing_data.remove_predictor_above"
    for predictor in plan.predictors:
        name = predictor.column
        missing = int(masks[name].sum())
        if not missing or name not in state.working:
            continue
        share = missing / rows
        evidence: dict[str, float | int | str | bool | None] = {
            "share": share, "missing": missing, "rows": rows,
        }  # fmt: skip
        if share <= limit:
            rulings.add(clause, name, "full_enough", evidence=evidence, value=share, limit=limit)
            continue
        # A product of the predictor goes with it, so it is no reason to keep a predictor here.
        products = [product for product in state.working if name in keeping.parts(product)]
        present = tuple(other for other in state.working if other not in products)
        hold = keeping.hold(name, present, None)
        if hold is None:
            ruling = rulings.add(clause, name, "too_empty", evidence=evidence, value=share, limit=limit)
            for product in products:
                state = state.leaves(product, step=STEP, ruling=ruling.id)
            state = state.leaves(name, step=STEP, ruling=ruling.id)
            continue
        rulings.add(
            hold.clause, name, hold.ground, evidence=evidence, value=share, limit=limit, because=hold.because
        )
        if name not in plan.missing_data.fill:
            rulings.add("missing_data.fill", name, "kept_without_fill", evidence=evidence)
            return replace(state, status="stopped")
    return state


def _fill(
    state: State,
    plan: Plan,
    table: Table,
    masks: Mapping[str, Mask],
    has_outcome: Mask,
    rulings: Rulings,
    learned: Learned,
) -> list[Filled]:
    """Fills in plan order of the predictors; each learned from what was observed."""
    made: list[Filled] = []
    for predictor in plan.predictors:
        name = predictor.column
        how = plan.missing_data.fill.get(name)
        if how is None or name not in state.working or not masks[name].any():
            continue
        column = table.columns[name]
        observed = has_outcome & ~masks[name]
        positions = np.flatnonzero(masks[name]).astype(np.int64)
        known = learned.fills.get(name) if how != "regression" else None
        method = "value" if isinstance(how, FillValue) else how
        if known is not None:
            how = FillValue(value=known)
        if not observed.any() and not isinstance(how, FillValue):
            rulings.add("missing_data.fill", name, "nothing_to_learn_from")
            continue
        values, shown = _learned(how, column, observed, positions, state, table, masks, has_outcome)
        made.append(Filled(predictor=name, method=method, positions=positions, values=values, shown=shown))
        rulings.add(
            f"missing_data.fill.{name}", name, "filled",
            evidence={"method": method, "value": shown, "cells": len(positions)},
        )  # fmt: skip
    return made


def _learned(
    how: object,
    column: Column,
    observed: Mask,
    positions: NDArray[np.int64],
    state: State,
    table: Table,
    masks: Mapping[str, Mask],
    has_outcome: Mask,
) -> tuple[NDArray[np.float64], float | str | None]:
    """Values for the missing cells, and the one value where all get the same."""
    if how == "regression":
        others = [
            table.columns[name]
            for name in state.working
            if name in masks and name != column.name and not masks[name].any()
        ]
        return _by_regression(column, others, observed, positions), None
    seen = column.values[observed]
    if isinstance(how, FillValue):
        one = _declared(how, column)
    elif how == "mean":
        one = math.fsum(seen.tolist()) / len(seen)
    elif how == "median":
        one = float(np.median(seen))
    else:
        found, counts = np.unique(seen, return_counts=True)
        # np.unique sorts, so the first of the largest counts is the smallest value or earliest level.
        one = float(found[int(np.argmax(counts))])
    shown: float | str = one if column.kind == "number" else column.levels[int(one)]
    return np.full(len(positions), one), shown


def _declared(how: FillValue, column: Column) -> float:
    """A declared value as a number, or as the code of its level."""
    if column.kind == "number":
        return float(how.value)
    return float(column.levels.index(str(how.value)))


def _by_regression(
    column: Column, others: list[Column], observed: Mask, positions: NDArray[np.int64]
) -> NDArray[np.float64]:
    """Fitted values of a regression on the other complete predictors (single imputation)."""
    target = Key((Factor(column.name),))
    arrays: dict[Key, NDArray[np.float64]] = {target: column.values[observed]}
    everywhere: dict[Key, NDArray[np.float64]] = {}
    for other in others:
        if other.kind == "number":
            everywhere[Key((Factor(other.name),))] = other.values
        else:
            for code, level in enumerate(other.levels[1:], start=1):
                everywhere[Key((Factor(other.name, level=level),))] = (other.values == code).astype(float)
    keys = list(everywhere)
    arrays |= {key: values[observed] for key, values in everywhere.items()}
    moments = moments_of(ArraySource(arrays), [*keys, target])
    while (found := dependence(moments, keys, intercept=True)) is not None:
        keys.remove(found.key)
    keys = keys[: max(0, int(observed.sum()) - 2)]
    tableau = tableau_of(moments, target, keys, intercept=True)
    intercept, slopes = float(tableau.constant), dict(zip(keys, tableau.estimates, strict=True))
    return np.array(
        [
            math.fsum([intercept, *(slopes[key] * float(everywhere[key][place]) for key in keys)])
            for place in positions.tolist()
        ]
    )


def _missing(
    name: str,
    table: Table,
    masks: Mapping[str, Mask],
    has_outcome: Mask,
    incomplete: Mask,
    stays: Mask,
    rows: int,
    described: bool,
) -> Missing:
    """Counts of one predictor, and the standardized difference of the rows that left (Austin 2009)."""
    column = table.columns[name]
    left = incomplete & has_outcome
    difference: float | None = None
    if column.kind == "number" and described:
        values_left = column.values[left & ~masks[name]]
        values_stay = column.values[stays & ~masks[name]]
        if len(values_left) > 1 and len(values_stay) > 1:
            left_shape, stay_shape = shape_of(values_left), shape_of(values_stay)
            pooled = math.sqrt((left_shape.sd**2 + stay_shape.sd**2) / 2.0)
            difference = (left_shape.mean - stay_shape.mean) / pooled if pooled > 0 else None
    missing = int(masks[name].sum())
    return Missing(
        predictor=name,
        missing=missing,
        share=missing / rows if rows else 0.0,
        rows_left=int((masks[name] & left).sum()),
        standardized_difference=difference,
    )


def _incomplete_rows(
    state: State,
    table: Table,
    incomplete: Mask,
    missing: tuple[Missing, ...],
    rows: int,
    rulings: Rulings,
) -> State:
    """What is still incomplete leaves row by row, under one ruling with the counts."""
    gone = int(incomplete.sum())
    if not gone:
        return state
    evidence: dict[str, float | int | str | bool | None] = {"rows": gone, "of": rows, "share": gone / rows}
    evidence |= {f"missing in {m.predictor}": m.rows_left for m in missing if m.rows_left}
    ruling = rulings.add(
        "missing_data.otherwise", "incomplete rows", "incomplete_rows_leave", evidence=evidence
    )
    return replace(state, row_departures=(*state.row_departures, *_departures(table, incomplete, ruling.id)))
