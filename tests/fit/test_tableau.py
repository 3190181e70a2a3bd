"""The swept tableau: fractions, 80-digit arithmetic and statsmodels as judges; laws of scale and order."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest
import statsmodels.api as sm
from threadpoolctl import threadpool_limits

from beforehand.fit import moments as moments_module
from beforehand.fit.columns import Factor, Key
from beforehand.fit.fitting import Unrepresentable, fit_of
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.sweeping import RankDeficient
from beforehand.fit.tableau import added_column_test, tableau_of

Y = named("y")

# x = 0..5, y = 1 3 2 5 4 9: every number an exact fraction (check values, worked out from definitions).
TINY = {"x": [0, 1, 2, 3, 4, 5], "y": [1, 3, 2, 5, 4, 9]}

# fmt: off
# Woods, Steinour & Starke (1932), Ind. Eng. Chem. 24:1207-1214: heat of hardening cement.
HALD = {
    "x1": [7, 1, 11, 11, 7, 11, 3, 1, 2, 21, 1, 11, 10],
    "x2": [26, 29, 56, 31, 52, 55, 71, 31, 54, 47, 40, 66, 68],
    "x3": [6, 15, 8, 8, 6, 9, 17, 22, 18, 4, 23, 9, 8],
    "x4": [60, 52, 20, 47, 33, 22, 6, 44, 22, 26, 34, 12, 12],
    "y": [78.5, 74.3, 104.3, 87.6, 95.9, 109.2, 102.7, 72.5, 93.1, 115.9, 83.8, 113.3, 109.4],
}
# fmt: on


def held(columns):
    """Moments of plain arrays, by name."""
    arrays = {named(name): np.asarray(values, float) for name, values in columns.items()}
    return moments_of(ArraySource(arrays), list(arrays))


def swept(columns, names, *, intercept=True):
    """A model of some of the columns for ``y``."""
    return tableau_of(held(columns), Y, [named(name) for name in names], intercept=intercept)


def fitted(columns, names, *, intercept=True):
    """Its fit, each column a predictor."""
    return fit_of(swept(columns, names, intercept=intercept), {name: (named(name),) for name in names})


def estimates(fit):
    """Coefficients as a list."""
    return [c.estimate for c in fit.coefficients]


def errors(fit):
    """Standard errors as a list."""
    return [c.standard_error for c in fit.coefficients]


def solved(columns, names, *, intercept):
    """Coefficients, standard errors and error variance of the stored doubles, by fractions to the end."""
    stored = [[Fraction(float(columns[name][row])) for name in names] for row in range(len(columns["y"]))]
    x = [[Fraction(1), *row] if intercept else row for row in stored]
    y = [Fraction(float(value)) for value in columns["y"]]
    p = len(x[0])
    # Gauss and Jordan on the cross-products, with the outcome and the identity beside them.
    rows = [
        [
            *(sum(row[i] * row[j] for row in x) for j in range(p)),
            sum(row[i] * v for row, v in zip(x, y, strict=True)),
        ]
        + [Fraction(int(i == j)) for j in range(p)]
        for i in range(p)
    ]
    for k in range(p):
        rows[k] = [value / rows[k][k] for value in rows[k]]
        for i in range(p):
            if i != k:
                rows[i] = [a - rows[i][k] * b for a, b in zip(rows[i], rows[k], strict=True)]
    b = [row[p] for row in rows]
    rest = [v - sum(c * d for c, d in zip(b, row, strict=True)) for row, v in zip(x, y, strict=True)]
    s2 = sum(e * e for e in rest) / (len(y) - p)
    return [float(v) for v in b], [root(s2 * rows[k][p + 1 + k]) for k in range(p)], float(s2)


def root(value):
    """Square root of a fraction, as a double."""
    with mpmath.workdps(60):
        return float(mpmath.sqrt(mpmath.mpf(value.numerator) / value.denominator))


def digits(found, expected):
    """Fewest correct significant digits over lists of numbers."""
    worst = max(abs(a - e) / abs(e) for a, e in zip(found, expected, strict=True))
    return 16.0 if worst == 0 else -math.log10(worst)


def table(seed, n=40, k=4):
    """A random table with columns of unlike size."""
    rng = np.random.default_rng(seed)
    values = (
        rng.normal(size=(n, k)) @ (np.eye(k) + 0.3 * rng.normal(size=(k, k))) + rng.normal(size=k)
    ) * 10.0 ** rng.integers(-4, 5, size=k)
    columns = {f"x{j}": values[:, j] for j in range(k)}
    columns["y"] = (values / values.std(axis=0)) @ rng.normal(size=k) + rng.normal(size=n) + 3
    return columns


# Exact and published values -----------------------------------------------------------------------


def test_tiny_set_in_fractions():
    """Coefficients, sums of squares and covariance of the tiny set, as the fractions that they are."""
    tableau = swept(TINY, ["x"])
    fit = fit_of(tableau, {"x": (named("x"),)})
    assert float(tableau.slope(0)) == 46 / 35
    assert estimates(fit) == [5 / 7, 46 / 35]
    assert (fit.rss, fit.tss, fit.df_residual, fit.n, fit.p) == (342 / 35, 40.0, 4, 6, 2)
    assert digits([fit.residual_sd**2], [171 / 70]) >= 15
    assert digits([e**2 for e in errors(fit)], [627 / 490, 171 / 1225]) >= 15
    assert digits([fit.r_squared, fit.adjusted_r_squared], [1 - 342 / 1400, 1 - (342 / 140) / 8]) >= 15
    assert digits([fit.f], [(40 - 342 / 35) / (171 / 70)]) >= 15
    assert fit.f_df == (1, 4)
    assert digits([fit.tests["x"].partial_f2], [(40 - 342 / 35) / (342 / 35)]) >= 15


@pytest.mark.parametrize(
    ("names", "b", "se", "p", "r_squared", "sd"),
    [
        (
            ["x1", "x2", "x3", "x4"],
            [62.4053693, 1.551102648, 0.5101675797, 0.1019094036, -0.1440610291],
            [70.07095921, 0.7447698671, 0.7237880018, 0.7547090451, 0.7090520634],
            [0.3991336, 0.07082169, 0.5009011, 0.8959227, 0.8440715],
            0.9823756204,
            2.446007956,
        ),
        (
            ["x1", "x2"],
            [52.57734888, 1.468305742, 0.6622504913],
            [2.28617433, 0.121300924, 0.0458547215],
            None,
            0.9786783745,
            2.40633504,
        ),
    ],
)
def test_cement_data(names, b, se, p, r_squared, sd):
    """Hald (1952); Draper & Smith, Applied Regression Analysis, app. B, recomputed to ten digits."""
    fit = fitted(HALD, names)
    np.testing.assert_allclose(estimates(fit), b, rtol=1e-8)
    np.testing.assert_allclose(errors(fit), se, rtol=1e-8)
    if p is not None:
        np.testing.assert_allclose([c.p for c in fit.coefficients], p, rtol=1e-6)
    np.testing.assert_allclose([fit.r_squared, fit.residual_sd], [r_squared, sd], rtol=1e-8)


def test_backward_elimination_of_the_cement_data():
    """The weakest, x3 (p .896), leaves first, then x4 (p .205): Draper & Smith, by sweeping columns out."""
    tableau = swept(HALD, ["x1", "x2", "x3", "x4"])
    blocks = {name: (named(name),) for name in ("x1", "x2", "x3", "x4")}
    first = fit_of(tableau, blocks).tests
    assert max(first, key=lambda name: first[name].p) == "x3"
    np.testing.assert_allclose([first["x3"].statistic, first["x3"].p], [0.1350314, 0.8959227], rtol=1e-6)
    del blocks["x3"]
    second = fit_of(tableau.without([named("x3")]), blocks).tests
    assert max(second, key=lambda name: second[name].p) == "x4"
    np.testing.assert_allclose([second["x4"].statistic, second["x4"].p], [1.365014, 0.2053954], rtol=1e-6)


# Precision ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("seed", range(5))
def test_twelve_digits_at_a_condition_number_of_ten_billion(seed, intercept):
    """Columns of unit length with condition number above 1e10, then of unlike size (80-digit arithmetic)."""
    rng = np.random.default_rng(seed)
    n, p = 30, 5
    shared = rng.normal(size=n)
    values = rng.normal(size=(n, p))
    # The last columns are the first ones and a ten-billionth of something new.
    values[:, 3] = values[:, 0] - 0.5 * values[:, 1] + 1e-10 * shared
    values[:, 4] = values[:, 2] + 1e-6 * values[:, 4]
    unit = values / np.linalg.norm(values, axis=0)
    assert np.linalg.cond(unit) > 1e10
    values = values * 10.0 ** rng.integers(-6, 7, size=p)
    columns = {f"x{j}": values[:, j] for j in range(p)}
    columns["y"] = unit @ rng.normal(size=p) + 1e-2 * rng.normal(size=n)
    fit = fitted(columns, [f"x{j}" for j in range(p)], intercept=intercept)
    b, se, s2 = solved(columns, [f"x{j}" for j in range(p)], intercept=intercept)
    assert digits(estimates(fit), b) >= 12
    assert digits(errors(fit), se) >= 12
    assert digits([fit.residual_sd**2], [s2]) >= 12


def test_columns_far_from_zero_keep_their_digits():
    """A mean ten billion times the spread costs nothing (80-digit arithmetic)."""
    rng = np.random.default_rng(3)
    x = 1e10 + rng.normal(size=25)
    columns = {"x": x, "y": 5e9 + 2 * (x - 1e10) + rng.normal(size=25)}
    fit = fitted(columns, ["x"])
    b, se, _ = solved(columns, ["x"], intercept=True)
    assert digits(estimates(fit), b) >= 14
    assert digits(errors(fit), se) >= 14


@pytest.mark.parametrize("size", [1e-140, 1e-30, 1e30, 1e140])
@pytest.mark.parametrize("outcome", [1e-140, 1.0, 1e140])
def test_tiny_and_huge_columns(size, outcome):
    """Columns and outcomes of extreme size give the coefficients of their ratio (80-digit arithmetic)."""
    rng = np.random.default_rng(4)
    columns = {"x": rng.normal(size=20) * size, "z": rng.normal(size=20)}
    columns["y"] = rng.normal(size=20) * outcome
    fit = fitted(columns, ["x", "z"])
    b, se, _ = solved(columns, ["x", "z"], intercept=True)
    assert digits(estimates(fit), b) >= 14
    assert digits(errors(fit), se) >= 14


@pytest.mark.parametrize(
    ("x", "y"),
    [
        ([1.0, 2, 3, 5], [1e200, 3e200, 2e200, 9e200]),
        ([1.0, 2, 3, 5], [1e-200, 3e-200, 2e-200, 9e-200]),
        ([1e-320, 2e-320, 3e-320, 5e-320], [1.0, 3, 2, 9]),
        ([1e300, 2e300, 3e300, 5e300], [1e-20, 3e-20, 2e-20, 9e-20]),
    ],
)
def test_numbers_beyond_the_doubles_are_a_fault(x, y):
    """Sums of squares or slopes that no double holds are named as such, not turned into inf or 0."""
    with pytest.raises(Unrepresentable) as caught:
        fitted({"x": x, "y": y}, "x")
    assert str(caught.value) == (
        "a number of this fit is too large or too small for a double; other units of the columns help"
    )
    assert caught.value.code == "unrepresentable"


def test_subnormal_and_largest_predictors():
    """Predictors of 1e-321 and 1e290 beside each other, by statsmodels after scaling by powers of two."""
    rng = np.random.default_rng(5)
    small, large = np.ldexp(1.0 * rng.integers(1, 1000, size=20), -1074), rng.normal(size=20) * 1e290
    columns = {"small": small, "large": large, "y": rng.normal(size=20) * 2.0**-50}
    fit = fitted(columns, ["small", "large"])
    design = sm.add_constant(np.column_stack([np.ldexp(small, 1065), large * 2.0**-1000]))
    judge = sm.OLS(columns["y"] * 2.0**50, design).fit()
    found = [c.t for c in fit.coefficients]
    np.testing.assert_allclose(found, judge.tvalues, rtol=1e-9)
    np.testing.assert_allclose([c.p for c in fit.coefficients], judge.pvalues, rtol=1e-9)


def test_two_hundred_tables_against_statsmodels():
    """Fits with and without an intercept, with categories as blocks of indicators, as statsmodels' OLS."""
    rng = np.random.default_rng(20)
    for number in range(200):
        n, k, levels = int(rng.integers(14, 60)), int(rng.integers(1, 5)), int(rng.integers(2, 5))
        intercept = bool(number % 3)
        columns = table(int(rng.integers(1 << 30)), n, k)
        codes = rng.permutation(np.arange(n) % levels)
        # Without an intercept a category keeps all its levels.
        for level in range(int(intercept), levels):
            columns[f"g{level}"] = (codes == level).astype(float)
        names = [name for name in columns if name != "y"]
        blocks = {name: (named(name),) for name in names if name[0] == "x"}
        blocks["g"] = tuple(named(name) for name in names if name[0] == "g")
        fit = fit_of(swept(columns, names, intercept=intercept), blocks)
        scale = np.array([np.abs(columns[name]).max() for name in names])
        x = np.column_stack([columns[name] for name in names]) / scale
        x = np.column_stack([np.ones(n), x]) if intercept else x
        scale = np.concatenate([[1.0], scale]) if intercept else scale
        judge = sm.OLS(columns["y"], x, hasconst=intercept).fit()
        close = {"rtol": 1e-8, "atol": 1e-12}
        np.testing.assert_allclose(np.array(estimates(fit)) * scale, judge.params, **close)
        np.testing.assert_allclose(np.array(errors(fit)) * scale, judge.bse, **close)
        np.testing.assert_allclose([c.t for c in fit.coefficients], judge.tvalues, rtol=1e-7, atol=1e-10)
        np.testing.assert_allclose([c.p for c in fit.coefficients], judge.pvalues, rtol=1e-6)
        sums = [fit.rss, fit.tss, fit.r_squared, fit.adjusted_r_squared, fit.f, fit.aic, fit.bic]
        tss = judge.centered_tss if intercept else judge.uncentered_tss
        theirs = [judge.ssr, tss, judge.rsquared, judge.rsquared_adj, judge.fvalue, judge.aic, judge.bic]
        np.testing.assert_allclose(sums, theirs, **close)
        np.testing.assert_allclose(fit.f_p, judge.f_pvalue, rtol=1e-6)
        which = np.eye(x.shape[1])[-len(blocks["g"]) :]
        block = judge.f_test(which)
        own = fit.tests["g"]
        assert own.df == len(blocks["g"])
        statistic = own.statistic if own.df > 1 else own.statistic**2
        np.testing.assert_allclose([statistic, own.p], [float(block.fvalue), float(block.pvalue)], rtol=1e-6)
        np.testing.assert_allclose(own.partial_f2, block.fvalue * own.df / judge.df_resid, rtol=1e-7)


