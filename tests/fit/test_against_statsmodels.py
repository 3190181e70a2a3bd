"""statsmodels as an independent judge of every statistic, over many random tables."""

from __future__ import annotations

import warnings
from functools import cache

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.stats.diagnostic import acorr_breusch_godfrey, het_breuschpagan, het_white
from statsmodels.stats.outliers_influence import OLSInfluence, variance_inflation_factor
from statsmodels.stats.stattools import durbin_watson

from beforehand.fit import assumptions, robust
from beforehand.fit.columns import Key
from beforehand.fit.conditioning import condition, inflation_of, inflation_without
from beforehand.fit.fitting import fit_of
from beforehand.fit.influence import influence, without_each
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.rows import row_values
from beforehand.fit.tableau import added_column_test, tableau_of

SEEDS = range(40)
Y = named("y")


class Products(ArraySource):
    """Plain columns and products of them."""

    def read(self, key, start, stop):
        """Values of a column, or of a product of columns."""
        parts = [super(Products, self).read(Key((factor,)), start, stop) for factor in key.factors]
        return np.prod(parts, axis=0)


class Drawn:
    """One random table, our fit of it and the judge's."""

    def __init__(self, seed: int) -> None:
        rng = np.random.default_rng(seed)
        self.n = int(rng.integers(18, 70))
        k = int(rng.integers(1, 6))
        self.intercept = bool(seed % 4)
        mixed = rng.normal(size=(self.n, k)) @ (np.eye(k) + 0.4 * rng.normal(size=(k, k)))
        scale = 10.0 ** rng.integers(-3, 4, size=k)
        self.x = mixed * scale + rng.integers(0, 3, size=k) * scale
        levels = rng.integers(0, 3, size=self.n)
        levels[:3] = [0, 1, 2]
        self.block = np.column_stack([levels == 1, levels == 2]).astype(float)
        self.design = np.column_stack([self.x, self.block])
        self.y = self.design @ (rng.normal(size=k + 2) / np.append(scale, [1, 1])) + rng.standard_t(
            5, size=self.n
        )
        self.keys = tuple(named(f"x{j}") for j in range(k + 2))
        self.blocks = {f"x{j}": (self.keys[j],) for j in range(k)} | {"g": self.keys[k:]}
        columns = {key: self.design[:, j] for j, key in enumerate(self.keys)}
        self.source = Products({**columns, Y: self.y})
        self.moments = moments_of(self.source, (*self.keys, Y))
        self.tableau = tableau_of(self.moments, Y, self.keys, intercept=self.intercept)
        self.fit = fit_of(self.tableau, self.blocks)
        self.values = row_values(self.source, self.tableau)
        self.exog = sm.add_constant(self.design, has_constant="add") if self.intercept else self.design
        self.judge = sm.OLS(self.y, self.exog, hasconst=self.intercept).fit()


@cache
def drawn(seed: int) -> Drawn:
    """The table of a seed, made once."""
    return Drawn(seed)


def close(found, expected, tolerance=1e-8, zero=1e-12):
    """Equal to a relative tolerance; ``zero`` is how far from 0 the judge's own rounding reaches."""
    np.testing.assert_allclose(
        np.asarray(found, float), np.asarray(expected, float), rtol=tolerance, atol=zero
    )


@pytest.mark.parametrize("seed", SEEDS)
def test_the_table_of_coefficients_and_the_fit(seed):
    """Coefficients, standard errors, t, p, R², adjusted R², F, AIC, BIC as statsmodels' OLS gives them."""
    d = drawn(seed)
    close([c.estimate for c in d.fit.coefficients], d.judge.params)
    close([c.standard_error for c in d.fit.coefficients], d.judge.bse)
    close([c.t for c in d.fit.coefficients], d.judge.tvalues)
    close([c.p for c in d.fit.coefficients], d.judge.pvalues, 1e-6)
    close([d.fit.r_squared, d.fit.adjusted_r_squared], [d.judge.rsquared, d.judge.rsquared_adj])
    close([d.fit.f, d.fit.f_p], [d.judge.fvalue, d.judge.f_pvalue], 1e-6)
    close([d.fit.aic, d.fit.bic], [d.judge.aic, d.judge.bic])
    close(d.fit.residual_sd**2, d.judge.mse_resid)


@pytest.mark.parametrize("seed", SEEDS)
def test_a_block_is_tested_by_its_partial_f(seed):
    """The test of a category is statsmodels' F test of its columns; f² follows from the two R²."""
    d = drawn(seed)
    k = d.x.shape[1] + int(d.intercept)
    judge = d.judge.f_test(np.eye(k + 2)[k:])
    close([d.fit.tests["g"].statistic, d.fit.tests["g"].p], [judge.fvalue, judge.pvalue], 1e-6)
    smaller = sm.OLS(d.y, d.exog[:, :-2]).fit()
    close(d.fit.tests["g"].partial_f2, (smaller.ssr - d.judge.ssr) / d.judge.ssr)


