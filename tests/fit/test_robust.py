"""Robust standard errors: fractions, published figures, statsmodels, and what cannot be estimated."""

from __future__ import annotations

import math
import warnings

import numpy as np
import pytest
import statsmodels.api as sm
from threadpoolctl import threadpool_limits

from beforehand.fit import linear
from beforehand.fit import moments as moments_module
from beforehand.fit.fitting import fit_of
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.robust import NotEstimable, robust_fit
from beforehand.fit.rows import row_values
from beforehand.fit.tableau import tableau_of

Y = named("y")
KINDS = ("hc0", "hc1", "hc2", "hc3")

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
# fmt: on


class Fitted:
    """A model for ``y``, its robust fits, and statsmodels' fit of the same."""

    def __init__(self, columns, *, intercept=True, blocks=None):
        self.intercept = intercept
        self.names = [name for name in columns if name != "y"]
        self.columns = {name: np.asarray(values, float) for name, values in columns.items()}
        self.source = ArraySource({named(name): values for name, values in self.columns.items()})
        keys = [named(name) for name in self.names]
        self.tableau = tableau_of(moments_of(self.source, [*keys, Y]), Y, keys, intercept=intercept)
        self.blocks = {name: (named(name),) for name in self.names} if blocks is None else blocks
        self.fit = fit_of(self.tableau, self.blocks)
        self.values = row_values(self.source, self.tableau)

    def robust(self, errors, **options):
        """The fit with other errors."""
        return robust_fit(
            self.fit, self.source, self.tableau, self.values, self.blocks, errors=errors, **options
        )

    def judged(self, kind, *, order=None, **options):
        """Statsmodels' fit on scaled columns, with a robust covariance and t tests, and the scales."""
        scale = np.array([np.abs(self.columns[name]).max() for name in self.names])
        x = np.column_stack([self.columns[name] for name in self.names]) / scale
        x = sm.add_constant(x, has_constant="add") if self.intercept else x
        scale = np.concatenate([[1.0], scale]) if self.intercept else scale
        places = np.arange(len(x)) if order is None else np.argsort(order, kind="stable")
        fit = sm.OLS(self.columns["y"][places], x[places], hasconst=self.intercept).fit()
        return fit.get_robustcov_results(kind, use_t=True, **options), scale


def table(seed, n=40, k=3, levels=3, intercept=True):
    """A random table with numbers of unlike size, a category and uneven spread, and its blocks."""
    rng = np.random.default_rng(seed)
    values = rng.normal(size=(n, k)) + rng.normal(size=k)
    columns = {f"x{j}": values[:, j] * 10.0 ** rng.integers(-4, 5) for j in range(k)}
    codes = rng.permutation(np.arange(n) % levels)
    group = [f"g{level}" for level in range(int(intercept), levels)]
    for level, name in enumerate(group, start=int(intercept)):
        columns[name] = (codes == level).astype(float)
    columns["y"] = (
        values @ rng.normal(size=k) * 0.5 + codes / 2 + rng.normal(size=n) * np.exp(0.4 * values[:, 0])
    )
    blocks = {f"x{j}": (named(f"x{j}"),) for j in range(k)} | {"g": tuple(named(name) for name in group)}
    return columns, blocks


def agrees(model, found, judge, scale):
    """Errors, t, p, the test of the category and of the model, as statsmodels has them."""
    close = {"rtol": 1e-8, "atol": 1e-12}
    np.testing.assert_allclose([c.standard_error for c in found.coefficients] * scale, judge.bse, **close)
    np.testing.assert_allclose([c.t for c in found.coefficients], judge.tvalues, rtol=1e-7, atol=1e-9)
    np.testing.assert_allclose([c.p for c in found.coefficients], judge.pvalues, rtol=1e-6)
    which = np.eye(len(scale))[-len(model.blocks["g"]) :]
    # The number of clusters may be below the coefficients: statsmodels warns of the whole covariance.
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        block = judge.f_test(which)
        whole = judge.f_test(np.eye(len(scale))[int(model.intercept) :])
    own = found.tests["g"]
    np.testing.assert_allclose([own.statistic, own.p], np.ravel([block.fvalue, block.pvalue]), rtol=1e-6)
    np.testing.assert_allclose([found.f, found.f_p], np.ravel([whole.fvalue, whole.pvalue]), rtol=1e-5)


# Exact and published values -----------------------------------------------------------------------


