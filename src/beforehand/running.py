"""Folds the steps of a plan over a table; the whole run is here, start to end, on one page."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from beforehand.faults import DataError, Fault
from beforehand.fit.columns import FloatArray
from beforehand.plan import Plan
from beforehand.steps.bench import Bench, Fitted
from beforehand.steps.collinearity import collinearity
from beforehand.steps.dependence import remove_dependent
from beforehand.steps.final_checks import final_checks
from beforehand.steps.influence import influence
from beforehand.steps.learned import NOTHING, Learned
from beforehand.steps.missing_data import Base, missing_data
from beforehand.steps.recording import RecordingBench
from beforehand.steps.rulings import Ruling
from beforehand.steps.selection import selection
from beforehand.steps.source import TableSource
from beforehand.steps.state import Model, State
from beforehand.steps.transforms import transforms
from beforehand.table import Table, ranks_of

Step = Callable[[State, Plan, Bench], tuple[State, tuple[Ruling, ...]]]
Progress = Callable[[str], None]

# A new step is one module and one line here (and its name in the plan's language).
STEPS: Mapping[str, Step] = {
    "transforms": transforms,
    "collinearity": collinearity,
    "influence": influence,
    "selection": selection,
    "final_checks": final_checks,
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Trail:
    """A run of one plan on one table: the state it ended in and everything it left on the way.

    Attributes
    ----------
    status : str
        ``adopted``, ``mean_only``, ``inconclusive`` or ``stopped``.
    final : Fitted or None
        The fit of the answer; None where a run stopped before any.
    learned : Learned
        What was not learned anew.
    """

    plan: Plan
    table: Table
    base: Base
    state: State
    status: str
    rulings: tuple[Ruling, ...]
    bench: RecordingBench
    source: TableSource
    final: Fitted | None
    learned: Learned = NOTHING


def run_steps(
    plan: Plan, table: Table, progress: Progress | None = None, learned: Learned = NOTHING
) -> Trail:
    """Run every step of a plan, in its order, one change at a time.

    Parameters
    ----------
    plan : Plan
    table : Table
        Rows in canonical order, read under the plan's contract.
    progress : callable or None
        Hears what is being done.
    learned : Learned
        Fills and exponents of an earlier run that are used again.

    Returns
    -------
    Trail

    Raises
    ------
    DataError
        When the rows left are too few for the model, or the outcome does not vary.
    """
    state, base, made = missing_data(plan, table, declared="missing_data" in plan.steps, learned=learned)
    rulings = list(made)
    source = TableSource.of(table, base)
    bench = RecordingBench(
        plan,
        source,
        order=ranks_in_base(table, order_column(plan), base),
        groups=ranks_in_base(table, getattr(plan.errors, "cluster_by", None), base),
        progress=progress,
        learned=learned,
    )
    state = replace(state, errors=bench.errors)
    if not state.status:
        require_enough(plan, table.file, bench.design(state), source.raw(plan.outcome.column))
    state, made = follow(state, plan, bench)
    rulings.extend(made)
    bench.step = "answer"
    status = state.status or ("adopted" if state.working else "mean_only")
    return Trail(
        plan=plan,
        table=table,
        base=base,
        state=state,
        status=status,
        rulings=tuple(rulings),
        bench=bench,
        source=source,
        final=_final(state, status, bench),
        learned=learned,
    )


def follow(state: State, plan: Plan, bench: Bench) -> tuple[State, tuple[Ruling, ...]]:
    """Every step of a plan after missing data, in its order; the rules of a run and of a rehearsal.

    Parameters
    ----------
    state : State
        As the missing-data step left it.
    plan : Plan
    bench : Bench
        What supplies the numbers.

    Returns
    -------
    tuple of State and rulings
        The state in which the plan ended.
    """
    rulings: list[Ruling] = []
    for name in plan.steps or ("full_model",):
        if state.status or name == "missing_data":
            continue
        bench.step = name
        state, made = remove_dependent(state, plan, bench, name)
        rulings.extend(made)
        if not state.status and name in STEPS:
            state, made = STEPS[name](state, plan, bench)
            rulings.extend(made)
    return state, tuple(rulings)


def order_column(plan: Plan) -> str | None:
    """The column in whose order independence is checked, or errors are correlated."""
    block = plan.assumptions.independence
    return None if block == "skip" else block.in_order_of


def ranks_in_base(table: Table, column: str | None, base: Base) -> FloatArray | None:
    """Ranks of a column over the rows of the base."""
    if column is None:
        return None
    return np.asarray(ranks_of(table, column)[base.kept], dtype=np.float64)


def require_enough(plan: Plan, file: str, model: Model, outcome: FloatArray) -> None:
    """More rows than coefficients, and an outcome that varies, or a fault."""
    if model.rows.n <= model.p:
        what = (
            f"{model.rows.n} complete rows are left and the full model has {model.p} coefficients: "
            f"it needs at least {model.p + 1} rows"
        )
        raise DataError([Fault(file=file, line=None, place="", what=what, code="too_few_rows")])
    if outcome.min() == outcome.max():
        what = f"the outcome {plan.outcome.column} has one value only in the rows in use"
        raise DataError(
            [Fault(file=file, line=None, place=plan.outcome.column, what=what, code="constant_outcome")]
        )


def mean_model(model: Model) -> Model:
    """The model of the mean alone, on the same rows and scale."""
    return Model(rows=model.rows, outcome=model.outcome, terms=(), intercept=True, errors="classical")


def _final(state: State, status: str, bench: RecordingBench) -> Fitted | None:
    """The fit that the answer rests on."""
    if status == "stopped":
        if not bench.record.fits:
            return None
        model = bench.design(state)
        if not model.terms or bench.dependence(model) is not None:
            return None
    return final_fit(state, bench)


def final_fit(state: State, bench: Bench) -> Fitted:
    """The fit of the model in which the steps ended, with the standard errors in force."""
    model = bench.design(state)
    if not model.terms:
        return bench.fit(mean_model(model), "mean model")
    fitted = bench.fit(model, "final model")
    if state.errors != model.errors:
        return bench.robust(fitted, state.errors, "robust standard errors")
    return fitted
