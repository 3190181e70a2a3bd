"""Assumption checks: fractions, published figures, statsmodels, and what cannot be checked."""

from __future__ import annotations

import math
import warnings

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.stats.diagnostic import acorr_breusch_godfrey, het_breuschpagan, het_white
from statsmodels.stats.stattools import durbin_watson as judged_durbin_watson
from threadpoolctl import threadpool_limits

from beforehand.fit import assumptions
from beforehand.fit import moments as moments_module
from beforehand.fit.columns import Key
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.results import Check
from beforehand.fit.rows import row_values
from beforehand.fit.tableau import tableau_of

Y = named("y")

# x = 0..5, y = 1 3 2 5 4 9: every number an exact fraction (check values, worked out from definitions).
TINY = {"x": [0, 1, 2, 3, 4, 5], "y": [1, 3, 2, 5, 4, 9]}

# fmt: off
# Brownlee (1965), Statistical Theory and Methodology, p. 454: stack loss.
STACK_LOSS = {
    "x1": [80, 80, 75, 62, 62, 62, 62, 62, 58, 58, 58, 58, 58, 58, 50, 50, 50, 50, 50, 56, 70],
    "x2": [27, 27, 25, 24, 22, 23, 24, 24, 23, 18, 18, 17, 18, 19, 18, 18, 19, 19, 20, 20, 20],
    "x3": [89, 88, 90, 87, 87, 87, 93, 93, 87, 80, 89, 88, 82, 93, 89, 86, 72, 79, 80, 82, 91],
    "y": [42, 37, 37, 28, 18, 18, 19, 20, 15, 14, 14, 13, 11, 12, 8, 7, 8, 8, 9, 15, 15],
}
# Anscombe (1973), American Statistician 27:17-21.
ANSCOMBE_X = [10, 8, 13, 9, 11, 14, 6, 4, 12, 7, 5]
ANSCOMBE = {
    1: [8.04, 6.95, 7.58, 8.81, 8.33, 9.96, 7.24, 4.26, 10.84, 4.82, 5.68],
    2: [9.14, 8.14, 8.74, 8.77, 9.26, 8.1, 6.13, 3.1, 9.13, 7.26, 4.74],
    3: [7.46, 6.77, 12.74, 7.11, 7.81, 8.84, 6.08, 5.39, 8.15, 6.42, 5.73],
}
ANSCOMBE_4 = {
    "x": [8, 8, 8, 8, 8, 8, 8, 19, 8, 8, 8],
    "y": [6.58, 5.76, 7.71, 8.84, 8.47, 7.04, 5.25, 12.5, 5.56, 7.91, 6.89],
}
# fmt: on


class Products(ArraySource):
    """Plain columns, products of them, and squares about a centre."""

    def read(self, key, start, stop):
        """Values of a column, a product of columns, or a square of it."""
        if len(key.factors) == 1 and key.centre is None:
            return super().read(key, start, stop)
        product = np.prod([super(Products, self).read(Key((f,)), start, stop) for f in key.factors], axis=0)
        return product if key.centre is None else (product - key.centre) ** 2


class Fitted:
    """A model for ``y`` with its rows, and statsmodels' fit of the same."""

    def __init__(self, columns, names=None, *, intercept=True):
        self.names = [name for name in columns if name != "y"] if names is None else names
        self.keys = tuple(named(name) for name in self.names)
        self.columns = {name: np.asarray(values, float) for name, values in columns.items()}
        self.source = Products({named(name): values for name, values in self.columns.items()})
        self.moments = moments_of(self.source, [*self.keys, Y])
        self.tableau = tableau_of(self.moments, Y, self.keys, intercept=intercept)
        self.values = row_values(self.source, self.tableau)
        x = np.column_stack([self.columns[name] / np.abs(self.columns[name]).max() for name in self.names])
        self.exog = sm.add_constant(x, has_constant="add") if intercept else x
        self.judge = sm.OLS(self.columns["y"], self.exog, hasconst=intercept).fit()

    @property
    def residual(self):
        """Residuals of all rows."""
        return self.values.residual

    def breusch_pagan(self, keys=None):
        """The check on some columns."""
        return assumptions.breusch_pagan(self.source, self.tableau, keys or self.keys, self.residual)

    def white(self):
        """The check in its full form."""
        return assumptions.white(self.source, self.tableau, self.keys, self.residual)

    def reset(self):
        """The check on two powers."""
        return assumptions.reset(self.source, self.tableau, self.values.fitted)

    def breusch_godfrey(self, lags=1, order=None):
        """The check in the order of the rows, or another."""
        order = np.arange(self.tableau.n, dtype=float) if order is None else order
        return assumptions.breusch_godfrey(self.source, self.tableau, self.residual, order, lags)

    def curvature(self, key, centre=0.0):
        """The check on one column's square about a centre."""
        square = Key(key.factors, centre=centre)
        return assumptions.curvature(self.tableau, square, self.moments.extended(self.source, [square]))