# Laws ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("intercept", [True, False])
def test_rows_blocks_and_threads_do_not_matter(monkeypatch, intercept):
    """Rows in any order, any block size, one thread or two: every number of the fit is the same double."""
    columns = table(6, n=700, k=5)
    names = [f"x{j}" for j in range(5)]
    expected = fitted(columns, names, intercept=intercept)
    order = np.random.default_rng(1).permutation(700)
    for rows, threads in itertools.product((8192, 64, 7), (1, 2)):
        monkeypatch.setattr(moments_module, "BLOCK_ROWS", rows)
        with threadpool_limits(threads):
            assert fitted(columns, names, intercept=intercept) == expected
            assert fitted({k: v[order] for k, v in columns.items()}, names, intercept=intercept) == expected


@pytest.mark.parametrize("seed", range(4))
def test_column_order_does_not_matter(seed):
    """Columns in any order give the same doubles, each beside its own column."""
    columns = table(seed, k=4)
    names = [f"x{j}" for j in range(4)]
    expected = {c.key: c for c in fitted(columns, names).coefficients}
    fits = [fitted(columns, order) for order in itertools.permutations(names)]
    for fit in fits:
        assert {c.key: c for c in fit.coefficients} == expected
        assert (fit.rss, fit.r_squared, fit.f) == (fits[0].rss, fits[0].r_squared, fits[0].f)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("power", [-500, -7, 3, 400])
