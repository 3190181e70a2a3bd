"""The expected world: outcomes as the plan expects them, on the rows at hand or on rows drawn anew.

An outcome is its mean, plus each expected slope times the distance of the predictor from its mean, plus
normal noise with the expected spread. A plan without an intercept has a line through the origin here
too: slope times value, with nothing added. What the plan gives no slope has no effect whatever.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from beforehand.faults import PlanError
from beforehand.plan import Expects, Plan
from beforehand.rehearsing.drawing import Declared, declared_predictors, drawn_columns, plan_fault
from beforehand.rehearsing.rows import table_of_rows
from beforehand.rehearsing.seeds import generator
from beforehand.rehearsing.trials import FloatArray, Subjects, Trials
from beforehand.running import order_column
from beforehand.steps.missing_data import missing_data
from beforehand.steps.source import TableSource
from beforehand.table import Column, Stage, Table, ranks_of

if TYPE_CHECKING:
    from beforehand.rehearsing import stage as stages

NAME = "expected"

# So many that two levels out of twenty each meet in nearly any draw.
_ROWS_FOR_NAMES = 10_000


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Effects:
    """What the outcome is made of; its parts are named as columns are in a record.

    Attributes
    ----------
    numbers : mapping of predictor to slope
    levels : mapping of category to its levels with their differences from the baseline
    centres : mapping of predictor, or of ``room = frozen``, to the mean that its effect is taken about
    level : float
        Mean of the outcome.
    residual_sd : float
    """

    numbers: Mapping[str, float]
    levels: Mapping[str, Mapping[str, float]]
    centres: Mapping[str, float]
    level: float
    residual_sd: float

    def truth(self, columns: Mapping[str, Column]) -> FloatArray:
        """The outcome without noise, shape (n,).

        A missing cell counts as the mean: nobody can tell what stood there.
        """
        rows = len(next(iter(columns.values())).values)
        total = np.full(rows, self.level)
        for name, slope in self.numbers.items():
            values = np.asarray(columns[name].values, dtype=np.float64)
            total += _or_nothing(slope * (values - self.centres[name]))
        for name, differences in self.levels.items():
            column = columns[name]
            present = column.values >= 0
            for level, difference in differences.items():
                is_level = column.values == column.levels.index(level)
                about = is_level - self.centres[column_of(name, level)]
                total += np.where(present, difference * about, 0.0)
        return total


def _or_nothing(effect: FloatArray) -> FloatArray:
    """Effects, 0 where the predictor is missing."""
    return np.where(np.isnan(effect), 0.0, effect)


def column_of(name: str, level: str = "") -> str:
    """A design column as it is named in a record."""
    return f"{name} = {level}" if level else name


def expectations(plan: Plan) -> Expects:
    """What the plan expects.

    Raises
    ------
    PlanError
        When it says nothing of it.
    """
    if plan.expects is None:
        what = "is missing, and the expected world is made of it: give residual_sd and slopes"
        raise PlanError([plan_fault(plan, "expects", what, "no_expects")])
    return plan.expects


def true_slopes(plan: Plan) -> Mapping[str, float]:
    """The true slope of every design column but products, which have none; in plan order.

    Levels of a category are named ``room = frozen`` and differ from its baseline.

    Raises
    ------
    PlanError
        Without ``expects``.
    """
    slopes = expectations(plan).slopes
    truth: dict[str, float] = {}
    for predictor in plan.predictors:
        slope = slopes.get(predictor.column, 0.0)
        if isinstance(slope, Mapping) or predictor.kind == "category":
            given = slope if isinstance(slope, Mapping) else {}
            for level in predictor.levels:
                if level != predictor.baseline:
                    truth[column_of(predictor.column, level)] = given.get(level, 0.0)
        else:
            truth[predictor.column] = slope
    return truth


def effects_about(plan: Plan, columns: Mapping[str, Column], level: float) -> Effects:
    """Expected effects about the means of a table.

    Parameters
    ----------
    plan : Plan
    columns : mapping of predictor to Column
    level : float
        Mean of the outcome.
    """
    means = {name: _means(column) for name, column in columns.items() if column.kind != "text"}
    return _effects(plan, level, means)


def effects_declared(plan: Plan, declared: Declared) -> Effects:
    """Expected effects about declared means and shares; the outcome's own mean is 0."""
    means = {
        name: {"": float(mean)}
        for name, mean in zip(declared.numbers.names, declared.numbers.means, strict=True)
    }
    for category in declared.categories:
        means[category.name] = dict(zip(category.levels, map(float, category.shares), strict=True))
    return _effects(plan, 0.0, means)