def table(seed, n=40, k=3, *, uneven=0.3):
    """A random table: columns of unlike size, residuals whose spread grows with the first."""
    rng = np.random.default_rng(seed)
    values = rng.normal(size=(n, k)) @ (np.eye(k) + 0.3 * rng.normal(size=(k, k))) + rng.normal(size=k)
    noise = rng.standard_t(6, size=n) * np.exp(uneven * values[:, 0])
    columns = {f"x{j}": values[:, j] * 10.0 ** rng.integers(-3, 4) for j in range(k)}
    columns["y"] = values @ rng.normal(size=k) + 0.1 * values[:, 0] ** 2 + noise
    return columns


def is_close(check, statistic, p, df, tolerance=1e-8):
    """Statistic, p and degrees of freedom of a check that was made."""
    assert check.not_applicable == ""
    np.testing.assert_allclose(
        [check.statistic, check.p], [float(statistic), float(p)], rtol=tolerance, atol=1e-12
    )
    assert check.df == df


# Exact and published values -----------------------------------------------------------------------


def test_tiny_set_in_fractions():
    """Koenker's, White's, Breusch and Godfrey's n R² and Durbin and Watson's d, as the fractions they are."""
    model = Fitted(TINY)
    assert math.isclose(model.breusch_pagan().statistic, 703125 / 214211, rel_tol=1e-14)
    assert math.isclose(model.white().statistic, 5693403 / 1713688, rel_tol=1e-14)
    assert math.isclose(model.breusch_godfrey().statistic, 18818 / 4275, rel_tol=1e-14)
    found = assumptions.durbin_watson(model.residual, np.arange(6.0), exact=False)
    assert found == Check(name="durbin_watson", statistic=found.statistic, p=None)
    assert math.isclose(found.statistic, 178 / 63, rel_tol=1e-15)
    jarque_bera = assumptions.jarque_bera(model.residual)
    assert math.isclose(jarque_bera.statistic, 159932731996 / 323277530625, rel_tol=1e-13)


def test_stack_loss():
    """Brownlee's data: the published Durbin-Watson 1.485, and the other checks recomputed."""
    model = Fitted(STACK_LOSS)
    is_close(model.breusch_pagan(), 4.8903677, 0.18000324, (3,), 2e-8)
    is_close(model.white(), 15.028438, 0.090157798, (9,), 4e-8)
    is_close(model.breusch_godfrey(), 0.21632193, 0.64185683, (1,), 3e-8)
    is_close(model.reset(), 1.1728648, 0.33631028, (2, 15), 5e-8)
    found = assumptions.durbin_watson(model.residual, np.arange(21.0), exact=False)
    assert math.isclose(found.statistic, 1.485131034, rel_tol=1e-9)
    is_close(assumptions.jarque_bera(model.residual), 0.14024057, 0.93228167, (2,), 4e-8)