def test_a_power_of_two_scales_the_coefficient_exactly(intercept, power):
    """A column times 2^k: coefficient and error over 2^k, every other number the same double."""
    columns = table(8)
    names = [f"x{j}" for j in range(4)]
    one = fitted(columns, names, intercept=intercept)
    other = fitted(columns | {"x2": np.ldexp(columns["x2"], power)}, names, intercept=intercept)
    for a, b in zip(one.coefficients, other.coefficients, strict=True):
        down = -power if a.key == named("x2") else 0
        assert b.estimate == math.ldexp(a.estimate, down)
        assert b.standard_error == math.ldexp(a.standard_error, down)
        assert math.isclose(b.t, a.t, rel_tol=1e-15)
        assert math.isclose(b.p, a.p, rel_tol=1e-13)
    assert (one.rss, one.r_squared, one.f, one.aic) == (other.rss, other.r_squared, other.f, other.aic)


def test_a_change_of_unit_scales_the_coefficient():
    """A column of whole numbers times 1000: coefficient and error over 1000, t and p unmoved."""
    columns = table(9)
    columns["x1"] = np.round(columns["x1"] / np.abs(columns["x1"]).max() * 1000)
    names = [f"x{j}" for j in range(4)]
    one, other = fitted(columns, names), fitted(columns | {"x1": columns["x1"] * 1000}, names)
    for a, b in zip(one.coefficients, other.coefficients, strict=True):
        unit = 1000 if a.key == named("x1") else 1
        assert math.isclose(b.estimate * unit, a.estimate, rel_tol=1e-15)
        assert math.isclose(b.standard_error * unit, a.standard_error, rel_tol=1e-15)
        assert math.isclose(b.t, a.t, rel_tol=1e-15)
    assert (one.rss, one.r_squared, one.f) == (other.rss, other.r_squared, other.f)


