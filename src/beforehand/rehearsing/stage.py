"""Where replicates take place: many outcomes on one base, or many tables."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from beforehand.faults import BeforehandError
from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.ladder import IDENTITY
from beforehand.plan import Plan
from beforehand.rehearsing.batch import Batch
from beforehand.rehearsing.observed import SeenRuling
from beforehand.rehearsing.predicting import agreement, predictions
from beforehand.rehearsing.trial import Ended, Setting, run_trial, setting_of
from beforehand.rehearsing.trials import STATUSES, Subjects, Trials, empty, put
from beforehand.steps.designing import Designer
from beforehand.steps.keeping import Keeping, product_name
from beforehand.steps.missing_data import missing_data
from beforehand.steps.source import TableSource
from beforehand.steps.state import State, Term, column_name
from beforehand.table import Table

# Grounds of the ruling on the F test with which selection begins.
_WHOLE_MODEL = frozenset({"model_weak", "model_significant"})


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Stage:
    """The base of a plan on a table, on which any number of outcomes can be tried.

    Attributes
    ----------
    setting : Setting
    subjects : Subjects
    """

    setting: Setting
    subjects: Subjects

    @classmethod
    def of(cls, plan: Plan, table: Table) -> Stage:
        """The stage of a plan on a table, whose outcome decides only which rows have one."""
        setting = setting_on(plan, table)
        return cls(setting=setting, subjects=subjects_of(plan, setting.source, setting.state))

    @property
    def n_rows(self) -> int:
        """Rows of the base."""
        return self.setting.source.n_rows

    def trials(self, outcomes: FloatArray) -> Trials:
        """What the plan comes to for each of some outcomes.

        Parameters
        ----------
        outcomes : FloatArray, shape (B, n_rows)
            In the order of the base.
        """
        batch = Batch.of(self.setting.fresh(), self.subjects)
        if batch is None:
            return self.one_by_one(outcomes)
        trials, rest = batch.outcomes(outcomes)
        if len(rest):
            put(trials, rest, self.one_by_one(outcomes[rest]))
        return trials

    def one_by_one(self, outcomes: FloatArray) -> Trials:
        """The same by the steps themselves, one outcome after another."""
        setting = self.setting.fresh()
        into = Collector(setting.plan, self.subjects, len(outcomes))
        cross = _cross(setting, outcomes)
        for place, outcome in enumerate(outcomes):
            try:
                ended = run_trial(setting, outcome, None if cross is None else cross[place])
            except BeforehandError:
                continue
            into.take(place, ended)
        return into.trials


def _cross(setting: Setting, outcomes: FloatArray) -> FloatArray | None:
    """Cross-products of all outcomes with the columns of the full model at once."""
    ground, state = setting.ground, setting.state
    if ground is None or state.status:
        return None
    model = ground.model(state)
    try:
        ground.columns.places(model.keys)
        if "transforms" in setting.plan.steps:
            ground.squares(model)
    except BeforehandError:
        return None
    about: FloatArray = outcomes - outcomes.mean(axis=1)[:, None]
    return about @ ground.columns.values


def table_trials(
    plan: Plan,
    tables: Iterable[Table],
    count: int,
    subjects: Subjects,
    seen: Sequence[SeenRuling] = (),
    elsewhere: Setting | None = None,
) -> Trials:
    """What the plan comes to on each of some tables, missing data and all.

    Parameters
    ----------
    plan : Plan
    tables : iterable of Table
        Asked for one after the other, so that one is held at a time.
    count : int
        How many there are.
    subjects : Subjects
    seen : sequence of SeenRuling
        Rulings of the real run.
    elsewhere : Setting, optional
        Rows on which the answer of each replicate is tried.
    """
    into = Collector(plan, subjects, count, seen)
    for place, table in enumerate(tables):
        try:
            setting = setting_on(plan, table)
            ended = run_trial(setting, setting.source.raw(plan.outcome.column))
        except BeforehandError:
            continue
        into.take(place, ended, setting)
        if elsewhere is not None:
            into.try_elsewhere(place, ended, setting.source, elsewhere)
    return into.trials


def setting_on(plan: Plan, table: Table) -> Setting:
    """What the steps after missing data start from, on a table."""
    state, base, made = missing_data(plan, table, declared="missing_data" in plan.steps, described=False)
    return setting_of(plan, table, base, state, made)


def subjects_of(plan: Plan, source: TableSource, state: State) -> Subjects:
    """Every predictor and design column that a plan can come to adopt."""
    names = tuple(p.column for p in plan.predictors) + tuple(product_name(p) for p in plan.products)
    # A predictor that missing data took out has no column on these rows.
    model = Designer(plan, source).model(replace(state, transforms={}))
    keeping = Keeping(plan)
    always = {name for name in names if keeping.always(name)}
    # What an always-kept product is made of cannot leave either.
    always |= {part for name in always for part in keeping.parts(name)}
    keys = [(key, names.index(term.name)) for term in model.terms for key in term.keys]
    return Subjects(
        names=names,
        held=tuple(name in always for name in names),
        columns=tuple(column_name(key) for key, _ in keys),
        owners=tuple(place for _, place in keys),
    )


class Collector:
    """Puts what replicates came to in their places.

    Parameters
    ----------
    plan : Plan
    subjects : Subjects
    count : int
        Replicates.
    seen : sequence of SeenRuling
        Rulings of the real run, to be found again or not.
    """

    def __init__(self, plan: Plan, subjects: Subjects, count: int, seen: Sequence[SeenRuling] = ()) -> None:
        self.trials = empty(count, subjects, len(seen))
        self._plan = plan
        self._selects = "selection" in plan.steps and plan.selection.method != "none"
        self._keeping = Keeping(plan)
        self._place = {name: place for place, name in enumerate(subjects.names)}
        self._column = {name: place for place, name in enumerate(subjects.columns)}
        self._seen = [(one.step, one.subject, one.ground) for one in seen]
        self._names: dict[Key, int | None] = {}

    def take(self, place: int, ended: Ended, setting: Setting | None = None) -> None:
        """Take down how a replicate ended."""
        trials = self.trials
        trials.status[place] = STATUSES.index(ended.status)
        if self._seen:
            rulings = (*(setting.made if setting is not None else ()), *ended.rulings)
            made = {(ruling.step, ruling.subject, ruling.ground) for ruling in rulings}
            trials.same_rulings[place] = [one in made for one in self._seen]
        if ended.final is None:
            return
        fit = ended.final.fit
        for ruling in ended.rulings:
            if ruling.ground in _WHOLE_MODEL:
                p = ruling.evidence.get("p")
                trials.full_p[place] = float("nan") if p is None else float(p)
        trials.rows[place] = fit.n
        if ended.status != "adopted":
            # A weak model is no answer: what stands then is the mean.
            trials.r_squared[place] = trials.adjusted_r_squared[place] = 0.0
            return
        trials.df[place] = fit.df_inference
        trials.r_squared[place], trials.adjusted_r_squared[place] = fit.r_squared, fit.adjusted_r_squared
        if fit.f_p is not None:
            trials.model_p[place] = fit.f_p
        self._adopted(place, ended)

    def try_elsewhere(self, place: int, ended: Ended, seen: TableSource, elsewhere: Setting) -> None:
        """Try the answer of a replicate on other rows."""
        if ended.final is None:
            return
        outcome = elsewhere.source.raw(self._plan.outcome.column)
        if ended.status != "adopted":
            own = float(seen.raw(self._plan.outcome.column).mean())
            predicted = np.full(len(outcome), own)
            self.trials.here[place] = 0.0
        else:
            predicted = predictions(ended, seen, elsewhere.source)
            drawn = seen.raw(self._plan.outcome.column)
            self.trials.here[place] = agreement(drawn, predictions(ended, seen, seen))[0]
        found = agreement(outcome, predicted)
        self.trials.elsewhere[place], self.trials.slope[place] = found

    def _adopted(self, place: int, ended: Ended) -> None:
        """Names and coefficients of an answer that was adopted."""
        assert ended.final is not None
        trials, state, model = self.trials, ended.state, ended.final.model
        turned = state.outcome.rung != IDENTITY
        for name in model.names:
            at = self._place[name]
            significant = ended.final.significant(name, self._plan.alpha)
            trials.present[place, at] = True
            trials.significant[place, at] = significant
            trials.adopted[place, at] = significant or (
                self._selects and self._keeping.hold(name, state.working, ended.final.p_of(name)) is None
            )
            trials.transformed[place, at] = turned or _under_rung(model.term(name))
        if turned:
            return
        for coefficient in ended.final.fit.coefficients:
            if coefficient.key is None:
                trials.intercept[place] = coefficient.estimate
                continue
            column = self._column_of(coefficient.key)
            if column is not None:
                trials.estimates[place, column] = coefficient.estimate
                trials.errors[place, column] = coefficient.standard_error

    def _column_of(self, key: Key) -> int | None:
        """Where a column stands among the subjects; None for one under a rung."""
        if key not in self._names:
            plain = all(factor.rung == IDENTITY for factor in key.factors)
            self._names[key] = self._column.get(column_name(key)) if plain else None
        return self._names[key]


def _under_rung(term: Term) -> bool:
    """Whether any part of a predictor stands under a rung of the ladder."""
    return any(factor.rung != IDENTITY for key in term.keys for factor in key.factors)
