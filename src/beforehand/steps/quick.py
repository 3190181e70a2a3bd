"""The quick bench: the same questions answered in plain doubles, with nothing kept or numbered.

A rehearsal asks the steps of a plan thousands of times. Where doubles do not carry an answer, the
bench raises `NotQuick`, and the replicate is run on the recording bench instead.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace

import numpy as np

from beforehand.fit import assumptions, exponents, ladder, quick_checks, quick_influence
from beforehand.fit.columns import FloatArray
from beforehand.fit.doubles import KNIFE_EDGE, NotQuick, require_clear
from beforehand.fit.results import Check
from beforehand.steps.bench import Checked, Comparison, Fitted, Linked, Measures, Positions
from beforehand.steps.best import best_subset
from beforehand.steps.comparisons import compared, measured
from beforehand.steps.ground import Ground
from beforehand.steps.quick_numbers import Numbers, places_of
from beforehand.steps.state import Model, Rows, State, Transform, column_name

NO_ID = ""

# Measures of two copies of a row differ by less than this, if at all.
TIE = 1e-13


class QuickBench:
    """Supplies the steps of one replicate with numbers in plain doubles.

    Parameters
    ----------
    ground : Ground
        What the replicate shares with others.
    outcome : FloatArray, shape (n_rows,)
        Over the base.
    cross : FloatArray, optional
        Cross-products of the ground's first columns with the outcome about its mean.
    """

    def __init__(self, ground: Ground, outcome: FloatArray, cross: FloatArray | None = None) -> None:
        self.step = ""
        self._ground = ground
        self._plan = ground.plan
        self.numbers = Numbers(ground, outcome, cross)
        self._limits = ground.plan.collinearity.examine_when
        self._fits: dict[Model, Fitted] = {}

    # -- what a step asks for ---------------------------------------------------------------

    def design(self, state: State) -> Model:
        """The working model of a state."""
        return self._ground.model(state)

    def label(self, position: int) -> str:
        """The label of a row of the base."""
        return self._ground.source.label(position)

    def fit(self, model: Model, why: str) -> Fitted:
        """Least squares of a model."""
        known = self._fits.get(model)
        if known is None:
            fit = self.numbers.fit(model)
            if model.errors != "classical":
                fit = self.numbers.robust(model, fit, model.errors)
            alpha = self._plan.alpha
            require_clear([fit.f_p, *(test.p for test in fit.tests.values())], alpha)
            known = self._fits[model] = Fitted(NO_ID, model, fit)
        return known

    def robust(self, fitted: Fitted, errors: str, why: str) -> Fitted:
        """The same coefficients with other standard errors."""
        if bool(
            (quick_influence.leverage_of(self._ground.columns, self.numbers.of(fitted.model)) >= 1.0).any()
        ):
            return fitted
        model = replace(fitted.model, errors=errors)
        return Fitted(NO_ID, model, self.numbers.robust(model, self.numbers.fit(model), errors))

    def two_valued(self, name: str, rows: Rows) -> bool:
        """Whether a numeric predictor has fewer than three values in these rows."""
        return self._ground.two_valued(name, rows)

    def domain(self, name: str, rung: str, rows: Rows) -> str:
        """Why a rung cannot be applied; '' when it can. The outcome goes by the name ''."""
        if name:
            return self._ground.domain(name, rung, rows)
        return ladder.domain(rung, self.numbers.outcome_in(rows), way_back=True)

    def learn(self, model: Model, name: str, rung: str) -> Transform:
        """The rung with its exponent learned from this model."""
        if rung != ladder.BOX_COX:
            return Transform(rung)
        if name:
            return Transform(rung, exponents.predictor_exponent(self.numbers.profile(model, name)))
        values = self.numbers.outcome_in(model.rows)
        found = exponents.outcome_exponent(
            self.numbers.profile_of_outcome(model), n=model.rows.n, log_total=float(np.log(values).sum())
        )
        return Transform(rung, found.exponent)

    def curvature(self, fitted: Fitted, name: str, alpha: float) -> Checked:
        """T test of the predictor's added square."""
        model = fitted.model
        if self.two_valued(name, model.rows):
            return _checked(quick_checks.not_made("curvature", f"{name} has two values only"), alpha)
        self._ground.squares(model)
        square = self._ground.square(model.term(name).keys[0])
        check = quick_checks.curvature(
            self._ground.columns, self.numbers.of(model), square, self.numbers.response(model.outcome)
        )
        return _checked(check, alpha)

    def spread(self, fitted: Fitted, name: str | None, test: str, alpha: float) -> Checked:
        """Equal spread along one predictor, or along the whole design."""
        model = fitted.model
        keys = model.keys if name is None else model.term(name).keys
        judge = quick_checks.white if test == "white" else quick_checks.breusch_pagan
        return _checked(
            judge(self._ground.columns, keys, self.numbers.of(model).design, self.numbers.residual(model)),
            alpha,
        )

    def normality(self, fitted: Fitted, test: str, alpha: float) -> Checked:
        """Normal residuals."""
        judge = assumptions.shapiro_wilk if test == "shapiro_wilk" else quick_checks.jarque_bera
        return _checked(judge(self.numbers.residual(fitted.model)), alpha)

    def independence(self, fitted: Fitted, test: str, lags: int, alpha: float) -> Checked:
        """Serial independence in the declared order."""
        if self._ground.order is None:
            return _checked(quick_checks.not_made(test, "the plan declares no order of the rows"), alpha)
        model = fitted.model
        order, residual = np.delete(self._ground.order, model.rows.gone), self.numbers.residual(model)
        if test == "durbin_watson":
            return _checked(quick_checks.durbin_watson(residual, order), alpha)
        design = self.numbers.of(model).design
        return _checked(
            quick_checks.breusch_godfrey(self._ground.columns, design, residual, order, lags), alpha
        )

    def reset(self, fitted: Fitted, alpha: float) -> Checked:
        """Powers of the fitted values added to the model."""
        model = fitted.model
        fit, residual = self.numbers.of(model), self.numbers.residual(model)
        values = self.numbers.response(model.outcome).in_use(fit.design.gone) - residual
        return _checked(quick_checks.reset(self._ground.columns, fit, residual, values), alpha)

    def dependence(self, model: Model) -> Linked | None:
        """The first exact linear dependence among the columns, in plan order."""
        return self._ground.dependence(model)

    def correlations(self, model: Model) -> Sequence[tuple[str, str, float]]:
        """Correlations of every pair of single-column predictors, in plan order."""
        design = self._ground.columns.design(model.keys, model.rows.gone)
        at = {key: place for place, key in enumerate(model.keys)}
        single = [(term.name, at[term.keys[0]]) for term in model.terms if term.single]
        places = [place for _, place in single]
        own = design.gram[np.ix_(places, places)]
        length = np.sqrt(own.diagonal())
        rows = (own / length / length[:, None]).tolist()
        require_clear([abs(r) for row in rows for r in row], self._limits.correlation_above)
        return tuple(
            (one, other, rows[at][beyond])
            for at, (one, _) in enumerate(single)
            for beyond, (other, _) in enumerate(single[at + 1 :], start=at + 1)
        )

    def inflation(self, model: Model) -> Sequence[tuple[str, float]]:
        """VIF of each predictor; for a block the generalized VIF to the power 1/df."""
        design = self._ground.columns.design(model.keys, model.rows.gone)
        single = (design.inverse.diagonal() * design.gram.diagonal()).tolist()
        found = tuple(
            (name, single[places[0]] if len(places) == 1 else _inflation(design.inverse, design.gram, places))
            for name, places in places_of(model).items()
        )
        require_clear([value for _, value in found], self._limits.vif_above)
        return found

    def inflation_without(self, model: Model, name: str) -> Mapping[str, float]:
        """The same for one predictor, after each other predictor in turn has been left out."""
        design = self._ground.columns.design(model.keys, model.rows.gone)
        blocks = places_of(model)
        own = blocks.pop(name)
        return {
            other: _inflation(design.inverse_without(places) if places else design.inverse, design.gram, own)
            for other, places in blocks.items()
        }

    def measures(self, fitted: Fitted, *, dfbetas: bool) -> Measures:
        """Influence measures of every row in use."""
        model = fitted.model
        found = quick_influence.influence(
            self._ground.columns, self.numbers.of(model), self.numbers.residual(model), dfbetas=dfbetas
        )
        return measured(found, model.rows.kept)

    def without_each(
        self, fitted: Fitted, measures: Measures, flagged: Positions, alpha: float
    ) -> Sequence[Comparison]:
        """Each flagged row left out alone, in the order given."""
        sole = measures.sole[flagged]
        others = flagged[~sole]
        _require_order(measures.cooks_distance[others])
        made = iter(self._compared(fitted, measures, others, alpha)) if len(others) else iter(())
        return tuple(
            self._sole(fitted.model, int(measures.positions[row])) if alone else next(made)
            for row, alone in zip(flagged.tolist(), sole.tolist(), strict=True)
        )

    def best_subset(
        self, model: Model, alpha: float, forced: Callable[[tuple[str, ...]], bool]
    ) -> Model | None:
        """Largest adjusted R² among lawful subsets whose other predictors are significant."""
        fit, response = self.numbers.of(model), self.numbers.response(model.outcome)
        k = fit.design.k
        cross = np.empty((k + 1, k + 1))
        cross[:k, :k] = fit.design.gram
        cross[:k, k] = cross[k, :k] = response.cross_in(fit.design.places, fit.design.gone)
        cross[k, k] = fit.tss
        return best_subset(
            self._plan, model, cross, alpha, forced, lambda one: self.numbers.fit(one).adjusted_r_squared
        )

    def keep_check(self, kind: str, make: Callable[[], object]) -> None:
        """Nothing is kept."""

    # -- inside ------------------------------------------------------------------------------

    def _sole(self, model: Model, position: int) -> Comparison:
        """A row of leverage 1: the predictor that hangs on it has no coefficient without it."""
        linked = self.dependence(replace(model, rows=model.rows.without((position,))))
        of = "" if linked is None else linked.predictor
        return Comparison(position=position, change_r_squared=None, change_coefficient=None, of=of)

    def _compared(
        self, fitted: Fitted, measures: Measures, rows: Positions, alpha: float
    ) -> Sequence[Comparison]:
        """Rows whose removal leaves every coefficient estimable."""
        model, when = fitted.model, self._plan.influence.remove_when
        fit = self.numbers.of(model)
        wanted = when.significance_changes or when.sign_changes
        found = quick_influence.without_each(
            self._ground.columns,
            fit,
            rows,
            residual=self.numbers.residual(model)[rows],
            about=self.numbers.response(model.outcome).in_use(fit.design.gone)[rows],
            blocks=places_of(model) if wanted else {},
        )
        require_clear(found.change_coefficient.tolist(), when.coefficient)
        require_clear(np.abs(found.change_r_squared).tolist(), when.r_squared)
        positions = measures.positions[rows]
        if wanted:
            return compared(fitted, found, positions, alpha)
        columns = [column_name(key) for key in model.keys]
        return [
            Comparison(position=position, change_r_squared=r2, change_coefficient=change, of=columns[column])
            for position, r2, change, column in zip(
                positions.tolist(), found.change_r_squared.tolist(), found.change_coefficient.tolist(),
                found.column.tolist(), strict=True,
            )
        ]  # fmt: skip


def _require_order(falling: FloatArray) -> None:
    """Make sure that the order of rows hangs on more than the last digits of a double.

    Rows that are equal, as copies are, keep the order of the table on either bench.
    """
    apart = np.abs(np.diff(falling))
    scale = np.abs(falling[:-1])
    if bool(((apart > TIE * scale) & (apart <= KNIFE_EDGE * scale)).any()):
        raise NotQuick("rows are flagged in an order that doubles cannot tell")


def _checked(check: Check, alpha: float) -> Checked:
    require_clear([check.p], alpha)
    return Checked(NO_ID, check, alpha, NO_ID)


def _inflation(inverse: FloatArray, gram: FloatArray, places: tuple[int, ...]) -> float:
    """VIF of one column, or the generalized one of a block to the power 1/df."""
    if not places:
        return 1.0
    if len(places) == 1:
        return float(inverse[places[0], places[0]] * gram[places[0], places[0]])
    own = np.ix_(places, places)
    return float((np.linalg.det(inverse[own]) * np.linalg.det(gram[own])) ** (1.0 / len(places)))