def test_a_shift_moves_the_intercept_only():
    """Adding 2^20 to a column of whole numbers changes no slope and no test."""
    columns = table(10)
    columns["x1"] = np.round(columns["x1"] / np.abs(columns["x1"]).max() * 1000)
    names = [f"x{j}" for j in range(4)]
    one, other = fitted(columns, names), fitted(columns | {"x1": columns["x1"] + 2.0**20}, names)
    assert estimates(one)[1:] == estimates(other)[1:]
    assert errors(one)[1:] == errors(other)[1:]
    moved = estimates(one)[0] - estimates(one)[2] * 2.0**20
    assert math.isclose(estimates(other)[0], moved, rel_tol=1e-12)


def test_predictors_of_one_column_are_tested_by_t_and_blocks_by_f():
    """The partial F of a block of one column is t squared; names follow the blocks given."""
    columns = table(11)
    tableau = swept(columns, [f"x{j}" for j in range(4)])
    fit = fit_of(tableau, {"a": (named("x0"),), "b": (named("x1"), named("x2"))})
    assert list(fit.tests) == ["a", "b"]
    own = fit.coefficients[1]
    assert (fit.tests["a"].statistic, fit.tests["a"].p) == (abs(own.t), own.p)
    assert math.isclose(fit.tests["a"].partial_f2 * tableau.df, own.t**2, rel_tol=1e-14)
    without = fit_of(tableau.without([named("x1"), named("x2")]), {})
    expected = (without.rss - fit.rss) / 2 / (fit.rss / tableau.df)
    assert math.isclose(fit.tests["b"].statistic, expected, rel_tol=1e-12)