@pytest.mark.parametrize(
    ("errors", "constant", "slope"),
    [
        ("hc0", 3242 / 8575, 21158 / 214375),
        ("hc1", 4863 / 8575, 31737 / 214375),
        ("hc2", 47078 / 77959, 354156 / 1948975),
        ("hc3", 6303494139 / 6201638450, 2143420389 / 6201638450),
    ],
)
def test_tiny_set_in_fractions(errors, constant, slope):
    """White's and MacKinnon and White's variances of the tiny set, as the fractions that they are."""
    found = Fitted(TINY).robust(errors)
    np.testing.assert_allclose(
        [c.standard_error**2 for c in found.coefficients], [constant, slope], rtol=1e-14
    )
    assert found.errors == errors
    assert found.df_inference == 4


@pytest.mark.parametrize(
    ("errors", "expected"),
    [
        ("hc0", [6.41164946, 0.158944261, 0.446527689, 0.0864294756]),
        ("hc1", [7.12614996, 0.176656669, 0.496287779, 0.0960609914]),
        ("hc2", [7.55759964, 0.183927517, 0.511843328, 0.101643948]),
        ("hc3", [9.00110511, 0.213421198, 0.588753797, 0.120580229]),
    ],
)
def test_stack_loss(errors, expected):
    """Heteroscedasticity-consistent errors of Brownlee's data, recomputed to nine digits."""
    found = Fitted(STACK_LOSS).robust(errors)
    np.testing.assert_allclose([c.standard_error for c in found.coefficients], expected, rtol=5e-9)


def test_credit_card_expenditure():
    """Greene's table of White's errors (Econometric Analysis), recomputed to nine digits."""
    from statsmodels.datasets import ccard

    data = ccard.load_pandas().data
    names = ["AGE", "OWNRENT", "INCOME", "INCOMESQ"]
    model = Fitted({name: data[name].to_numpy() for name in names} | {"y": data["AVGEXP"].to_numpy()})
    b = [-237.1465136, -3.081814038, 27.94090839, 234.347027, -14.99684418]
    np.testing.assert_allclose([c.estimate for c in model.fit.coefficients], b, rtol=1e-9)
    for errors, expected in {
        "hc0": [212.99053, 3.30166123, 92.1877767, 88.8663517, 6.94456348],
        "hc1": [220.794952, 3.42264107, 95.5657314, 92.1226023, 7.19902694],
        "hc2": [221.088927, 3.4477148, 95.6721114, 92.0836838, 7.19953754],
        "hc3": [229.574348, 3.60462409, 99.3142728, 95.4815987, 7.47634779],
    }.items():
        found = [c.standard_error for c in model.robust(errors).coefficients]
        np.testing.assert_allclose(found, expected, rtol=5e-9)


# Judges -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("errors", KINDS)
def test_uneven_spread_against_statsmodels(errors, intercept):
    """Twenty tables with a category: errors, t, p, Wald F of the block and of the model."""
    for seed in range(20):
        columns, blocks = table(seed, n=20 + seed, k=1 + seed % 4, levels=3 + seed % 2, intercept=intercept)
        model = Fitted(columns, intercept=intercept, blocks=blocks)
        agrees(model, model.robust(errors), *model.judged(errors.upper()))


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("count", [8, 15])
def test_clusters_against_statsmodels(count, intercept):
    """Clusters with the small-sample factor, t and F on the number of clusters less one."""
    for seed in range(12):
        columns, blocks = table(seed, n=50, k=2, intercept=intercept)
        model = Fitted(columns, intercept=intercept, blocks=blocks)
        groups = np.random.default_rng(seed).integers(0, count, size=50).astype(float)
        found = model.robust("cluster", groups=groups * 7 - 3)
        assert found.df_inference == len(set(groups.tolist())) - 1
        agrees(model, found, *model.judged("cluster", groups=groups.astype(int), use_correction=True))


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("lags", [0, 1, 4])
def test_autocorrelation_against_statsmodels(lags, intercept):
    """Newey and West's errors in a shuffled order, Bartlett weights, no small-sample factor."""
    for seed in range(12):
        columns, blocks = table(seed, intercept=intercept)
        model = Fitted(columns, intercept=intercept, blocks=blocks)
        order = np.random.default_rng(seed).permutation(40).astype(float)
        found = model.robust("autocorrelation", order=order, lags=lags)
        agrees(model, found, *model.judged("HAC", order=order, maxlags=lags, use_correction=False))