def _effects(plan: Plan, level: float, means: Mapping[str, Mapping[str, float]]) -> Effects:
    """Effects about given means; about 0 in a plan without an intercept."""
    expects = expectations(plan)
    numbers = {name: one for name, one in expects.slopes.items() if not isinstance(one, Mapping)}
    levels = {name: one for name, one in expects.slopes.items() if isinstance(one, Mapping)}
    wanted = [(name, "") for name in numbers]
    wanted += [(name, one) for name, differences in levels.items() for one in differences]
    centres = {
        column_of(name, one): means[name].get(one, 0.0) if plan.intercept else 0.0 for name, one in wanted
    }
    return Effects(
        numbers=numbers,
        levels=levels,
        centres=centres,
        level=level if plan.intercept else 0.0,
        residual_sd=expects.residual_sd,
    )


def _means(column: Column) -> Mapping[str, float]:
    """Mean of a number under the empty name, or the share of each level, over cells that are there."""
    if column.kind == "number":
        values = column.values[~np.isnan(column.values)]
        return {"": float(np.mean(values)) if len(values) else 0.0}
    codes = column.values[column.values >= 0]
    counts = np.bincount(codes, minlength=len(column.levels)) / max(1, len(codes))
    return {level: float(share) for level, share in zip(column.levels, counts, strict=True)}


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ExpectedWorld:
    """Outcomes as expected, on the rows of a table as they are.

    Attributes
    ----------
    name : str
    stage : Stage
        What runs the plan on the rows of its base.
    truth : FloatArray, shape (n,)
        The outcome without noise, over the rows of the base.
    residual_sd : float
    seed : int
    """

    name: str
    stage: stages.Stage
    truth: FloatArray
    residual_sd: float
    seed: int

    def outcomes(self, first: int, last: int) -> FloatArray:
        """Outcomes of some replicates, shape (last - first, n)."""
        noisy = np.empty((last - first, len(self.truth)))
        for place, replicate in enumerate(range(first, last)):
            noise = generator(self.seed, NAME, replicate).standard_normal(len(self.truth))
            noisy[place] = self.truth + self.residual_sd * noise
        return noisy

    def trials(self, first: int, last: int) -> Trials:
        """What the plan comes to in some replicates."""
        return self.stage.trials(self.outcomes(first, last))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DrawnWorld:
    """Outcomes as expected, on rows that are drawn anew for each replicate.

    Attributes
    ----------
    name : str
    plan : Plan
    subjects : Subjects
    effects : Effects
    drawn_from : Table or Declared
        Rows that are drawn with replacement, or what the plan declares of the predictors.
    rows : int
        Rows of each replicate's table.
    seed : int
    """

    name: str
    plan: Plan
    subjects: Subjects
    effects: Effects
    drawn_from: Table | Declared
    rows: int
    seed: int

    def table(self, replicate: int) -> Table:
        """The table of one replicate."""
        # The number of rows tells the streams apart, so that a row of a grid is the same in any grid.
        rng = generator(self.seed, "predictors", replicate, self.rows)
        order = order_column(self.plan)
        if isinstance(self.drawn_from, Table):
            columns = _rows_again(self.drawn_from, rng, self.rows, order)
        else:
            columns = drawn_columns(self.drawn_from, rng, self.rows)
        if order is not None and order not in {predictor.column for predictor in self.plan.predictors}:
            # Rows follow each other as they stand; rows that were drawn twice follow each other too.
            columns[order] = Column(name=order, kind="number", values=np.arange(float(self.rows)))
        noise = generator(self.seed, NAME, replicate, self.rows).standard_normal(self.rows)
        outcome = self.effects.truth(columns) + self.effects.residual_sd * noise
        name = self.plan.outcome.column
        columns[name] = Column(name=name, kind="number", values=outcome)
        return _table_of(columns, self.plan.data.file)

    def trials(self, first: int, last: int) -> Trials:
        """What the plan comes to in some replicates."""
        from beforehand.rehearsing.stage import table_trials

        tables = (self.table(replicate) for replicate in range(first, last))
        return table_trials(self.plan, tables, last - first, self.subjects)