@pytest.mark.parametrize(
    ("number", "reset", "t"), [(1, 0.2491226, -0.7292474), (2, 2154694, -2219.238), (3, 0.2483982, 0.6826806)]
)
def test_anscombe(number, reset, t):
    """The quartet's RESET F(2, 7) and the t of the added square, recomputed from Anscombe (1973)."""
    model = Fitted({"x": ANSCOMBE_X, "y": ANSCOMBE[number]})
    assert math.isclose(model.reset().statistic, reset, rel_tol=3e-7)
    for centre in (0.0, 9.0, -1e3):
        found = model.curvature(named("x"), centre)
        assert math.isclose(found.statistic, t, rel_tol=3e-7)
        assert found.df == (8,)


def test_anscombe_with_two_distinct_values():
    """Set IV has two values of x: neither its square nor powers of the fitted values can be added."""
    model = Fitted(ANSCOMBE_4)
    assert model.curvature(named("x")) == Check(
        name="curvature", statistic=None, p=None,
        not_applicable="its square is a combination of the columns in the model",
    )  # fmt: skip
    assert model.reset() == Check(
        name="reset", statistic=None, p=None,
        not_applicable="powers of the fitted values are combinations of the columns in the model",
    )  # fmt: skip


# Judges -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(30))
def test_spread_against_statsmodels(seed):
    """Koenker's form of Breusch-Pagan on all and on some columns, and White's full form."""
    model = Fitted(table(seed, n=25 + seed, k=1 + seed % 4))
    lm, p, *_ = het_breuschpagan(model.judge.resid, model.exog)
    k = len(model.names)
    is_close(model.breusch_pagan(), lm, p, (k,))
    lm, p, *_ = het_breuschpagan(model.judge.resid, model.exog[:, [0, k]])
    is_close(model.breusch_pagan(model.keys[-1:]), lm, p, (1,))
    lm, p, *_ = het_white(model.judge.resid, model.exog)
    is_close(model.white(), lm, p, (k * (k + 3) // 2,))


@pytest.mark.parametrize("seed", range(10))
def test_white_with_indicators_leaves_out_what_repeats(seed):
    """The square of an indicator is itself: degrees of freedom are the rank less one (numpy's rank)."""
    columns = table(seed)
    codes = np.random.default_rng(seed).permutation(np.arange(40) % 3)
    columns |= {"g1": (codes == 1).astype(float), "g2": (codes == 2).astype(float)}
    model = Fitted(columns, ["x0", "x1", "g1", "g2"])
    x = model.exog
    wide = np.column_stack([x[:, i] * x[:, j] for i in range(5) for j in range(i, 5)])
    squared = model.judge.resid**2
    rank = np.linalg.matrix_rank(wide)
    rest = squared - wide @ np.linalg.lstsq(wide, squared, rcond=None)[0]
    statistic = 40 * (1 - (rest**2).sum() / ((squared - squared.mean()) ** 2).sum())
    found = model.white()
    assert found.df == (rank - 1,) == (11,)
    assert math.isclose(found.statistic, statistic, rel_tol=1e-8)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("seed", range(12))
def test_reset_against_an_explicit_f(seed, intercept):
    """F of the square and cube of the centred and scaled fitted values, by two OLS fits."""
    model = Fitted(table(seed, n=25 + seed), intercept=intercept)
    z = model.judge.fittedvalues
    z = (z - z.mean()) / z.std()
    wide = sm.OLS(model.columns["y"], np.column_stack([model.exog, z**2, z**3])).fit()
    f = ((model.judge.ssr - wide.ssr) / 2) / (wide.ssr / wide.df_resid)
    p = wide.f_test(np.eye(len(wide.params))[-2:]).pvalue
    is_close(model.reset(), f, p, (2, int(wide.df_resid)))


def test_reset_far_from_zero():
    """A mean a million times the spread does not make the powers collinear: the same F."""
    columns = table(40, k=1)
    columns["y"] = np.round(columns["y"] * 2.0**10) / 2.0**10
    near = Fitted(columns).reset()
    far = Fitted(columns | {"y": columns["y"] + 2.0**20}).reset()
    assert math.isclose(far.statistic, near.statistic, rel_tol=1e-8)


@pytest.mark.parametrize("seed", range(12))
def test_order_against_statsmodels(seed):
    """Durbin-Watson and Breusch-Godfrey in a shuffled order, as statsmodels on rows sorted by it."""
    model = Fitted(table(seed, n=30 + seed))
    order = np.random.default_rng(seed).permutation(model.tableau.n).astype(float)
    places = np.argsort(order)
    found = assumptions.durbin_watson(model.residual, order, exact=False)
    assert math.isclose(found.statistic, judged_durbin_watson(model.judge.resid[places]), rel_tol=1e-10)
    judge = sm.OLS(model.columns["y"][places], model.exog[places]).fit()
    for lags in (1, 2, 5):
        with warnings.catch_warnings():
            # Its result will be an object in a later version.
            warnings.simplefilter("ignore", FutureWarning)
            lm, p, *_ = acorr_breusch_godfrey(judge, nlags=lags)
        is_close(model.breusch_godfrey(lags, order), lm, p, (lags,))


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("seed", range(8))
def test_curvature_against_a_larger_fit(seed, intercept):
    """The t of the square, added to the model, by statsmodels; in a model without intercept as centred."""
    model = Fitted(table(seed), intercept=intercept)
    centre = float(model.columns["x1"].mean())
    square = (model.columns["x1"] - centre) ** 2
    wide = sm.OLS(model.columns["y"], np.column_stack([model.exog, square / square.max()])).fit()
    is_close(model.curvature(named("x1"), centre), wide.tvalues[-1], wide.pvalues[-1], (int(wide.df_resid),))


# Laws ---------------------------------------------------------------------------------------------


def checks_of(model, order):
    """All checks of a model."""
    return (
        model.breusch_pagan(), model.white(), model.reset(), model.breusch_godfrey(2, order),
        assumptions.durbin_watson(model.residual, order, exact=False), model.curvature(named("x0"), 0.5),
    )  # fmt: skip


def test_rows_blocks_and_threads_do_not_matter(monkeypatch):
    """Rows in any order, any block size, one thread or two: the same doubles."""
    columns = table(50, n=400)
    order = np.random.default_rng(2).permutation(400).astype(float)
    expected = checks_of(Fitted(columns), order)
    shuffle = np.random.default_rng(3).permutation(400)
    for rows in (8192, 33):
        monkeypatch.setattr(moments_module, "BLOCK_ROWS", rows)
        for threads in (1, 2):
            with threadpool_limits(threads):
                assert checks_of(Fitted(columns), order) == expected
                shuffled = Fitted({name: values[shuffle] for name, values in columns.items()})
                assert checks_of(shuffled, order[shuffle]) == expected


def test_units_do_not_matter():
    """Predictors and outcome times powers of two, however large: the same checks to twelve digits."""
    columns = table(51)
    order = np.arange(40.0)
    expected = checks_of(Fitted(columns), order)
    for power in (-200, 200):
        scaled = {name: np.ldexp(values, power) for name, values in columns.items()}
        model = Fitted(scaled)
        found = (model.breusch_pagan(), model.white(), model.reset(), model.breusch_godfrey(2, order))
        for one, other in zip(found, expected, strict=False):
            assert math.isclose(one.statistic, other.statistic, rel_tol=1e-12)


def test_equal_ranks_keep_the_order_of_the_rows():
    """Rows with the same place in the order follow each other as they stand."""
    model = Fitted(table(52))
    ties = np.repeat(np.arange(20.0), 2)
    assert model.breusch_godfrey(2, ties) == model.breusch_godfrey(2)
    same = assumptions.durbin_watson(model.residual, ties, exact=False)
    assert same == assumptions.durbin_watson(model.residual, np.arange(40.0), exact=False)


def test_breusch_pagan_finds_a_spread_that_grows():
    """Residuals whose spread grows with a column are found, even ones are not."""
    assert Fitted(table(53, n=300, uneven=0.6)).breusch_pagan().p < 1e-3
    rng = np.random.default_rng(54)
    x = rng.normal(size=300)
    assert Fitted({"x": x, "y": x + rng.normal(size=300)}).breusch_pagan().p > 0.05


# What cannot be checked ---------------------------------------------------------------------------


def not_made(name, reason):
    """A check with the reason why it was not made."""
    return Check(name=name, statistic=None, p=None, not_applicable=reason)


def test_an_exact_fit_has_nothing_to_check():
    """Residuals of rounding only: every check says so."""
    x = np.arange(12.0)
    model = Fitted({"x": x, "y": 0.1 * x + 3})
    reason = "the fit is exact: its residuals are rounding only"
    assert model.breusch_pagan() == not_made("breusch_pagan", reason)
    assert model.white() == not_made("white", reason)
    assert model.reset() == not_made("reset", reason)
    assert model.breusch_godfrey() == not_made("breusch_godfrey", reason)
    assert model.curvature(named("x")) == not_made("curvature", reason)
    found = assumptions.durbin_watson(model.residual, x, exact=True)
    assert found == not_made("durbin_watson", reason)
    assert assumptions.jarque_bera(model.residual, exact=True) == not_made("jarque_bera", reason)
    assert assumptions.shapiro_wilk(model.residual, exact=True) == not_made("shapiro_wilk", reason)


def test_equal_squared_residuals():
    """Residuals of one size in both directions have no spread to explain."""
    model = Fitted({"x": [-1.0, -1, 1, 1], "y": [-2.0, 0, 0, 2]})
    assert model.breusch_pagan() == not_made("breusch_pagan", "all squared residuals are equal")


def test_columns_that_say_nothing_about_the_spread():
    """A constant as the only column leaves no auxiliary regression."""
    columns = {"one": np.ones(8), "x": np.arange(8.0), "y": [1.0, 3, 2, 5, 4, 9, 6, 7]}
    model = Fitted(columns, ["one", "x"], intercept=False)
    expected = not_made("breusch_pagan", "its auxiliary regression has no column left")
    assert model.breusch_pagan((named("one"),)) == expected


def test_white_with_too_few_rows_or_too_many_columns():
    """The full form says how many columns it needs."""
    columns = table(55, n=10, k=3)
    assert Fitted(columns).white() == not_made("white", "it needs 9 columns and there are 10 rows")
    columns = table(56, n=200, k=15)
    assert Fitted(columns).white() == not_made("white", "it needs 135 columns, more than 120")


def test_reset_without_degrees_of_freedom():
    """Two more columns must leave a degree of freedom."""
    model = Fitted({"x": [1.0, 2, 3, 5], "y": [1.0, 3, 2, 9]})
    assert model.reset() == not_made("reset", "it needs 5 rows and there are 4")


def test_reset_of_the_mean_alone():
    """The fitted values of a mean have no powers."""
    source = ArraySource({Y: np.array([1.0, 3, 2, 5, 4, 9])})
    tableau = tableau_of(moments_of(source, [Y]), Y, [], intercept=True)
    found = assumptions.reset(source, tableau, row_values(source, tableau).fitted)
    assert found == not_made("reset", "the fitted values are constant")


def test_more_lags_than_degrees_of_freedom():
    """Lags that leave no degree of freedom, however many, are refused with their number."""
    model = Fitted(TINY)
    for lags in (4, 6, 50):
        expected = not_made("breusch_godfrey", f"{lags} lags leave no degree of freedom")
        assert model.breusch_godfrey(lags) == expected


def test_lagged_residuals_within_the_model():
    """Residuals before that are a column of the model add nothing."""
    y = np.array([0.0, 3, -3, 0, 2, -2, 0, 0])
    rng = np.random.default_rng(57)
    x = rng.normal(size=8)
    first = Fitted({"x": x, "y": y})
    before = np.concatenate([[0.0], first.residual[:-1]])
    source = Products({named("x"): x, named("before"): before, Y: y})
    wide = tableau_of(
        moments_of(source, [named("x"), named("before"), Y]), Y, [named("x"), named("before")], intercept=True
    )
    found = assumptions.breusch_godfrey(source, wide, first.residual, np.arange(8.0), 1)
    assert found == not_made(
        "breusch_godfrey", "the lagged residuals are combinations of the columns in the model"
    )
