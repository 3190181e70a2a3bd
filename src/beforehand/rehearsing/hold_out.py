"""The world of rows held out: the whole plan on some rows, its predictions tried on the others."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from beforehand.faults import BeforehandError, DataError, Fault
from beforehand.fit.columns import FloatArray
from beforehand.rehearsing.observed import HeldOut
from beforehand.rehearsing.predicting import predictions
from beforehand.rehearsing.rows import table_of_rows
from beforehand.rehearsing.seeds import generator
from beforehand.rehearsing.stage import Collector, Stage, setting_on
from beforehand.rehearsing.trial import Ended, Setting, run_trial
from beforehand.rehearsing.trials import STATUSES, Trials
from beforehand.steps.missing_data import missing_mask
from beforehand.steps.source import TableSource
from beforehand.table.wanted import group_column

NAME = "hold_out"

# Each repeat divides the rows into folds anew; more of them than this add little to an error that
# comes from the table itself.
MOST_REPEATS = 100


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class HoldOutWorld:
    """Folds of the rows, each held out in turn; a replicate is one fold of one repeat.

    Attributes
    ----------
    stage : Stage
    folds : int
    groups : tuple of str
        Groups that are left out one at a time; empty where folds are drawn.
    codes : array of int, shape (n_rows,), or None
        Group of each row of the table.
    seed : int
    """

    stage: Stage
    folds: int
    groups: tuple[str, ...]
    codes: NDArray[np.int64] | None
    seed: int

    @property
    def name(self) -> str:
        """``hold_out``."""
        return NAME

    def trials(self, first: int, last: int) -> Trials:
        """Errors of prediction in some replicates."""
        setting = self.stage.setting
        into = Collector(setting.plan, self.stage.subjects, last - first)
        for place, replicate in enumerate(range(first, last)):
            repeat, fold = divmod(replicate, self.folds)
            self._try(place, self._held_out(repeat, fold), into)
        return into.trials

    def repeats(self, replicates: int) -> int:
        """How often the rows are divided, so that about as many fits are made as were asked for."""
        return 1 if self.groups else max(1, min(MOST_REPEATS, replicates // self.folds))

    def _held_out(self, repeat: int, fold: int) -> NDArray[np.bool_]:
        """Rows of the table that are held out."""
        if self.codes is not None:
            return np.asarray(self.codes == fold)
        n = self.stage.setting.table.n_rows
        order = generator(self.seed, NAME, repeat).permutation(n)
        out = np.zeros(n, dtype=bool)
        # Folds of sizes that differ by one row at most.
        out[order[fold :: self.folds]] = True
        return out

    def _try(self, place: int, out: NDArray[np.bool_], into: Collector) -> None:
        """One fold."""
        plan, table = self.stage.setting.plan, self.stage.setting.table
        outcome = plan.outcome.column
        try:
            setting = setting_on(plan, table_of_rows(table, np.flatnonzero(~out).astype(np.int64)))
            ended = run_trial(setting, setting.source.raw(outcome))
        except BeforehandError:
            return
        into.take(place, ended, setting)
        if ended.final is None:
            return
        rows = np.flatnonzero(out & ~missing_mask(table.columns[outcome])).astype(np.int64)
        actual = np.asarray(table.columns[outcome].values[rows], dtype=np.float64)
        mean = float(setting.source.raw(outcome).mean())
        predicted = self._predicted(ended, setting, rows, mean)
        known = np.isfinite(predicted)
        error, plain = (actual - predicted)[known], (actual - mean)[known]
        trials = into.trials
        trials.squared[place], trials.squared_mean_model[place] = float(error @ error), float(plain @ plain)
        trials.predicted[place], trials.not_predicted[place] = int(known.sum()), int((~known).sum())

    def _predicted(self, ended: Ended, setting: Setting, rows: NDArray[np.int64], mean: float) -> FloatArray:
        """Predictions for rows of the whole table; missing cells are filled as the other rows taught."""
        if ended.status != "adopted":
            return np.full(len(rows), mean)
        table = self.stage.setting.table
        patched: dict[str, FloatArray] = {}
        for fill in setting.base.fills:
            if fill.method == "regression" or not len(fill.values):
                continue
            column = table.columns[fill.predictor]
            values = np.array(column.values, dtype=np.float64)
            values[missing_mask(column)] = fill.values[0]
            patched[fill.predictor] = values
        return predictions(ended, setting.source, TableSource(table, rows, patched))


def hold_out_world(stage: Stage, seed: int) -> HoldOutWorld:
    """Folds as the plan declares them: groups of a column, or rows drawn at random."""
    plan, table = stage.setting.plan, stage.setting.table
    column = group_column(plan)
    if column is None:
        folds = max(2, min(plan.rehearsal.folds, table.n_rows))
        return HoldOutWorld(stage=stage, folds=folds, groups=(), codes=None, seed=seed)
    found = table.columns[column]
    names, codes = np.unique(found.values, return_inverse=True)
    groups = tuple(_group_name(value, found.levels) for value in names.tolist())
    if len(groups) < 2:
        what = f"names {column!r}, which has one group in this table: there is nothing to leave out"
        raise DataError([Fault(file=table.file, line=None, place="leave_out", what=what, code="groups")])
    if plan.data.labels_in_lock == "hashed":
        # Groups may be rows, or people: they are counted, not named.
        groups = tuple(str(number) for number in range(1, len(groups) + 1))
    return HoldOutWorld(
        stage=stage, folds=len(groups), groups=groups, codes=np.asarray(codes, dtype=np.int64), seed=seed
    )


def _group_name(value: float, levels: tuple[str, ...]) -> str:
    """A group as it is named in the table."""
    if levels:
        return levels[int(value)] if value >= 0 else "missing"
    return f"{value:g}"


def held_out_of(world: HoldOutWorld, trials: Trials) -> HeldOut:
    """Errors by repeat and fold."""
    shape = (-1, world.folds)
    none = trials.status == STATUSES.index("no_fit")
    stopped = trials.status == STATUSES.index("stopped")
    return HeldOut(
        folds=world.folds,
        groups=world.groups,
        squared=trials.squared.reshape(shape),
        squared_mean_model=trials.squared_mean_model.reshape(shape),
        rows=trials.predicted.reshape(shape),
        not_predicted=trials.not_predicted.reshape(shape),
        no_fit=(none | stopped).reshape(shape),
    )