def expected_world(plan: Plan, table: Table, stage: stages.Stage, seed: int) -> ExpectedWorld:
    """Expected outcomes for the rows at hand.

    Parameters
    ----------
    plan : Plan
    table : Table
    stage : Stage
        Of the same plan and table.
    seed : int

    Raises
    ------
    PlanError
        Without ``expects``.
    """
    expectations(plan)
    columns = base_columns(plan, table)
    effects = effects_about(plan, columns, _mean_outcome(plan, columns))
    return ExpectedWorld(
        name=NAME, stage=stage, truth=effects.truth(columns), residual_sd=effects.residual_sd, seed=seed
    )


def drawn_worlds(
    plan: Plan, table: Table | None, rows: Sequence[int], subjects: Subjects | None, seed: int
) -> tuple[DrawnWorld, ...]:
    """Expected outcomes for rows drawn anew, one world a number of rows.

    Parameters
    ----------
    plan : Plan
    table : Table or None
        Its complete rows are drawn with replacement; without one, rows come from ``expects.predictors``.
    rows : sequence of int
    subjects : Subjects or None
        Those of the table's stage; None without a table: then they are what the plan declares.
    seed : int

    Raises
    ------
    PlanError
        Without ``expects``; without a table, for every predictor that cannot be drawn.
    """
    expectations(plan)
    drawn_from: Table | Declared
    if table is None:
        drawn_from = declared_predictors(plan)
        effects = effects_declared(plan, drawn_from)
    else:
        columns = base_columns(plan, table)
        effects = effects_about(plan, columns, _mean_outcome(plan, columns))
        drawn_from = _table_of(columns, table.file)
    counted = declared_subjects(plan) if subjects is None else subjects
    return tuple(
        DrawnWorld(
            name=f"{NAME}_{count}", plan=plan, subjects=counted, effects=effects,
            drawn_from=drawn_from, rows=count, seed=seed,
        )
        for count in rows
    )  # fmt: skip


def declared_subjects(plan: Plan) -> Subjects:
    """Predictors and design columns of a plan for which no table is at hand.

    Raises
    ------
    PlanError
        For every predictor that cannot be drawn.
    """
    from beforehand.rehearsing.stage import subjects_of

    declared = declared_predictors(plan)
    # Every level must occur, and every two levels of a product together, however rare they are.
    even = [replace(one, shares=np.full(len(one.levels), 1 / len(one.levels))) for one in declared.categories]
    evenly = replace(declared, categories=tuple(even))
    columns = drawn_columns(evenly, np.random.Generator(np.random.PCG64DXSM(0)), _ROWS_FOR_NAMES)
    outcome = np.zeros(_ROWS_FOR_NAMES)
    columns[plan.outcome.column] = Column(name=plan.outcome.column, kind="number", values=outcome)
    table = _table_of(columns, plan.data.file)
    state, base, _ = missing_data(plan, table, declared="missing_data" in plan.steps)
    return subjects_of(plan, TableSource.of(table, base), state)


def base_columns(plan: Plan, table: Table) -> dict[str, Column]:
    """Columns of a table over the rows on which a run stands, with missing cells filled as there."""
    _, base, _ = missing_data(plan, table, declared="missing_data" in plan.steps)
    source = TableSource.of(table, base)
    columns: dict[str, Column] = {}
    for name, column in table.columns.items():
        values = source.raw(name)
        if column.kind != "number":
            values = values.astype(np.int32)
        columns[name] = Column(name=name, kind=column.kind, values=values, levels=column.levels)
    return columns


def _mean_outcome(plan: Plan, columns: Mapping[str, Column]) -> float:
    """Mean of the outcome."""
    return float(np.mean(columns[plan.outcome.column].values))


def _table_of(columns: Mapping[str, Column], file: str) -> Table:
    """Columns made here as a table of their own; its rows have numbers for labels."""
    rows = len(next(iter(columns.values())).values)
    return Table(
        columns=columns, labels=np.arange(1, rows + 1), labelled=False, n_rows=rows, fingerprint="",
        file=file, ledger=(Stage(name="made", rows=rows),), cells_missing_by_derive={}, out_of_range={},
    )  # fmt: skip


def _rows_again(table: Table, rng: np.random.Generator, rows: int, order: str | None) -> dict[str, Column]:
    """Rows drawn with replacement, each whole; in the order of a column where there is one."""
    drawn = np.sort(rng.integers(0, table.n_rows, size=rows))
    if order is not None:
        drawn = drawn[np.argsort(ranks_of(table, order)[drawn], kind="stable")]
    return dict(table_of_rows(table, drawn).columns)
