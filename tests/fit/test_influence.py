"""Influence of rows and the fit without each: fractions, published tables, refits and statsmodels."""

from __future__ import annotations

import math

import numpy as np
import pytest
import statsmodels.api as sm
from scipy import stats
from statsmodels.stats.outliers_influence import OLSInfluence
from threadpoolctl import threadpool_limits

from beforehand.fit import linear
from beforehand.fit.fitting import fit_of
from beforehand.fit.influence import influence, without_each
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.rows import row_values
from beforehand.fit.tableau import tableau_of

Y = named("y")
MEASURES = ("internal", "external", "cooks_distance", "dffits", "largest_dfbetas", "covariance_ratio")

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
# Belsley, Kuh & Welsch (1980), Regression Diagnostics, ch. 2: savings of 50 countries.
SAVINGS = {
    "pop15": [
        29.35, 23.32, 23.8, 41.89, 42.19, 31.72, 39.74, 44.75, 46.64, 47.64, 24.42, 46.31, 27.84, 25.06,
        23.31, 25.62, 46.05, 47.32, 34.03, 41.31, 31.16, 24.52, 27.01, 41.74, 21.8, 32.54, 25.95, 24.71,
        32.61, 45.04, 43.56, 41.18, 44.19, 46.26, 28.96, 31.94, 31.92, 27.74, 21.44, 23.49, 43.42, 46.12,
        23.27, 29.81, 46.4, 45.25, 41.12, 28.13, 43.69, 47.2,
    ],
    "pop75": [
        2.87, 4.41, 4.43, 1.67, 0.83, 2.85, 1.34, 0.67, 1.06, 1.14, 3.93, 1.19, 2.37, 4.7, 3.35, 3.1, 0.87,
        0.58, 3.08, 0.96, 4.19, 3.48, 1.91, 0.91, 3.73, 2.47, 3.67, 3.25, 3.17, 1.21, 1.2, 1.05, 1.28, 1.12,
        2.85, 2.28, 1.52, 2.87, 4.54, 3.73, 1.08, 1.21, 4.46, 3.43, 0.9, 0.56, 1.73, 2.72, 2.07, 0.66,
    ],
    "dpi": [
        2329.68, 1507.99, 2108.47, 189.13, 728.47, 2982.88, 662.86, 289.52, 276.65, 471.24, 2496.53, 287.77,
        1681.25, 2213.82, 2457.12, 870.85, 289.71, 232.44, 1900.1, 88.94, 1139.95, 1390, 1257.28, 207.68,
        2449.39, 601.05, 2231.03, 1740.7, 1487.52, 325.54, 568.56, 220.56, 400.06, 152.01, 579.51, 651.11,
        250.96, 768.79, 3299.49, 2630.96, 389.66, 249.87, 1813.93, 4001.89, 813.39, 138.33, 380.47, 766.54,
        123.58, 242.69,
    ],
    "ddpi": [
        2.87, 3.93, 3.82, 0.22, 4.56, 2.43, 2.67, 6.51, 3.08, 2.8, 3.99, 2.19, 4.32, 4.52, 3.44, 6.28, 1.48,
        3.19, 1.12, 1.54, 2.99, 3.54, 8.21, 5.81, 1.57, 8.12, 3.62, 7.66, 1.76, 2.48, 3.61, 1.03, 0.67, 2,
        7.48, 2.19, 2, 4.35, 3.01, 2.7, 2.96, 1.13, 2.01, 2.45, 0.53, 5.14, 10.23, 1.88, 16.71, 5.08,
    ],
    "y": [
        11.43, 12.07, 13.17, 5.75, 12.88, 8.79, 0.6, 11.9, 4.98, 10.78, 16.85, 3.59, 11.24, 12.64, 12.55,
        10.67, 3.01, 7.7, 1.27, 9, 11.34, 14.28, 21.1, 3.98, 10.35, 15.48, 10.25, 14.65, 10.67, 7.3, 4.44,
        2.02, 12.7, 12.78, 12.49, 11.14, 13.3, 11.77, 6.86, 14.13, 5.13, 2.81, 7.81, 7.56, 9.22, 18.56,
        7.72, 9.24, 8.89, 4.71,
    ],
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
# Hoaglin & Welsch (1978), American Statistician 32:17-22: wood beams.
BEAMS = {
    "x1": [0.499, 0.558, 0.604, 0.441, 0.55, 0.528, 0.418, 0.48, 0.406, 0.467],
    "x2": [11.1, 8.9, 8.8, 8.9, 8.8, 9.9, 10.7, 10.5, 10.5, 10.7],
    "y": [11.14, 12.74, 13.13, 11.51, 12.38, 12.6, 11.13, 11.7, 11.02, 11.41],
}
# fmt: on


class Fitted:
    """A model for ``y`` with its rows and influence."""

    def __init__(self, columns, names=None, *, intercept=True, blocks=None, dfbetas=True):
        self.names = [name for name in columns if name != "y"] if names is None else names
        self.keys = [named(name) for name in self.names]
        self.columns = {name: np.asarray(values, float) for name, values in columns.items()}
        self.source = ArraySource({named(name): values for name, values in self.columns.items()})
        self.moments = moments_of(self.source, [*self.keys, Y])
        self.tableau = tableau_of(self.moments, Y, self.keys, intercept=intercept)
        self.blocks = {name: (named(name),) for name in self.names} if blocks is None else blocks
        self.fit = fit_of(self.tableau, self.blocks)
        self.values = row_values(self.source, self.tableau)
        self.influence = influence(self.source, self.tableau, self.values, dfbetas=dfbetas)

    def without(self, rows):
        """The fits without each of some rows."""
        rows = np.asarray(rows)
        return without_each(
            ArraySource({key: values[rows] for key, values in self.source.columns.items()}), self.tableau,
            residual=self.values.residual[rows], leverage=self.values.leverage[rows],
            outcome=self.columns["y"][rows], blocks=self.blocks,
        )  # fmt: skip

    def refitted(self, gone):
        """An actual fit without some rows."""
        left = {name: np.delete(values, gone) for name, values in self.columns.items()}
        return Fitted(left, self.names, intercept=self.tableau.intercept, blocks=self.blocks, dfbetas=False)


def table(seed, n=40, k=3, levels=3, intercept=True):
    """A random table with numbers of unlike size and a category of some levels, and its blocks."""
    rng = np.random.default_rng(seed)
    values = (rng.normal(size=(n, k)) + rng.normal(size=k) * 3) * 10.0 ** rng.integers(-4, 5, size=k)
    columns = {f"x{j}": values[:, j] for j in range(k)}
    codes = rng.permutation(np.arange(n) % levels)
    group = [f"g{level}" for level in range(int(intercept), levels)]
    for level, name in enumerate(group, start=int(intercept)):
        columns[name] = (codes == level).astype(float)
    columns["y"] = (values / values.std(axis=0)) @ rng.normal(size=k) * 0.4 + rng.normal(size=n) + codes / 2
    blocks = {f"x{j}": (named(f"x{j}"),) for j in range(k)} | {"g": tuple(named(name) for name in group)}
    return columns, blocks


# Exact and published values -----------------------------------------------------------------------


def test_tiny_set_in_fractions():
    """Every influence measure of the tiny set, as the root of the fraction that it is."""
    found = Fitted(TINY).influence
    signs = np.sign(Fitted(TINY).values.residual)
    internal = np.sqrt([4 / 57, 1156 / 2109, 2209 / 2451, 48 / 817, 1587 / 703, 48 / 19]) * signs
    external = np.sqrt([3 / 56, 867 / 1820, 6627 / 7595, 36 / 805, 4761 / 1225, 36 / 7]) * signs
    dffits = (
        np.sqrt([33 / 560, 26877 / 134680, 125913 / 653170, 342 / 34615, 147591 / 90650, 198 / 35]) * signs
    )
    np.testing.assert_allclose(found.internal, internal, rtol=1e-14)
    np.testing.assert_allclose(found.external, external, rtol=1e-14)
    np.testing.assert_allclose(found.dffits, dffits, rtol=1e-14)
    cook = [11 / 285, 8959 / 78033, 2209 / 22188, 12 / 1849, 49197 / 104044, 132 / 95]
    np.testing.assert_allclose(found.cooks_distance, cook, rtol=1e-14)
    ratio = [175616 / 48735, 927472000 / 493714791, 2018940875 / 1549909458]
    ratio += [181447000 / 86106081, 52521875 / 109714398, 2744 / 5415]
    np.testing.assert_allclose(found.covariance_ratio, ratio, rtol=1e-14)
    slope = [0.2004459314, 0.2947982351, 0.1233647265, 0.0279286352, 0.8420387362, 1.9639610121]
    np.testing.assert_allclose(found.largest_dfbetas, slope, rtol=2e-9)
    assert not found.sole.any()


def test_tiny_set_without_each_row():
    """Slopes, R² and p without each row of the tiny set, as fractions and as scipy's t."""
    model = Fitted(TINY)
    found = model.without(range(6))
    slopes = [7 / 5, 53 / 37, 109 / 86, 56 / 43, 115 / 74, 4 / 5]
    np.testing.assert_allclose(found.estimates[:, 0], slopes, rtol=1e-14)
    assert found.column.tolist() == [0] * 6
    change = np.abs(np.array(slopes) - 46 / 35) / math.sqrt(171 / 1225)
    np.testing.assert_allclose(found.change_coefficient, change, rtol=1e-12)
    for row in range(6):
        judge = stats.linregress(np.delete(TINY["x"], row), np.delete(TINY["y"], row))
        assert math.isclose(found.p["x"][row], judge.pvalue, rel_tol=1e-10)
        assert math.isclose(found.change_r_squared[row], judge.rvalue**2 - (1 - 342 / 1400), rel_tol=1e-9)


def test_stack_loss():
    """Brownlee's data (Daniel & Wood 1971, ch. 5; Cook's distance of row 21 .692), recomputed to 4 places."""
    found = Fitted(STACK_LOSS).influence
    # fmt: off
    np.testing.assert_allclose(found.leverage, [
        0.3016, 0.3178, 0.1746, 0.1285, 0.0522, 0.0775, 0.2192, 0.2192, 0.1402, 0.2000, 0.1550, 0.2172,
        0.1575, 0.2058, 0.1905, 0.1311, 0.4121, 0.1606, 0.1745, 0.0802, 0.2845,
    ], atol=5.1e-5)
    np.testing.assert_allclose(found.internal, [
        1.1933, -0.7158, 1.5460, 1.8818, -0.5421, -0.9653, -0.8338, -0.4848, -1.0455, 0.4368, 0.8843,
        0.9686, -0.4799, -0.0175, 0.8092, 0.2994, -0.6112, -0.1532, -0.2030, 0.4540, -2.6382,
    ], atol=5.1e-5)
    np.testing.assert_allclose(found.external, [
        1.2095, -0.7051, 1.6179, 2.0518, -0.5305, -0.9632, -0.8259, -0.4737, -1.0486, 0.4262, 0.8783,
        0.9667, -0.4687, -0.0170, 0.8006, 0.2912, -0.5996, -0.1487, -0.1972, 0.4431, -3.3305,
    ], atol=5.1e-5)
    np.testing.assert_allclose(found.cooks_distance, [
        0.1537, 0.0597, 0.1264, 0.1305, 0.0040, 0.0196, 0.0488, 0.0165, 0.0446, 0.0119, 0.0359, 0.0651,
        0.0108, 0.0000, 0.0385, 0.0034, 0.0655, 0.0011, 0.0022, 0.0045, 0.6920,
    ], atol=5.1e-5)
    np.testing.assert_allclose(found.dffits, [
        0.7947, -0.4813, 0.7442, 0.7879, -0.1245, -0.2792, -0.4377, -0.2510, -0.4234, 0.2131, 0.3762,
        0.5092, -0.2027, -0.0086, 0.3883, 0.1131, -0.5020, -0.0650, -0.0907, 0.1308, -2.1003,
    ], atol=5.1e-5)
    np.testing.assert_allclose(found.covariance_ratio, [
        1.2859, 1.6530, 0.8423, 0.5745, 1.2541, 1.1026, 1.3812, 1.5439, 1.1362, 1.5228, 1.2493, 1.2973,
        1.4324, 1.6046, 1.3454, 1.4360, 1.9835, 1.5099, 1.5290, 1.3196, 0.2167,
    ], atol=5.1e-5)
    # fmt: on
    assert math.isclose(found.largest_dfbetas[20], 1.6419, abs_tol=5.1e-5)


def test_stack_loss_without_row_21():
    """-43.70, .889, .817, -.107 and R² .9488 without row 21 (Daniel & Wood), recomputed to ten digits."""
    model = Fitted(STACK_LOSS)
    found = model.without([20])
    np.testing.assert_allclose(found.estimates[0], [0.889108181, 0.8166198714, -0.1071413686], rtol=1e-8)
    assert math.isclose(found.change_r_squared[0], 0.948795075 - 0.9135769045, rel_tol=1e-7)


@pytest.mark.parametrize(
    ("row", "h", "t", "dffits", "ratio", "cook", "dfbetas"),
    [
        (49, 0.531457, -1.089303, -1.160133, 2.090574, 0.268070, 1.0245),
        (23, 0.223310, 1.603216, 0.859651, 1.084600, 0.142816, 0.6739),
        (46, 0.064332, 2.853558, 0.748235, 0.511645, 0.096633, 0.3390),
        (21, 0.212236, 1.004859, 0.521575, 1.268043, 0.054396, 0.4816),
        (44, 0.333688, -0.354615, -0.250951, 1.655482, 0.012845, 0.2331),
        (7, 0.037298, -2.313429, -0.455358, 0.654710, 0.037813, 0.2198),
    ],
)
def test_savings_of_fifty_countries(row, h, t, dffits, ratio, cook, dfbetas):
    """Belsley, Kuh & Welsch (1980), ch. 2: Libya, Japan, Zambia, Ireland, the United States, Chile."""
    found = Fitted(SAVINGS).influence
    at = row - 1
    np.testing.assert_allclose(
        [
            getattr(found, name)[at]
            for name in ("leverage", "external", "dffits", "covariance_ratio", "cooks_distance")
        ],
        [h, t, dffits, ratio, cook],
        atol=5.1e-7,
    )
    assert math.isclose(found.largest_dfbetas[at], dfbetas, abs_tol=5.1e-5)


def test_flags_of_the_savings_data():
    """Countries beyond the cut-offs of Belsley, Kuh & Welsch (1980) for each measure."""
    found = Fitted(SAVINGS).influence
    assert (np.flatnonzero(found.leverage > 0.2) + 1).tolist() == [21, 23, 44, 49]
    assert (np.flatnonzero(np.abs(found.dffits) > 0.63246) + 1).tolist() == [23, 46, 49]
    assert (np.flatnonzero(np.abs(found.covariance_ratio - 1) >= 0.3) + 1).tolist() == [6, 7, 37, 44, 46, 49]
    assert (np.flatnonzero(found.largest_dfbetas > 0.28284) + 1).tolist() == [10, 21, 23, 33, 46, 47, 49]


@pytest.mark.parametrize(
    ("row", "estimates", "r_squared", "p"),
    [
        (
            49,
            [-0.391440127, -1.28086692, -0.000318900146, 0.610279026],
            0.35542038,
            [0.0170841, 0.26943, 0.733119, 0.0281222],
        ),
        (
            23,
            [-0.367901491, -0.973674268, -0.000470627754, 0.334748588],
            0.27699671,
            [0.0209573, 0.403965, 0.611162, 0.0987103],
        ),
        (
            46,
            [-0.450554746, -1.35025625, -0.000418262622, 0.368096331],
            0.39192181,
            [0.00165764, 0.189728, 0.631289, 0.0502423],
        ),
    ],
)
def test_savings_without_a_country(row, estimates, r_squared, p):
    """Without Libya, Japan or Zambia (Belsley, Kuh & Welsch 1980), recomputed to nine digits."""
    found = Fitted(SAVINGS).without([row - 1])
    np.testing.assert_allclose(found.estimates[0], estimates, rtol=3e-9)
    assert math.isclose(found.change_r_squared[0], r_squared - 0.338456375, abs_tol=1.1e-8)
    np.testing.assert_allclose([found.p[name][0] for name in ("pop15", "pop75", "dpi", "ddpi")], p, rtol=4e-6)


def test_delivery_times():
    """Rows 9 and 22 of the delivery data (Montgomery & Peck 1982, ch. 6), recomputed to six places."""
    model = Fitted(DELIVERY)
    found = model.influence
    at = [8, 21]
    np.testing.assert_allclose(found.external[at], [4.310780, -1.489625], atol=5.1e-7)
    np.testing.assert_allclose(found.dffits[at], [4.296081, -1.195036], atol=5.1e-7)
    np.testing.assert_allclose(found.covariance_ratio[at], [0.342213, 1.398079], atol=5.1e-7)
    np.testing.assert_allclose(found.cooks_distance[at], [3.4193184, 0.451045], atol=5.1e-7)
    assert math.isclose(found.largest_dfbetas[8], 1.5076, abs_tol=5.1e-5)
    without = model.without(at)
    np.testing.assert_allclose(without.estimates[0], [1.49769128, 0.0103240587], rtol=3e-9)
    np.testing.assert_allclose(without.estimates[1], [1.78632361, 0.0123691121], rtol=3e-9)
    np.testing.assert_allclose(
        without.change_r_squared + model.fit.r_squared, [0.94870096, 0.95642283], atol=5.1e-9
    )


def test_wood_beams():
    """External residuals and Cook's distances of Hoaglin & Welsch's beams, recomputed to four places."""
    found = Fitted(BEAMS).influence
    t = [-3.2541, 0.2667, 0.1824, -0.9612, -1.0585, 2.2030, 0.5087, 0.4357, 0.2698, -0.0332]
    np.testing.assert_allclose(found.external, t, atol=5.1e-5)
    cook = [1.0692, 0.0087, 0.0092, 0.4756, 0.1238, 0.1811, 0.0342, 0.0130, 0.0129, 0.0001]
    np.testing.assert_allclose(found.cooks_distance, cook, atol=5.1e-5)


# Judges -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("intercept", [True, False])
def test_forty_tables_against_statsmodels(intercept):
    """All measures as OLSInfluence gives them, in models with and without an intercept."""
    for seed in range(40):
        columns, blocks = table(seed, n=20 + seed, k=1 + seed % 4, levels=2 + seed % 3, intercept=intercept)
        model = Fitted(columns, blocks=blocks, intercept=intercept)
        x = np.column_stack([model.columns[name] / np.abs(model.columns[name]).max() for name in model.names])
        x = sm.add_constant(x, has_constant="add") if intercept else x
        judge = OLSInfluence(sm.OLS(model.columns["y"], x).fit())
        found = model.influence
        close = {"rtol": 1e-8, "atol": 1e-10}
        np.testing.assert_allclose(found.leverage, judge.hat_matrix_diag, **close)
        np.testing.assert_allclose(found.internal, judge.resid_studentized_internal, **close)
        np.testing.assert_allclose(found.external, judge.resid_studentized_external, **close)
        np.testing.assert_allclose(found.cooks_distance, judge.cooks_distance[0], **close)
        np.testing.assert_allclose(found.dffits, judge.dffits[0], **close)
        np.testing.assert_allclose(found.covariance_ratio, judge.cov_ratio, rtol=1e-8)
        slopes = np.abs(judge.dfbetas[:, int(intercept) :]).max(axis=1)
        np.testing.assert_allclose(found.largest_dfbetas, slopes, **close)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("seed", range(12))
def test_without_each_is_an_actual_refit(seed, intercept):
    """R², largest change and its column, every slope and every p, to ten digits of a fit without the row."""
    columns, blocks = table(seed, n=16 + seed, k=1 + seed % 3, intercept=intercept)
    model = Fitted(columns, blocks=blocks, intercept=intercept)
    n = model.tableau.n
    found = model.without(range(n))
    first = int(intercept)
    errors = np.array([c.standard_error for c in model.fit.coefficients[first:]])
    before = np.array(model.tableau.estimates)
    for row in range(n):
        left = model.refitted([row]).fit
        after = np.array([c.estimate for c in left.coefficients[first:]])
        np.testing.assert_allclose(found.estimates[row], after, rtol=1e-10, atol=1e-10 * errors.min())
        change = np.abs(after - before) / errors
        assert math.isclose(found.change_coefficient[row], change.max(), rel_tol=1e-8)
        assert found.column[row] == change.argmax()
        assert math.isclose(found.change_r_squared[row], left.r_squared - model.fit.r_squared, abs_tol=1e-14)
        for name, test in left.tests.items():
            assert math.isclose(found.p[name][row], test.p, rel_tol=1e-10)


def test_without_each_where_columns_say_nearly_the_same():
    """At a condition number of 1e8, ten digits of the slopes and p of a refit without the row."""
    rng = np.random.default_rng(3)
    a, b, c = rng.normal(size=(3, 30))
    columns = {"a": a * 1e5 + 1e6, "b": b, "c": a - b + 1e-8 * c, "y": a + b + rng.normal(size=30)}
    model = Fitted(columns)
    found = model.without(range(30))
    for row in range(30):
        left = model.refitted([row]).fit
        np.testing.assert_allclose(
            found.estimates[row], [c.estimate for c in left.coefficients[1:]], rtol=1e-10
        )
        for name in "abc":
            assert math.isclose(found.p[name][row], left.tests[name].p, rel_tol=1e-9)


def test_a_row_that_carries_the_fit():
    """A row far out: R² falls by nearly all of itself and p rises, as in a refit."""
    rng = np.random.default_rng(4)
    x, y = np.append(rng.normal(size=20), 60.0), np.append(rng.normal(size=20), 55.0)
    model = Fitted({"x": x, "y": y})
    found = model.without([20])
    left = model.refitted([20]).fit
    assert found.change_r_squared[0] < -0.8
    assert math.isclose(found.change_r_squared[0], left.r_squared - model.fit.r_squared, rel_tol=1e-10)
    assert math.isclose(found.p["x"][0], left.tests["x"].p, rel_tol=1e-9)
    assert found.p["x"][0] > 1e6 * model.fit.tests["x"].p


# Laws and edges -----------------------------------------------------------------------------------


def test_rows_blocks_and_threads_do_not_matter(monkeypatch):
    """Rows in any order, any block size, one thread or two: the same doubles, row by row."""
    columns, blocks = table(5, n=600, k=4)
    expected = Fitted(columns, blocks=blocks).influence
    order = np.random.default_rng(1).permutation(600)
    names = ("leverage", *MEASURES)
    for cells in (1 << 17, 1 << 8):
        monkeypatch.setattr(linear, "BLOCK_CELLS", cells)
        for threads in (1, 2):
            with threadpool_limits(threads):
                plain = Fitted(columns, blocks=blocks)
                other = Fitted(
                    {name: values[order] for name, values in columns.items()}, blocks=blocks
                ).influence
                few = plain.without([599, 3, 44])
                one = plain.without([3])
            for name in names:
                assert (getattr(plain.influence, name) == getattr(expected, name)).all()
                assert (getattr(other, name) == getattr(expected, name)[order]).all()
            assert few.change_r_squared[1] == one.change_r_squared[0]
            assert few.change_coefficient[1] == one.change_coefficient[0]
            assert (few.estimates[1] == one.estimates[0]).all()
            assert all(few.p[name][1] == one.p[name][0] for name in blocks)


def test_a_change_of_unit_moves_no_measure():
    """Columns and outcome times powers of two: every measure stays, to the last digit or two."""
    columns, blocks = table(6)
    one = Fitted(columns, blocks=blocks)
    other = Fitted(
        {name: np.ldexp(v, 30 * j - 60) for j, (name, v) in enumerate(columns.items())}, blocks=blocks
    )
    for name in MEASURES:
        np.testing.assert_allclose(getattr(other.influence, name), getattr(one.influence, name), rtol=1e-13)
    a, b = one.without(range(40)), other.without(range(40))
    np.testing.assert_allclose(b.change_coefficient, a.change_coefficient, rtol=1e-13)
    np.testing.assert_allclose(b.change_r_squared, a.change_r_squared, rtol=1e-10, atol=1e-15)
    for name in blocks:
        np.testing.assert_allclose(b.p[name], a.p[name], rtol=1e-11)


def test_dfbetas_only_when_asked_for():
    """The one measure that needs every coefficient of every row is left out by default."""
    model = Fitted(TINY)
    assert influence(model.source, model.tableau, model.values).largest_dfbetas is None


@pytest.mark.parametrize("intercept", [True, False])
def test_a_sole_row_is_named_and_has_no_measures(intercept):
    """Anscombe (1973), set IV and the like: leverage 1 is listed, and what is 0/0 is NaN, the rest whole."""
    columns, _ = table(7, levels=2, intercept=intercept)
    columns = {name: values for name, values in columns.items() if name[0] != "g"}
    columns["only"] = (np.arange(40) == 13).astype(float)
    model = Fitted(columns, intercept=intercept)
    found = model.influence
    assert np.flatnonzero(found.sole).tolist() == [13]
    rest = np.delete(np.arange(40), 13)
    left = Fitted({name: v[rest] for name, v in columns.items() if name != "only"}, intercept=intercept)
    for name in MEASURES:
        assert math.isnan(getattr(found, name)[13])
        assert np.isfinite(getattr(found, name)[rest]).all()
    np.testing.assert_allclose(found.leverage[rest], left.values.leverage, rtol=1e-9)
    np.testing.assert_allclose(found.external[rest], left.influence.external, rtol=1e-9)


def test_one_degree_of_freedom_leaves_no_external_residual():
    """With one residual degree of freedom nothing is left without the row: NaN, no fault."""
    model = Fitted({"x": [1.0, 2, 4], "y": [1.0, 3, 2]})
    assert np.isnan(model.influence.external).all()
    assert np.isnan(model.influence.dffits).all()
    np.testing.assert_allclose(np.abs(model.influence.internal), 1.0, rtol=1e-12)


def test_the_mean_alone():
    """Without predictors there is no slope that could change, and none is named."""
    model = Fitted({"y": TINY["y"]})
    found = model.without(range(6))
    assert found.column.tolist() == [-1] * 6
    assert found.change_coefficient.tolist() == [0.0] * 6
    assert found.estimates.shape == (6, 0)
    assert model.influence.largest_dfbetas.tolist() == [0.0] * 6
    np.testing.assert_allclose(found.change_r_squared, 0.0, atol=1e-15)


def test_a_row_without_which_the_outcome_is_constant():
    """Where nothing is left to explain, R² does not change rather than being 0/0."""
    model = Fitted({"x": [1.0, 2, 3, 5, 4], "y": [1.0, 1, 1, 1, 2]})
    found = model.without([4])
    assert found.change_r_squared.tolist() == [0.0]