@pytest.mark.parametrize("intercept", [True, False])
def test_leaving_columns_out_is_a_tableau_of_the_others(intercept):
    """Swept out in any order: the matrix of a fresh tableau to 1e-25 of its size."""
    columns = table(12, k=6)
    moments = held(columns)
    keys = [named(f"x{j}") for j in range(6)]
    whole = tableau_of(moments, Y, keys, intercept=intercept)
    for gone in ([0], [5], [2, 4], [4, 2], [1, 3, 5, 0]):
        left = whole.without([keys[j] for j in gone])
        fresh = tableau_of(
            moments, Y, [key for j, key in enumerate(keys) if j not in gone], intercept=intercept
        )
        assert (left.keys, left.shifts, left.total, left.df) == (
            fresh.keys,
            fresh.shifts,
            fresh.total,
            fresh.df,
        )
        for a, b in zip(left.matrix.ravel().tolist(), fresh.matrix.ravel().tolist(), strict=True):
            assert abs(a - b) <= abs(b) * Fraction(1, 10**25) + (1 << 40)
        assert whole.without([]).matrix.tolist() == whole.matrix.tolist()


def test_gain_is_what_leaving_columns_out_costs():
    """The gain of a block is the difference of two residual sums of squares (by two fits)."""
    columns = table(13, k=5)
    whole = swept(columns, [f"x{j}" for j in range(5)])
    some = [named("x1"), named("x4")]
    cost = whole.without(some).rss - whole.rss
    found = Fraction(whole.gain(some), int(whole.matrix[-1, -1])) * whole.rss
    assert abs(found / cost - 1) < Fraction(1, 10**25)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("seed", range(8))