@pytest.mark.parametrize("seed", SEEDS)
def test_influence_measures(seed):
    """Leverage, both studentized residuals, Cook, DFFITS, DFBETAS, covariance ratio, PRESS."""
    d = drawn(seed)
    judge = OLSInfluence(d.judge)
    found = influence(d.source, d.tableau, d.values, dfbetas=True)
    close(found.leverage, judge.hat_matrix_diag)
    close(d.values.residual, d.judge.resid, 1e-7, 1e-7)
    close(found.internal, judge.resid_studentized_internal, 1e-7, 1e-8)
    close(found.external, judge.resid_studentized_external, 1e-7, 1e-8)
    close(found.cooks_distance, judge.cooks_distance[0], 1e-7)
    close(found.dffits, judge.dffits[0], 1e-7, 1e-8)
    close(found.covariance_ratio, judge.cov_ratio, 1e-7)
    slopes = judge.dfbetas[:, 1:] if d.intercept else judge.dfbetas
    close(found.largest_dfbetas, np.abs(slopes).max(axis=1), 1e-7, 1e-8)
    close(d.values.press, (judge.resid_press**2).sum(), 1e-7)
    assert not found.sole.any()


@pytest.mark.parametrize("seed", SEEDS)
def test_without_each_row_is_a_refit_without_it(seed):
    """R², the largest change of a slope, every p and every slope, against an actual refit."""
    d = drawn(seed)
    rows = np.arange(0, d.n, 3)
    chosen = ArraySource({key: values[rows] for key, values in d.source.columns.items()})
    found = without_each(
        chosen, d.tableau, residual=d.values.residual[rows], leverage=d.values.leverage[rows],
        outcome=d.y[rows], blocks=d.blocks,
    )  # fmt: skip
    first = int(d.intercept)
    for at, row in enumerate(rows):
        left = sm.OLS(np.delete(d.y, row), np.delete(d.exog, row, axis=0), hasconst=d.intercept).fit()
        close(found.change_r_squared[at], left.rsquared - d.judge.rsquared, 1e-6)
        shifts = np.abs(left.params - d.judge.params)[first:] / d.judge.bse[first:]
        close(found.change_coefficient[at], shifts.max(), 1e-6)
        assert found.column[at] == shifts.argmax()
        close(found.estimates[at], left.params[first:], 1e-6)
        for j in range(d.x.shape[1]):
            close(found.p[f"x{j}"][at], left.pvalues[first + j], 1e-5)
        k = d.x.shape[1] + first
        close(found.p["g"][at], left.f_test(np.eye(k + 2)[k:]).pvalue, 1e-5)


@pytest.mark.parametrize("seed", SEEDS)
def test_variance_inflation(seed):
    """VIF as statsmodels gives it; the generalized one by its determinants (Fox & Monette 1992)."""
    d = drawn(seed)
    if not d.intercept:
        return
    found = inflation_of(d.moments, d.blocks, intercept=True)
    for j in range(d.x.shape[1]):
        close(found[f"x{j}"], variance_inflation_factor(d.exog, j + 1), 1e-7)
    r = np.corrcoef(d.design, rowvar=False)
    k = d.x.shape[1]
    gvif = np.linalg.det(r[:k, :k]) * np.linalg.det(r[k:, k:]) / np.linalg.det(r)
    close(found["g"], gvif**0.5, 1e-7)
    for name in d.blocks:
        left = inflation_without(d.moments, d.blocks, name, intercept=True)
        for other in left:
            fresh = {one: keys for one, keys in d.blocks.items() if one != other}
            close(left[other], inflation_of(d.moments, fresh, intercept=True)[name], 1e-7)


@pytest.mark.parametrize("seed", SEEDS)
def test_condition_indices_and_shares(seed):
    """Singular values of the columns scaled to unit length, by numpy."""
    d = drawn(seed)
    unit = d.exog / np.linalg.norm(d.exog, axis=0)
    _, values, right = np.linalg.svd(unit, full_matrices=False)
    found = condition(d.moments, d.keys, intercept=d.intercept)
    close(found.indices, values[0] / values, 1e-7)
    parts = (right.T / values) ** 2
    close(found.shares, (parts / parts.sum(axis=1, keepdims=True)).T, 1e-6)


@pytest.mark.parametrize("seed", SEEDS)
def test_spread_checks(seed):
    """Koenker's form of Breusch-Pagan, and White's full form, as statsmodels gives them."""
    d = drawn(seed)
    if not d.intercept:
        return
    found = assumptions.breusch_pagan(d.source, d.tableau, d.keys, d.values.residual)
    lm, p, *_ = het_breuschpagan(d.judge.resid, d.exog)
    close([found.statistic, found.p], [lm, p], 1e-6)
    k = d.x.shape[1]
    numbers = d.keys[:k]
    small = tableau_of(d.moments, Y, numbers, intercept=True)
    residual = sm.OLS(d.y, sm.add_constant(d.x)).fit().resid
    found = assumptions.white(d.source, small, numbers, residual)
    # The judge takes the auxiliary design as of full rank; ours leaves out what others determine.
    aux = sm.add_constant(d.x)
    products = np.column_stack([aux[:, i] * aux[:, j] for i in range(k + 1) for j in range(i, k + 1)])
    if found.p is not None and np.linalg.matrix_rank(products) == products.shape[1]:
        lm, p, *_ = het_white(residual, aux)
        close([found.statistic, found.p], [lm, p], 1e-6)


