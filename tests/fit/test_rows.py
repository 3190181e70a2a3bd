"""Fitted values, residuals, leverages and PRESS of every row, against fractions and published tables."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.stats.outliers_influence import OLSInfluence
from threadpoolctl import threadpool_limits

from beforehand.fit import linear
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.rows import row_values
from beforehand.fit.tableau import tableau_of

Y = named("y")

# x = 0..5, y = 1 3 2 5 4 9: every number an exact fraction (check values, worked out from definitions).
TINY = {"x": [0, 1, 2, 3, 4, 5], "y": [1, 3, 2, 5, 4, 9]}
TINY_LEVERAGES = [11 / 21, 31 / 105, 19 / 105, 19 / 105, 31 / 105, 11 / 21]
TINY_RESIDUALS = [2 / 7, 34 / 35, -47 / 35, 12 / 35, -69 / 35, 12 / 7]

# fmt: off
# Hoaglin & Welsch (1978), American Statistician 32:17-22: wood beams.
BEAMS = {
    "x1": [0.499, 0.558, 0.604, 0.441, 0.55, 0.528, 0.418, 0.48, 0.406, 0.467],
    "x2": [11.1, 8.9, 8.8, 8.9, 8.8, 9.9, 10.7, 10.5, 10.5, 10.7],
    "y": [11.14, 12.74, 13.13, 11.51, 12.38, 12.6, 11.13, 11.7, 11.02, 11.41],
}
# Montgomery & Peck (1982): delivery times; x1 cases, x2 distance, y minutes.
DELIVERY = {
    "x1": [7, 3, 3, 4, 6, 7, 2, 7, 30, 5, 16, 10, 4, 6, 9, 10, 6, 7, 3, 17, 10, 26, 9, 8, 4],
    "x2": [
        560, 220, 340, 80, 150, 330, 110, 210, 1460, 605, 688, 215, 255, 462, 448, 776, 200, 132, 36, 770,
        140, 810, 450, 635, 150,
    ],
    "y": [
        16.68, 11.5, 12.03, 14.88, 13.75, 18.11, 8, 17.83, 79.24, 21.5, 40.33, 21, 13.5, 19.75, 24, 29,
        15.35, 19, 9.5, 35.1, 17.9, 52.32, 18.75, 19.83, 10.75,
    ],
}
# Hald (1952): heat of hardening cement.
HALD = {
    "x1": [7, 1, 11, 11, 7, 11, 3, 1, 2, 21, 1, 11, 10],
    "x2": [26, 29, 56, 31, 52, 55, 71, 31, 54, 47, 40, 66, 68],
    "x3": [6, 15, 8, 8, 6, 9, 17, 22, 18, 4, 23, 9, 8],
    "x4": [60, 52, 20, 47, 33, 22, 6, 44, 22, 26, 34, 12, 12],
    "y": [78.5, 74.3, 104.3, 87.6, 95.9, 109.2, 102.7, 72.5, 93.1, 115.9, 83.8, 113.3, 109.4],
}
# fmt: on


def fitted(columns, names=None, *, intercept=True):
    """Source, tableau and row values of a model for ``y``."""
    names = [name for name in columns if name != "y"] if names is None else names
    arrays = {named(name): np.asarray(values, float) for name, values in columns.items()}
    source = ArraySource(arrays)
    tableau = tableau_of(
        moments_of(source, list(arrays)), Y, [named(name) for name in names], intercept=intercept
    )
    return source, tableau, row_values(source, tableau)


def table(seed, n=40, k=4):
    """A random table with columns of unlike size, far from 0."""
    rng = np.random.default_rng(seed)
    values = (rng.normal(size=(n, k)) + rng.normal(size=k) * 5) * 10.0 ** rng.integers(-4, 5, size=k)
    columns = {f"x{j}": values[:, j] for j in range(k)}
    columns["y"] = (values / values.std(axis=0)) @ rng.normal(size=k) + rng.normal(size=n)
    return columns


def test_tiny_set_in_fractions():
    """Residuals, leverages and PRESS of the tiny set, as the fractions that they are."""
    _, _, values = fitted(TINY)
    np.testing.assert_allclose(values.residual, TINY_RESIDUALS, rtol=1e-15)
    np.testing.assert_allclose(values.leverage, TINY_LEVERAGES, rtol=1e-15)
    np.testing.assert_allclose(values.fitted, np.array(TINY["y"]) - TINY_RESIDUALS, rtol=1e-15)
    assert math.isclose(values.press, 3279034521 / 126564050, rel_tol=1e-15)


def test_wood_beams():
    """Leverages of Hoaglin & Welsch (1978), recomputed to seven digits; row 4 alone is above 2p/n."""
    leverage = fitted(BEAMS)[2].leverage
    expected = [
        0.4178935,
        0.2418666,
        0.4172806,
        0.6043904,
        0.2521824,
        0.1478688,
        0.2616385,
        0.1540321,
        0.3155106,
        0.1873364,
    ]
    np.testing.assert_allclose(leverage, expected, atol=5.1e-8)
    assert np.flatnonzero(leverage > 0.6).tolist() == [3]


def test_delivery_times():
    """PRESS 459.0393 and leverages of rows 9 and 22 (Montgomery & Peck), recomputed."""
    _, _, values = fitted(DELIVERY)
    assert math.isclose(values.press, 459.039315, rel_tol=1e-8)
    np.testing.assert_allclose(values.leverage[[8, 21]], [0.4982922, 0.3915752], atol=5.1e-8)


@pytest.mark.parametrize(
    ("names", "press"),
    [
        (["x1", "x2"], 93.88255),
        (["x1", "x2", "x4"], 85.35112),
        (["x1", "x2", "x3", "x4"], 110.34656),
        (["x3"], 2616.36385),
    ],
)
def test_press_of_the_cement_data(names, press):
    """PRESS of subsets (Draper & Smith; Allen 1974), recomputed to ten digits."""
    assert math.isclose(fitted(HALD, names)[2].press, press, abs_tol=5.1e-6)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("seed", range(6))
def test_against_statsmodels(seed, intercept):
    """Fitted values, residuals, leverages and PRESS as OLSInfluence gives them."""
    columns = table(seed)
    _, tableau, values = fitted(columns, intercept=intercept)
    x = np.column_stack([columns[f"x{j}"] / np.abs(columns[f"x{j}"]).max() for j in range(4)])
    judge = sm.OLS(columns["y"], sm.add_constant(x) if intercept else x).fit()
    influence = OLSInfluence(judge)
    np.testing.assert_allclose(values.residual, judge.resid, rtol=1e-8, atol=1e-10)
    np.testing.assert_allclose(values.fitted, judge.fittedvalues, rtol=1e-9, atol=1e-10)
    np.testing.assert_allclose(values.leverage, influence.hat_matrix_diag, rtol=1e-9)
    np.testing.assert_allclose(values.press, (influence.resid_press**2).sum(), rtol=1e-9)
    assert math.isclose(values.leverage.sum(), tableau.p, rel_tol=1e-13)


@pytest.mark.parametrize("intercept", [True, False])
def test_to_the_last_digits_where_columns_say_nearly_the_same(intercept):
    """Condition number 1e10: residuals and leverages right to 13 digits (by fractions)."""
    rng = np.random.default_rng(7)
    a, b, c = rng.normal(size=(3, 25))
    columns = {"a": a + 50, "b": b, "c": a - b + 1e-10 * c, "y": a + rng.normal(size=25)}
    _, tableau, values = fitted(columns, intercept=intercept)
    for row in range(25):
        own = [Fraction(float(columns[name][row])) for name in "abc"]
        predicted = tableau.constant + sum(tableau.slope(k) * v for k, v in enumerate(own))
        residual = Fraction(float(columns["y"][row])) - predicted
        assert math.isclose(values.residual[row], float(residual), rel_tol=1e-13)
        assert math.isclose(values.leverage[row], float(tableau.leverage_of(own)), rel_tol=1e-13)


def test_residuals_add_to_nothing_and_to_the_sum_of_squares():
    """With an intercept residuals add to 0 and their squares to the residual sum of squares."""
    _, tableau, values = fitted(table(8, n=500))
    assert abs(math.fsum(values.residual)) < 1e-12
    assert math.isclose(math.fsum(values.residual**2), float(tableau.rss), rel_tol=1e-14)


def test_rows_blocks_and_threads_do_not_matter(monkeypatch):
    """Rows in any order, any block size, one thread or two: the same doubles, row by row."""
    columns = table(9, n=1500, k=6)
    _, _, expected = fitted(columns)
    order = np.random.default_rng(1).permutation(1500)
    shuffled = {name: values[order] for name, values in columns.items()}
    for cells in (1 << 17, 1 << 8):
        monkeypatch.setattr(linear, "BLOCK_CELLS", cells)
        for threads in (1, 2):
            with threadpool_limits(threads):
                plain, other = fitted(columns)[2], fitted(shuffled)[2]
            for name in ("fitted", "residual", "leverage"):
                assert (getattr(plain, name) == getattr(expected, name)).all()
                assert (getattr(other, name) == getattr(expected, name)[order]).all()
            assert plain.press == other.press == expected.press


def test_a_change_of_unit_moves_no_leverage():
    """Columns times a power of two, the outcome too: leverages the same, residuals scaled."""
    columns = table(10)
    _, _, one = fitted(columns)
    scaled = {name: np.ldexp(values, 40 * (j + 1)) for j, (name, values) in enumerate(columns.items())}
    _, _, other = fitted(scaled)
    np.testing.assert_allclose(other.leverage, one.leverage, rtol=1e-15)
    np.testing.assert_allclose(other.residual, np.ldexp(one.residual, 40 * 5), rtol=1e-13)


def test_a_row_that_alone_makes_a_coefficient_has_leverage_one():
    """Anscombe (1973), set IV: row 8 has leverage exactly 1, the others 1/10, and PRESS does not exist."""
    columns = {
        "x": [8, 8, 8, 8, 8, 8, 8, 19, 8, 8, 8],
        "y": [6.58, 5.76, 7.71, 8.84, 8.47, 7.04, 5.25, 12.5, 5.56, 7.91, 6.89],
    }
    _, _, values = fitted(columns)
    assert values.leverage[7] == 1.0
    np.testing.assert_allclose(np.delete(values.leverage, 7), 0.1, rtol=1e-15)
    assert abs(values.residual[7]) < 1e-14
    assert values.press is None


@pytest.mark.parametrize("intercept", [True, False])
def test_a_level_with_one_row_has_leverage_one(intercept):
    """An indicator of one row only, among ordinary columns of other units."""
    columns = table(11)
    columns["only"] = (np.arange(40) == 13).astype(float)
    columns["x0"] = columns["x0"] * 1e9
    _, _, values = fitted(columns, intercept=intercept)
    assert np.flatnonzero(values.leverage >= 1.0).tolist() == [13]
    assert values.press is None


def test_a_leverage_near_one_is_not_one():
    """A row far out at 1e5 has a leverage below 1, right to its last digits (by fractions)."""
    x = np.array([1.0, 2, 3, 4, 1e5])
    _, tableau, values = fitted({"x": x, "y": [1.0, 3, 2, 5, 4]})
    about = [Fraction(v) - Fraction(float(x.sum())) / 5 for v in x.tolist()]
    exact = Fraction(1, 5) + about[-1] ** 2 / sum(v * v for v in about)
    assert values.leverage[-1] == float(exact) < 1.0
    assert tableau.leverage_of([Fraction(10**5)]) == pytest.approx(float(exact), rel=1e-15)
    assert values.press is not None


def test_the_mean_alone():
    """Without predictors every row has leverage 1/n and its distance from the mean."""
    _, _, values = fitted({"y": [1.0, 3, 2, 5, 4, 9]})
    np.testing.assert_allclose(values.leverage, 1 / 6, rtol=1e-15)
    np.testing.assert_allclose(values.residual, [-3, -1, -2, 1, 0, 5], atol=1e-15)
    assert math.isclose(values.press, 40 * 1.44, rel_tol=1e-14)


def test_more_rows_than_one_block_of_outcomes():
    """The outcome is read in pieces, and fitted values stand beside their rows."""
    n = 70_000
    x = np.arange(n, dtype=float)
    columns = {"x": x, "y": 2 * x + (x % 7)}
    _, tableau, values = fitted(columns)
    np.testing.assert_allclose(
        values.fitted, float(tableau.constant) + float(tableau.slope(0)) * x, rtol=1e-12
    )