def test_an_added_column_is_tested_as_in_a_fresh_fit(seed, intercept):
    """The t, p and degrees of freedom of one column more, of any size, equal those of the larger fit."""
    columns = table(seed, k=4)
    columns["x3"] = columns["x3"] * 10.0 ** (seed * 7 - 20)
    moments = held(columns)
    keys = [named(f"x{j}") for j in range(4)]
    t, p, df = added_column_test(tableau_of(moments, Y, keys[:3], intercept=intercept), keys[3])
    last = fit_of(tableau_of(moments, Y, keys, intercept=intercept), {}).coefficients[-1]
    assert math.isclose(t, last.t, rel_tol=1e-14)
    assert math.isclose(p, last.p, rel_tol=1e-12)
    assert df == 40 - 4 - int(intercept)


def test_an_added_column_to_the_mean_alone():
    """Added to no column at all, the test is that of a simple regression."""
    columns = table(14, k=1)
    t, p, df = added_column_test(swept(columns, []), named("x0"))
    own = fitted(columns, ["x0"]).coefficients[-1]
    assert math.isclose(t, own.t, rel_tol=1e-14)
    assert (df, math.isclose(p, own.p, rel_tol=1e-12)) == (38, True)


def test_added_columns_that_cannot_be_tested():
    """A combination of the others, a constant, a column that leaves no residual, no row left: None."""
    x, y = np.arange(6.0), np.array([1.0, 3, 2, 5, 4, 9])
    columns = {"x": x, "twice": 2 * x + 1, "same": np.full(6, 0.1), "y": y, "rest": y - x}
    tableau = swept(columns, ["x"])
    for name in ("twice", "same", "rest"):
        assert added_column_test(tableau, named(name)) is None
    three = {name: values[:3] for name, values in columns.items()} | {"z": np.array([1.0, 0, 0])}
    assert added_column_test(swept(three, ["x"]), named("z")) is None
    assert added_column_test(swept({"x": x, "y": 2 * x, "z": y}, ["x"]), named("z")) is None


# Dependent and nearly dependent columns ------------------------------------------------------------


def test_a_dependent_model_cannot_be_swept_in():
    """The fault names the place of the column."""
    x = np.arange(6.0)
    with pytest.raises(RankDeficient) as caught:
        swept({"x": x, "z": 3 * x - 1, "y": x**2}, ["x", "z"])
    assert str(caught.value) == "column 2 of the model is an exact combination of the others"
    assert caught.value.code == "rank_deficient"


@pytest.mark.parametrize("share", [1e-6, 1e-10, 1e-12])
def test_honest_near_dependence_keeps_its_digits(share):
    """A column that differs by a ten-billionth is honest: it stays, and the fit keeps its digits."""
    rng = np.random.default_rng(18)
    a, b = rng.normal(size=30), rng.normal(size=30)
    columns = {"a": a, "b": b, "c": a + b + share * rng.normal(size=30), "y": a + rng.normal(size=30)}
    fit = fitted(columns, "abc")
    b, se, _ = solved(columns, "abc", intercept=True)
    assert digits(estimates(fit), b) >= 12
    assert digits(errors(fit), se) >= 12


# Exact fits, mean models, few rows ----------------------------------------------------------------


@pytest.mark.parametrize("intercept", [True, False])
def test_an_exact_fit_has_no_tests(intercept):
    """Residuals of rounding only: errors 0, no t, p, F, AIC; R² is 1."""
    rng = np.random.default_rng(22)
    a, b = rng.normal(size=(2, 20))
    fit = fitted({"a": a, "b": b, "y": 0.1 * a + 3 * b + 7 * intercept}, "ab", intercept=intercept)
    assert fit.exact
    np.testing.assert_allclose(estimates(fit)[-2:], [0.1, 3], rtol=1e-12)
    assert all((c.standard_error, c.t, c.p) == (0.0, None, None) for c in fit.coefficients)
    assert (fit.r_squared, fit.adjusted_r_squared, fit.residual_sd, fit.rss) == (1.0, 1.0, 0.0, 0.0)
    assert (fit.f, fit.f_p, fit.aic, fit.bic) == (None, None, None, None)
    assert all((t.statistic, t.p, t.partial_f2) == (None, None, None) for t in fit.tests.values())


