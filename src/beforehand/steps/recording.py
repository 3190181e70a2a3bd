"""The recording bench: every fit and check kept under a number, computed from exact moments.

The table's cross-products are computed once and without rounding; a model on those rows, or on
those rows less a few, is small work on them. Rows are touched only where a measure needs them.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace

import numpy as np

from beforehand.fit import assumptions, influence, ladder, robust
from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.conditioning import condition, inflation_of, inflation_without
from beforehand.fit.fitting import fit_of
from beforehand.fit.moments import Moments
from beforehand.fit.results import Check, Fit
from beforehand.fit.rows import RowValues
from beforehand.fit.tableau import Tableau
from beforehand.plan import Plan
from beforehand.steps.bench import Checked, Comparison, Fitted, Linked, Measures, Positions
from beforehand.steps.best import best_subset
from beforehand.steps.comparisons import compared, measured
from beforehand.steps.designing import Designer
from beforehand.steps.learned import NOTHING, Learned
from beforehand.steps.linking import linked_of
from beforehand.steps.profiles import learned
from beforehand.steps.records import CollinearityRecord, Record, RecordedCheck, RecordedFit
from beforehand.steps.source import TableSource
from beforehand.steps.state import Model, Rows, State, Transform, blocks_of
from beforehand.steps.workings import Workings


class RecordingBench:
    """Supplies the steps of a run with numbers and keeps each of them.

    Parameters
    ----------
    plan : Plan
    source : TableSource
        The columns over the base of the run.
    order : array of shape (n_rows,) or None
        Rank of each row in the declared order, for the check of independence.
    groups : array of shape (n_rows,) or None
        Cluster of each row, where the plan asks for clustered errors.
    progress : callable or None
        Hears what is being done, a few words at a time.
    learned : Learned
        Exponents that are not learned anew.
    """

    def __init__(
        self,
        plan: Plan,
        source: TableSource,
        *,
        order: FloatArray | None = None,
        groups: FloatArray | None = None,
        progress: Callable[[str], None] | None = None,
        learned: Learned = NOTHING,
    ) -> None:
        self.step = ""
        self.record = Record()
        self._plan = plan
        self._base = source
        self._order, self._groups = order, groups
        self._progress = progress
        self._learned = learned
        self._designer = Designer(plan, source)
        self._workings = Workings(source, self._tell)
        self._fitted: dict[Model, Fitted] = {}
        self._checked: dict[tuple[str, str, str | None, str], Checked] = {}
        self._inflation: dict[Model, tuple[tuple[str, float], ...]] = {}

    # -- what a step asks for ---------------------------------------------------------------

    def design(self, state: State) -> Model:
        """The working model of a state."""
        return self._designer.model(state)

    @property
    def errors(self) -> str:
        """The standard errors that the plan asks for from the start."""
        return self._designer.errors

    def label(self, position: int) -> str:
        """The label of a row of the base."""
        return self._base.label(position)

    def fit(self, model: Model, why: str) -> Fitted:
        """Least squares of a model; asked for twice it is one fit, recorded once."""
        known = self._fitted.get(model)
        if known is not None:
            return known
        fit = fit_of(self.tableau(model), blocks_of(model))
        if model.errors != "classical" and not fit.exact:
            fit = self._robust(model, fit, model.errors)
        return self._keep(model, fit, why)

    def robust(self, fitted: Fitted, errors: str, why: str) -> Fitted:
        """The same coefficients with other standard errors, as a fit of its own."""
        model = replace(fitted.model, errors=errors)
        known = self._fitted.get(model)
        if known is not None:
            return known
        try:
            fit = self._robust(model, fitted.fit, errors)
        except robust.NotEstimable:
            return fitted
        return self._keep(model, fit, why)

    def two_valued(self, name: str, rows: Rows) -> bool:
        """Whether a numeric predictor has fewer than three values in these rows."""
        return self._workings.two_valued(name, rows)

    def domain(self, name: str, rung: str, rows: Rows) -> str:
        """Why a rung cannot be applied; '' when it can. The outcome goes by the name ''."""
        values = self._workings.source(rows).raw(name or self._plan.outcome.column)
        return ladder.domain(rung, values, way_back=not name)

    def learn(self, model: Model, name: str, rung: str) -> Transform:
        """The rung with its exponent learned from this model."""
        known = self._learned.exponents.get(name)
        return learned(self._workings, model, name, rung, self._plan.outcome.column, known)

    def curvature(self, fitted: Fitted, name: str, alpha: float) -> Checked:
        """T test of the predictor's added square about its mean."""
        model = fitted.model
        self._prepare_squares(model)

        def make() -> Check:
            term = model.term(name)
            if self.two_valued(name, model.rows):
                return Check(
                    name="curvature", statistic=None, p=None, not_applicable=f"{name} has two values only"
                )
            square = self._square(term.keys[0])
            moments = self._workings.moments(model.rows, (*model.keys, model.outcome, square))
            return assumptions.curvature(self.tableau(model), square, moments)

        return self._check("curvature", fitted, name, alpha, make)

    def spread(self, fitted: Fitted, name: str | None, test: str, alpha: float) -> Checked:
        """Equal spread along one predictor, or along the whole design."""
        model = fitted.model
        keys = model.keys if name is None else model.term(name).keys
        judge = assumptions.white if test == "white" else assumptions.breusch_pagan
        return self._check(
            test, fitted, name, alpha,
            lambda: judge(
                self._workings.source(model.rows), self.tableau(model), keys, self.values(model).residual
            ),
        )  # fmt: skip

    def normality(self, fitted: Fitted, test: str, alpha: float) -> Checked:
        """Normal residuals."""
        judge = assumptions.shapiro_wilk if test == "shapiro_wilk" else assumptions.jarque_bera
        return self._check(
            test, fitted, None, alpha,
            lambda: judge(self.values(fitted.model).residual, exact=fitted.fit.exact),
        )  # fmt: skip

    def independence(self, fitted: Fitted, test: str, lags: int, alpha: float) -> Checked:
        """Serial independence in the declared order."""

        def make() -> Check:
            model = fitted.model
            if self._order is None:
                return Check(
                    name=test, statistic=None, p=None, not_applicable="the plan declares no order of the rows"
                )
            order = np.delete(self._order, model.rows.gone)
            residual = self.values(model).residual
            if test == "durbin_watson":
                return assumptions.durbin_watson(residual, order, exact=fitted.fit.exact)
            return assumptions.breusch_godfrey(
                self._workings.source(model.rows), self.tableau(model), residual, order, lags
            )

        return self._check(test, fitted, None, alpha, make)

    def reset(self, fitted: Fitted, alpha: float) -> Checked:
        """Powers of the fitted values added to the model."""
        model = fitted.model
        return self._check(
            "reset", fitted, None, alpha,
            lambda: assumptions.reset(
                self._workings.source(model.rows), self.tableau(model), self.values(model).fitted
            ),
        )  # fmt: skip

    def dependence(self, model: Model) -> Linked | None:
        """The first exact linear dependence among the columns, in plan order."""
        return linked_of(self._workings, model)

    def correlations(self, model: Model) -> Sequence[tuple[str, str, float]]:
        """Correlations of every pair of single-column predictors, in plan order."""
        moments = self._workings.moments(model.rows, model.keys)
        single = [term for term in model.terms if term.single]
        return tuple(
            (one.name, other.name, moments.correlation(one.keys[0], other.keys[0]))
            for place, one in enumerate(single)
            for other in single[place + 1 :]
        )

    def inflation(self, model: Model) -> Sequence[tuple[str, float]]:
        """VIF of each predictor; for a block the generalized VIF to the power 1/df."""
        known = self._inflation.get(model)
        if known is None:
            moments = self._workings.moments(model.rows, model.keys)
            found = inflation_of(moments, blocks_of(model), intercept=model.intercept)
            known = self._inflation[model] = tuple((name, found[name]) for name in model.names)
        return known

    def inflation_without(self, model: Model, name: str) -> Mapping[str, float]:
        """VIF of one predictor after each other predictor in turn has been left out."""
        moments = self._workings.moments(model.rows, model.keys)
        return inflation_without(moments, blocks_of(model), name, intercept=model.intercept)

    def measures(self, fitted: Fitted, *, dfbetas: bool) -> Measures:
        """Influence measures of every row in use."""
        model = fitted.model
        self._tell(f"influence of {model.rows.n:,} rows")
        found = influence.influence(
            self._workings.source(model.rows), self.tableau(model), self.values(model), dfbetas=dfbetas
        )
        return measured(found, model.rows.kept)

    def without_each(
        self, fitted: Fitted, measures: Measures, flagged: Positions, alpha: float
    ) -> Sequence[Comparison]:
        """Each flagged row left out alone; rows of leverage 1 come out of the exact moments."""
        model = fitted.model
        sole = {
            int(row): self._sole(model, int(measures.positions[row])) for row in flagged if measures.sole[row]
        }
        others = np.array([row for row in flagged.tolist() if row not in sole], dtype=np.int64)
        compared = dict(zip(others.tolist(), self._compared(fitted, measures, others, alpha), strict=True))
        compared |= sole
        return tuple(compared[row] for row in flagged.tolist())

    def _sole(self, model: Model, position: int) -> Comparison:
        """A row of leverage 1: the predictor that hangs on it has no coefficient without it."""
        linked = self.dependence(replace(model, rows=model.rows.without((position,))))
        of = "" if linked is None else linked.predictor
        return Comparison(position=position, change_r_squared=None, change_coefficient=None, of=of)

    def _compared(
        self, fitted: Fitted, measures: Measures, rows: Positions, alpha: float
    ) -> Sequence[Comparison]:
        """Rows whose removal leaves every coefficient estimable."""
        if not len(rows):
            return ()
        model, tableau, values = fitted.model, self.tableau(fitted.model), self.values(fitted.model)
        chosen = self._workings.source(model.rows).select(rows)
        found = influence.without_each(
            chosen,
            tableau,
            residual=values.residual[rows],
            leverage=values.leverage[rows],
            outcome=chosen.read(model.outcome, 0, len(rows)),
            blocks=blocks_of(model),
        )
        return compared(fitted, found, measures.positions[rows], alpha)

    def best_subset(
        self, model: Model, alpha: float, forced: Callable[[tuple[str, ...]], bool]
    ) -> Model | None:
        """Largest adjusted R² among lawful subsets whose other predictors are significant."""
        moments = self._workings.moments(model.rows, (*model.keys, model.outcome))
        return best_subset(
            self._plan,
            model,
            moments.cross((*model.keys, model.outcome), centred=model.intercept),
            alpha,
            forced,
            lambda one: fit_of(self.tableau(one), blocks_of(one)).adjusted_r_squared,
        )

    def keep_check(self, kind: str, make: Callable[[], object]) -> None:
        """Put a table of the step in the record."""
        record = make()
        if kind == "collinearity" and isinstance(record, Model):
            if record.terms:
                self.record.collinearity.append(self._collinearity(record))
        else:
            self.record.tables[kind] = record

    # -- what the answer asks for ------------------------------------------------------------

    def tableau(self, model: Model) -> Tableau:
        """The swept cross-products of a model."""
        return self._workings.tableau(model)

    def values(self, model: Model) -> RowValues:
        """Fitted values, residuals and leverages of the rows in use."""
        return self._workings.values(model)

    def moments(self, model: Model) -> Moments:
        """Exact moments of a model's columns and outcome in its rows."""
        return self._workings.moments(model.rows, (*model.keys, model.outcome))

    def _keep(self, model: Model, fit: Fit, why: str) -> Fitted:
        fitted = Fitted(f"F{len(self.record.fits) + 1:03d}", model, fit)
        self._fitted[model] = fitted
        self.record.fits.append(RecordedFit(id=fitted.id, step=self.step, why=why, model=model, fit=fit))
        self._tell(f"{self.step.replace('_', ' ')}: {why}")
        return fitted

    def _check(
        self, name: str, fitted: Fitted, subject: str | None, alpha: float, make: Callable[[], Check]
    ) -> Checked:
        """Make a check once for a fit and subject, and number it."""
        known = self._checked.get((name, fitted.id, subject, self.step))
        if known is None:
            checked = make()
            known = Checked(f"C{len(self.record.checks) + 1:03d}", checked, alpha, fitted.id)
            self._checked[(name, fitted.id, subject, self.step)] = known
            self.record.checks.append(
                RecordedCheck(
                    id=known.id, stage=self.step, subject=subject, fit=fitted.id, alpha=alpha, check=checked
                )
            )
        return known

    def _tell(self, what: str) -> None:
        if self._progress is not None:
            self._progress(what)

    def _square(self, key: Key) -> Key:
        """The added square of a column, about its mean in the base."""
        return Key(key.factors, centre=self._workings.mean(key))

    def _prepare_squares(self, model: Model) -> None:
        """One pass over the rows for the added squares of every number in the model."""
        self._workings.moments(model.rows, (*model.keys, model.outcome))
        squares = [self._square(term.keys[0]) for term in model.terms if term.kind == "number"]
        self._workings.moments(model.rows, (*model.keys, model.outcome, *squares))

    def _robust(self, model: Model, fit: Fit, errors: str) -> Fit:
        """The fit with other standard errors."""
        plain = replace(model, errors="classical")
        sole = np.flatnonzero(self.values(plain).leverage >= 1.0)
        if errors in ("hc2", "hc3") and len(sole):
            label = self._workings.source(model.rows).label(int(sole[0]))
            raise robust.NotEstimable(
                f"row {label} alone makes a coefficient (leverage 1), so {errors} standard errors do not "
                "exist for this model: declare other errors, or leave the row or the predictor out"
            )
        lags = getattr(self._plan.errors, "autocorrelation_lags", None)
        return robust.robust_fit(
            fit,
            self._workings.source(model.rows),
            self.tableau(plain),
            self.values(plain),
            blocks_of(model),
            errors=errors,
            groups=None if self._groups is None else np.delete(self._groups, model.rows.gone),
            order=None if self._order is None else np.delete(self._order, model.rows.gone),
            lags=lags,
        )

    def _collinearity(self, model: Model) -> CollinearityRecord:
        """Correlations, inflation and condition of a model."""
        moments = self._workings.moments(model.rows, (*model.keys, model.outcome))
        return CollinearityRecord(
            stage=self.step,
            model=model,
            correlations=tuple(self.correlations(model)),
            inflation=tuple(self.inflation(model)),
            condition=condition(moments, model.keys, intercept=model.intercept),
        )