# Laws ---------------------------------------------------------------------------------------------


def all_kinds(model, groups, order):
    """The fit with each kind of errors."""
    kinds = [model.robust(errors) for errors in KINDS]
    return [
        *kinds,
        model.robust("cluster", groups=groups),
        model.robust("autocorrelation", order=order, lags=3),
    ]


def test_rows_blocks_and_threads_do_not_matter(monkeypatch):
    """Rows in any order, any block size, one thread or two: the same doubles."""
    columns, blocks = table(1, n=300)
    rng = np.random.default_rng(2)
    groups, order = rng.integers(0, 20, size=300).astype(float), rng.permutation(300).astype(float)
    shuffle = rng.permutation(300)
    expected = all_kinds(Fitted(columns, blocks=blocks), groups, order)
    for rows, cells in ((8192, 1 << 17), (50, 1 << 8)):
        monkeypatch.setattr(moments_module, "BLOCK_ROWS", rows)
        monkeypatch.setattr(linear, "BLOCK_CELLS", cells)
        for threads in (1, 2):
            with threadpool_limits(threads):
                assert all_kinds(Fitted(columns, blocks=blocks), groups, order) == expected
                shuffled = Fitted({name: values[shuffle] for name, values in columns.items()}, blocks=blocks)
                assert all_kinds(shuffled, groups[shuffle], order[shuffle]) == expected


def test_only_errors_and_tests_change():
    """Coefficients, sums of squares, R² and the observed effect sizes stay those of the classical fit."""
    columns, blocks = table(3)
    model = Fitted(columns, blocks=blocks)
    for found in all_kinds(model, np.arange(40.0) % 7, np.arange(40.0)):
        assert [c.estimate for c in found.coefficients] == [c.estimate for c in model.fit.coefficients]
        assert [c.key for c in found.coefficients] == [c.key for c in model.fit.coefficients]
        for name in [
            "n",
            "p",
            "df_residual",
            "rss",
            "tss",
            "r_squared",
            "adjusted_r_squared",
            "residual_sd",
            "aic",
            "bic",
        ]:
            assert getattr(found, name) == getattr(model.fit, name)
        assert list(found.tests) == list(blocks)
        for name in blocks:
            assert found.tests[name].partial_f2 == model.fit.tests[name].partial_f2
        own = found.coefficients[1]
        assert (found.tests["x0"].statistic, found.tests["x0"].p) == (abs(own.t), own.p)


def test_units_scale_the_errors():
    """Columns and outcome times powers of two: errors follow, t and p stay."""
    columns, blocks = table(4)
    one = all_kinds(Fitted(columns, blocks=blocks), np.arange(40.0) % 9, np.arange(40.0))
    scaled = {name: np.ldexp(values, 60 - 20 * j) for j, (name, values) in enumerate(columns.items())}
    other = all_kinds(Fitted(scaled, blocks=blocks), np.arange(40.0) % 9, np.arange(40.0))
    for a, b in zip(one, other, strict=True):
        np.testing.assert_allclose([c.t for c in b.coefficients], [c.t for c in a.coefficients], rtol=1e-12)
        assert math.isclose(a.tests["g"].statistic, b.tests["g"].statistic, rel_tol=1e-11)
        assert math.isclose(a.f, b.f, rel_tol=1e-11)


def test_every_row_its_own_cluster():
    """Clusters of one row each are White's errors with the factor G/(G - 1) (n - 1)/(n - p)."""
    columns, blocks = table(5)
    model = Fitted(columns, blocks=blocks)
    found, white = model.robust("cluster", groups=np.arange(40.0)[::-1]), model.robust("hc0")
    factor = math.sqrt(40 / (40 - model.tableau.p))
    for a, b in zip(found.coefficients, white.coefficients, strict=True):
        assert math.isclose(a.standard_error, b.standard_error * factor, rel_tol=1e-13)


def test_no_lags_are_whites_errors():
    """Newey and West without lags is White (1980); more lags than rows are as many as there are."""
    columns, blocks = table(6)
    model = Fitted(columns, blocks=blocks)
    none = model.robust("autocorrelation", order=np.arange(40.0), lags=0)
    white = model.robust("hc0")
    assert [c.standard_error for c in none.coefficients] == [c.standard_error for c in white.coefficients]
    many = model.robust("autocorrelation", order=np.arange(40.0), lags=1000)
    assert all(math.isfinite(c.standard_error) for c in many.coefficients)