def test_a_constant_outcome():
    """An outcome with one value is fitted exactly, and nothing is explained."""
    fit = fitted({"x": [1.0, 2, 3, 5], "y": [0.1] * 4}, "x")
    assert fit.exact
    assert (fit.r_squared, fit.f, fit.tss) == (0.0, None, 0.0)
    assert estimates(fit) == [0.1, 0.0]


def test_the_mean_alone():
    """Without predictors: the mean, its error s/√n, no F, R² 0 (statsmodels' OLS on a constant)."""
    y = np.array([1.0, 3, 2, 5, 4, 9])
    fit = fitted({"y": y}, [])
    judge = sm.OLS(y, np.ones(6)).fit()
    assert estimates(fit) == [4.0]
    np.testing.assert_allclose(
        [*errors(fit), fit.coefficients[0].p], [*judge.bse, *judge.pvalues], rtol=1e-12
    )
    assert (fit.r_squared, fit.adjusted_r_squared, fit.f, fit.f_p, fit.f_df) == (0.0, 0.0, None, None, (0, 5))
    np.testing.assert_allclose([fit.aic, fit.bic], [judge.aic, judge.bic], rtol=1e-12)


def test_as_many_coefficients_as_rows():
    """No degree of freedom left: an exact fit, and no division by nothing."""
    fit = fitted({"a": [1.0, 2, 4], "b": [1.0, 0, 0], "y": [3.0, 1, 2]}, "ab")
    assert fit.exact
    assert fit.df_residual == 0
    assert fit.f is None


def test_one_degree_of_freedom():
    """The smallest table with an error (statsmodels' OLS)."""
    columns = {"a": np.array([1.0, 2, 4, 3]), "b": np.array([1.0, 0, 0, 1]), "y": np.array([3.0, 1, 2, 9])}
    fit = fitted(columns, "ab")
    judge = sm.OLS(columns["y"], sm.add_constant(np.column_stack([columns["a"], columns["b"]]))).fit()
    np.testing.assert_allclose(estimates(fit), judge.params, rtol=1e-10)
    np.testing.assert_allclose([c.p for c in fit.coefficients], judge.pvalues, rtol=1e-8)


def test_p_keeps_its_digits_in_the_far_tail():
    """The p of a t of some hundreds, against the incomplete beta function in 50 digits (mpmath)."""
    rng = np.random.default_rng(23)
    x = rng.normal(size=60)
    fit = fitted({"x": x, "y": 5 * x + 0.02 * rng.normal(size=60)}, "x")
    own = fit.coefficients[1]
    with mpmath.workdps(50):
        t = mpmath.mpf(own.t)
        p = mpmath.betainc(29, mpmath.mpf(1) / 2, 0, 58 / (58 + t * t), regularized=True)
    assert own.p < 1e-100
    assert math.isclose(own.p, float(p), rel_tol=1e-10)
    assert math.isclose(fit.f_p, float(p), rel_tol=1e-10)


def test_keys_may_be_products_and_indicators():
    """A key is only a name here: a product of factors is swept like any column."""
    product = Key((Factor("a"), Factor("g", level="high")))
    rng = np.random.default_rng(26)
    arrays = {named("a"): rng.normal(size=12), product: rng.normal(size=12), Y: rng.normal(size=12)}
    moments = moments_of(ArraySource(arrays), list(arrays))
    fit = fit_of(tableau_of(moments, Y, [named("a"), product], intercept=True), {"a × g": (product,)})
    assert fit.coefficients[2].key == product
    assert fit.tests["a × g"].p == fit.coefficients[2].p


def test_a_predictor_without_columns_has_no_test():
    """A category with one level in these rows adds no column: no statistic, p or effect, and no fault."""
    tableau = swept(TINY, ["x"])
    empty = fit_of(tableau, {"x": (named("x"),), "g": ()}).tests["g"]
    assert (empty.df, empty.statistic, empty.p, empty.partial_f2) == (0, None, None, None)
