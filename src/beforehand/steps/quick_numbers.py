"""What a model comes to in plain doubles: fits, residuals and profiles of one outcome on a ground."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
from scipy.special import fdtrc, stdtr

from beforehand.fit import ladder, quick_checks
from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.doubles import NotQuick, Response, Solved, residual_of, solved
from beforehand.fit.quick_errors import robust_covariance, with_covariance
from beforehand.fit.results import Coefficient, Fit, TermTest
from beforehand.steps.ground import Ground
from beforehand.steps.state import Model, Rows, Transform, blocks_of, factor_of


class Numbers:
    """Fits of one outcome.

    Parameters
    ----------
    ground : Ground
    outcome : FloatArray, shape (n_rows,)
        Over the base.
    cross : FloatArray, optional
        Cross-products of the ground's first columns with the outcome about its mean.
    """

    def __init__(self, ground: Ground, outcome: FloatArray, cross: FloatArray | None) -> None:
        self._ground = ground
        self._raw = outcome
        own = Key((factor_of(ground.plan.outcome.column, Transform()),))
        self._responses = {own: Response(ground.columns, outcome, cross)}
        self._solved: dict[Model, Solved] = {}
        self._residuals: dict[Model, FloatArray] = {}

    def outcome_in(self, rows: Rows) -> FloatArray:
        """The outcome as it was read, in some rows."""
        return np.delete(self._raw, rows.gone) if rows.gone else self._raw

    def response(self, outcome: Key) -> Response:
        """The outcome on a scale."""
        known = self._responses.get(outcome)
        if known is None:
            factor = outcome.factors[0]
            values = ladder.apply(factor.rung, self._raw, factor.exponent)
            if not np.isfinite(values).all():
                # Rows outside the domain have left; the rest is for the exact moments.
                raise NotQuick("the rung does not apply to every row of the base")
            known = self._responses[outcome] = Response(self._ground.columns, values)
        return known

    def of(self, model: Model) -> Solved:
        """Slopes and sums of squares of a model, whatever its standard errors."""
        plain = model if model.errors == "classical" else replace(model, errors="classical")
        known = self._solved.get(plain)
        if known is None:
            design = self._ground.columns.design(plain.keys, plain.rows.gone)
            known = self._solved[plain] = solved(design, self.response(plain.outcome))
        return known

    def residual(self, model: Model) -> FloatArray:
        """Residuals of the rows in use."""
        plain = model if model.errors == "classical" else replace(model, errors="classical")
        known = self._residuals.get(plain)
        if known is None:
            known = residual_of(self._ground.columns, self.of(plain), self.response(plain.outcome))
            self._residuals[plain] = known
        return known

    def fit(self, model: Model) -> Fit:
        """The classical fit."""
        fit = self.of(model)
        design, columns, response = fit.design, self._ground.columns, self.response(model.outcome)
        n, k, df, rss = design.n, design.k, design.df, fit.rss
        s2 = rss / df
        length = columns.length(design.places)
        root = np.sqrt(s2 * design.inverse.diagonal())
        t = fit.slopes / root
        tails = (2.0 * stdtr(df, -np.abs(t))).tolist()
        estimates, errors = (fit.slopes / length).tolist(), (root / length).tolist()
        coefficients = [
            Coefficient(key=key, estimate=estimate, standard_error=error, t=one, p=p)
            for key, estimate, error, one, p in zip(
                model.keys, estimates, errors, t.tolist(), tails, strict=True
            )
        ]
        coefficients.insert(0, self._intercept(fit, response, np.array(estimates)))
        tests: dict[str, TermTest] = {}
        for name, places in places_of(model).items():
            if len(places) == 1:
                own = coefficients[places[0] + 1]
                statistic = abs(own.t or 0.0)
                tests[name] = TermTest(
                    predictor=name, df=1, statistic=statistic, p=own.p, partial_f2=statistic * statistic / df
                )
            elif places:
                gain = _gain(fit, places)
                f = gain / rss * df / len(places)
                p = float(fdtrc(len(places), df, f))
                tests[name] = TermTest(
                    predictor=name, df=len(places), statistic=f, p=p, partial_f2=gain / rss
                )
            else:
                tests[name] = TermTest(predictor=name, df=0, statistic=None, p=None, partial_f2=None)
        total_f = ((fit.tss - rss) / k) / s2 if k else None
        deviance = n * float(np.log(2.0 * np.pi * rss / n)) + n
        return Fit(
            n=n, p=k + 1, df_residual=df, df_inference=df, coefficients=tuple(coefficients), tests=tests,
            rss=rss, tss=fit.tss, r_squared=1.0 - rss / fit.tss,
            adjusted_r_squared=1.0 - s2 / (fit.tss / (n - 1)), residual_sd=float(np.sqrt(s2)),
            f=total_f, f_df=(k, df), f_p=None if total_f is None else float(fdtrc(k, df, total_f)),
            aic=deviance + 2 * (k + 1), bic=deviance + (k + 1) * float(np.log(n)),
        )  # fmt: skip

    def _intercept(self, fit: Solved, response: Response, estimates: FloatArray) -> Coefficient:
        """The intercept; its standard error steers nothing and is not taken."""
        design, columns = fit.design, self._ground.columns
        centre = columns.centre(design.places) + design.mean * columns.length(design.places)
        mean = response.centre
        if len(design.gone):
            mean -= float(response.about[design.gone].sum()) / design.n
        value = mean - float(estimates @ centre) if design.k else mean
        return Coefficient(key=None, estimate=value, standard_error=0.0, t=None, p=None)

    def robust(self, model: Model, fit: Fit, errors: str) -> Fit:
        """The fit with other standard errors."""
        design = self.of(model).design
        gone = model.rows.gone
        groups, order = self._ground.groups, self._ground.order
        covariance, df = robust_covariance(
            self._ground.columns.pulls(design),
            self.residual(model),
            self._ground.columns.leverage(design),
            errors=errors,
            df=design.df,
            groups=None if groups is None else np.delete(groups, gone),
            order=None if order is None else np.delete(order, gone),
            lags=getattr(self._ground.plan.errors, "autocorrelation_lags", None),
        )
        length = self._ground.columns.length(design.places)
        return with_covariance(fit, covariance / np.outer(length, length), blocks_of(model), df, errors)

    def profile(self, model: Model, name: str) -> Callable[[float], float]:
        """Residual sum of squares with one predictor under a Box-Cox power."""
        rest = model.without(name)
        without = self.of(rest)
        residual = self.residual(rest)
        design, gone = without.design, without.design.gone
        about = self._ground.columns.about_mean(design)

        def rss_of(exponent: float) -> float:
            key = Key((factor_of(name, Transform(ladder.BOX_COX, exponent)),))
            column = self._ground.source.read(key, 0, self._ground.source.n_rows)
            column = np.delete(column, gone) if len(gone) else column
            column = column - column.mean()
            total = float(column @ column)
            left = column - about @ (design.inverse @ (about.T @ column))
            own = float(left @ left)
            if not own > quick_checks.NEAR * total:
                raise NotQuick("a power is nearly a combination of the other columns")
            gain = float(residual @ left)
            return without.rss - gain * gain / own

        return rss_of

    def profile_of_outcome(self, model: Model) -> Callable[[float], float]:
        """Residual sum of squares with the outcome under a Box-Cox power."""
        design = self._ground.columns.design(model.keys, model.rows.gone)
        about, values = self._ground.columns.about_mean(design), self.outcome_in(model.rows)

        def rss_of(exponent: float) -> float:
            turned = ladder.apply(ladder.BOX_COX, values, exponent)
            turned = turned - turned.mean()
            cross = turned @ about
            rss = float(turned @ turned) - float(cross @ design.inverse @ cross)
            if not rss > quick_checks.NEAR * float(turned @ turned):
                raise NotQuick("the outcome is fitted nearly exactly")
            return rss

        return rss_of


def places_of(model: Model) -> dict[str, tuple[int, ...]]:
    """Places of each predictor's columns in the model."""
    found: dict[str, tuple[int, ...]] = {}
    start = 0
    for term in model.terms:
        found[term.name] = tuple(range(start, start + len(term.keys)))
        start += len(term.keys)
    return found


def _gain(fit: Solved, places: tuple[int, ...]) -> float:
    """What the residual sum of squares grows by without some columns."""
    slopes = fit.slopes[list(places)]
    own = fit.design.inverse[np.ix_(places, places)]
    return float(slopes @ np.linalg.solve(own, slopes))