def test_errors_keep_their_digits_where_columns_say_nearly_the_same():
    """At a condition number of 1e9 the errors are those of the same model on orthogonal columns."""
    rng = np.random.default_rng(7)
    a, b = rng.normal(size=(2, 40))
    step = np.ldexp(b, -30)
    near = a + step
    # What is stored is a + d with d exact, so that y on (a, near) is y on (a, d).
    columns = {"a": a, "near": near, "y": a + rng.normal(size=40)}
    apart = {"a": a, "near": near - a, "y": columns["y"]}
    for errors in KINDS:
        found = Fitted(columns).robust(errors).coefficients[2]
        expected = Fitted(apart).robust(errors).coefficients[2]
        assert math.isclose(found.standard_error, expected.standard_error, rel_tol=1e-12)
        assert math.isclose(found.t, expected.t, rel_tol=1e-12)


# What cannot be estimated -------------------------------------------------------------------------


def sole():
    """A model with a row of leverage 1."""
    rng = np.random.default_rng(8)
    return Fitted(
        {"x": rng.normal(size=20), "only": (np.arange(20) == 4).astype(float), "y": rng.normal(size=20)}
    )


@pytest.mark.parametrize("errors", ["hc2", "hc3"])
def test_a_row_of_leverage_one(errors):
    """Its residual is 0 of 0: named, where a library gives NaN."""
    with pytest.raises(NotEstimable) as caught:
        sole().robust(errors)
    assert str(caught.value) == "a row of leverage 1 leaves no residual to weigh"
    assert caught.value.code == "not_estimable"


def test_a_row_of_leverage_one_where_residuals_are_not_divided():
    """White's errors of the other columns exist, and are those without the row (hc0 by definition)."""
    model = sole()
    left = Fitted({name: np.delete(values, 4) for name, values in model.columns.items() if name != "only"})
    with_row, without = model.robust("hc0"), left.robust("hc0")
    assert math.isclose(
        with_row.coefficients[1].standard_error, without.coefficients[1].standard_error, rel_tol=1e-12
    )


def test_clusters_that_cannot_be():
    """No column of clusters, or one cluster only."""
    model = Fitted(TINY)
    with pytest.raises(NotEstimable) as caught:
        model.robust("cluster")
    assert str(caught.value) == "no column names the clusters"
    with pytest.raises(NotEstimable) as caught:
        model.robust("cluster", groups=np.full(6, 2.5))
    assert str(caught.value) == "there is one cluster only"


@pytest.mark.parametrize("options", [{}, {"lags": 1}, {"order": np.arange(6.0)}])
def test_autocorrelation_without_an_order(options):
    """Lags need an order of the rows."""
    with pytest.raises(NotEstimable) as caught:
        Fitted(TINY).robust("autocorrelation", **options)
    assert str(caught.value) == "no column gives the order of the rows"


def test_fewer_clusters_than_columns_leave_no_joint_test():
    """The covariance of two clusters has rank one: no Wald F of a block of two, but t tests of each."""
    columns, blocks = table(9)
    found = Fitted(columns, blocks=blocks).robust("cluster", groups=np.arange(40.0) % 2)
    assert (found.tests["g"].statistic, found.tests["g"].p) == (None, None)
    assert (found.f, found.f_p) == (None, None)
    assert found.df_inference == 1
    assert all(c.p is not None for c in found.coefficients)


def test_the_mean_alone():
    """Without predictors there is no F; the error of the mean is robust as well (by definition of hc0)."""
    model = Fitted({"y": TINY["y"]})
    found = model.robust("hc0")
    assert (found.f, found.f_p, found.f_df) == (None, None, (0, 5))
    assert math.isclose(found.coefficients[0].standard_error, math.sqrt(40) / 6, rel_tol=1e-14)


def test_a_predictor_without_columns_has_no_test():
    """A category with one level in these rows stays without a test under every kind of errors."""
    model = Fitted(TINY, blocks={"x": (named("x"),), "g": ()})
    for found in all_kinds(model, np.arange(6.0) % 3, np.arange(6.0)):
        assert (found.tests["g"].statistic, found.tests["g"].p) == (None, None)
        assert found.tests["x"].p is not None