@pytest.mark.parametrize("seed", SEEDS)
def test_reset(seed):
    """F of the square and cube of the centred and scaled fitted values, fitted by statsmodels."""
    d = drawn(seed)
    found = assumptions.reset(d.source, d.tableau, d.values.fitted)
    fitted = d.judge.fittedvalues
    z = (fitted - fitted.mean()) / fitted.std(ddof=1)
    wide = sm.OLS(d.y, np.column_stack([d.exog, z**2, z**3])).fit()
    if found.p is not None:
        f = ((d.judge.ssr - wide.ssr) / 2) / (wide.ssr / wide.df_resid)
        close(found.statistic, f, 1e-6)
        assert found.df == (2, wide.df_resid)


@pytest.mark.parametrize("seed", SEEDS)
def test_order_checks(seed):
    """Durbin-Watson and Breusch-Godfrey in a shuffled order, as statsmodels gives them on sorted rows."""
    d = drawn(seed)
    order = np.random.default_rng(seed).permutation(d.n).astype(float)
    places = np.argsort(order)
    found = assumptions.durbin_watson(d.values.residual, order, exact=False)
    close(found.statistic, durbin_watson(d.judge.resid[places]))
    sorted_fit = sm.OLS(d.y[places], d.exog[places], hasconst=d.intercept).fit()
    for lags in (1, 3):
        found = assumptions.breusch_godfrey(d.source, d.tableau, d.values.residual, order, lags)
        with warnings.catch_warnings():
            # Its result will be an object in a later version.
            warnings.simplefilter("ignore", FutureWarning)
            lm, p, *_ = acorr_breusch_godfrey(sorted_fit, nlags=lags)
        if d.intercept:
            close([found.statistic, found.p], [lm, p], 1e-6)


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize("errors", ["hc0", "hc1", "hc2", "hc3", "cluster", "autocorrelation"])
def test_robust_errors(seed, errors):
    """Standard errors and p by statsmodels' robust covariances, with t on the same degrees of freedom."""
    d = drawn(seed)
    rng = np.random.default_rng(seed + 1)
    groups = rng.integers(0, 9, size=d.n).astype(float)
    order = rng.permutation(d.n).astype(float)
    found = robust.robust_fit(
        d.fit, d.source, d.tableau, d.values, d.blocks, errors=errors, groups=groups, order=order, lags=2
    )
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        if errors == "cluster":
            judge = d.judge.get_robustcov_results(
                "cluster", groups=groups.astype(int), use_correction=True, use_t=True
            )
        elif errors == "autocorrelation":
            places = np.argsort(order)
            ordered = sm.OLS(d.y[places], d.exog[places], hasconst=d.intercept).fit()
            judge = ordered.get_robustcov_results("HAC", maxlags=2, use_correction=False, use_t=True)
        else:
            judge = d.judge.get_robustcov_results(errors.upper(), use_t=True)
        k = d.x.shape[1] + int(d.intercept)
        block = judge.f_test(np.eye(k + 2)[k:])
    close([c.standard_error for c in found.coefficients], judge.bse, 1e-7)
    close([c.p for c in found.coefficients], judge.pvalues, 1e-5)
    close(found.tests["g"].statistic, block.fvalue, 1e-6)
    assert found.errors == errors
    assert found.r_squared == d.fit.r_squared


@pytest.mark.parametrize("seed", SEEDS)
def test_an_added_column_and_one_left_out(seed):
    """The t of an added column is that of the larger fit; leaving columns out is a fit of its own."""
    d = drawn(seed)
    added = named("added")
    extra = np.random.default_rng(seed + 2).normal(size=d.n)
    source = ArraySource({**d.source.columns, added: extra})
    t, p, df = added_column_test(d.tableau, added, d.moments.extended(source, (added,)))
    judge = sm.OLS(d.y, np.column_stack([d.exog, extra])).fit()
    close([t, p], [judge.tvalues[-1], judge.pvalues[-1]], 1e-6)
    assert df == judge.df_resid
    left = fit_of(d.tableau.without([d.keys[-1], d.keys[0]]), {})
    fresh = fit_of(tableau_of(d.moments, Y, d.keys[1:-1], intercept=d.intercept), {})
    assert [c.estimate for c in left.coefficients] == [c.estimate for c in fresh.coefficients]
    assert [c.standard_error for c in left.coefficients] == [c.standard_error for c in fresh.coefficients]
