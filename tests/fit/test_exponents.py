"""Learned exponents: scipy's Box-Cox as the judge for an outcome, a full search for a predictor."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from beforehand.fit.exponents import HIGHEST, LOWEST, NoExponent, outcome_exponent, predictor_exponent


def profile(y, x):
    """Residual sum of squares of (y^e - 1) / e on x, by numpy's least squares."""
    design = np.column_stack([np.ones(len(x)), x])

    def rss_of(exponent):
        turned = np.log(y) if exponent == 0 else (y**exponent - 1.0) / exponent
        return float(np.linalg.lstsq(design, turned, rcond=None)[1][0])

    return rss_of


@pytest.mark.parametrize("seed", range(12))
def test_an_outcome_without_predictors_is_scipys_box_cox(seed):
    """On the mean model the exponent and its 95% interval are those of scipy.stats.boxcox."""
    rng = np.random.default_rng(seed)
    y = np.exp(rng.normal(1.0, 0.4, size=80)) if seed % 2 else rng.gamma(3.0, size=80) + 0.5
    design = np.ones((len(y), 1))

    def rss_of(exponent):
        turned = np.log(y) if exponent == 0 else (y**exponent - 1.0) / exponent
        return float(((turned - turned.mean()) ** 2).sum()) + 0.0 * design.sum()

    found = outcome_exponent(rss_of, n=len(y), log_total=float(np.log(y).sum()))
    _, best, (low, high) = stats.boxcox(y, alpha=0.05)
    assert found.estimate == pytest.approx(best, abs=2e-5)
    assert found.exponent == round(best, 2)
    assert (found.low, found.high) == (pytest.approx(low, abs=1e-4), pytest.approx(high, abs=1e-4))
    assert found.log_likelihood == pytest.approx(stats.boxcox_llf(found.estimate, y), abs=1e-8)


@pytest.mark.parametrize("seed", range(6))
def test_an_outcome_with_a_predictor(seed):
    """The estimate has the largest likelihood of a fine grid (Box & Cox 1964, equation 8)."""
    rng = np.random.default_rng(seed)
    x = rng.uniform(1, 5, size=60)
    y = (2.0 + x + 0.2 * rng.normal(size=60)) ** (1, 2, 3, 0.5, 1.5, 4)[seed]
    rss_of, log_total = profile(y, x), float(np.log(y).sum())
    found = outcome_exponent(rss_of, n=60, log_total=log_total)
    grid = np.arange(LOWEST, HIGHEST + 1e-9, 0.01)
    heights = [-30.0 * math.log(rss_of(e) / 60) + (e - 1.0) * log_total for e in grid.round(2).tolist()]
    assert found.exponent == pytest.approx(float(grid[int(np.argmax(heights))]), abs=0.0101)
    assert found.log_likelihood >= max(heights) - 1e-6


@pytest.mark.parametrize("power", [-1.0, -0.5, 0.0, 0.5, 1.0, 2.0])
def test_a_predictor_finds_the_power_that_made_it(power):
    """Of all hundredths within the bounds none leaves a smaller residual sum of squares."""
    rng = np.random.default_rng(int(10 * power) + 50)
    x = rng.uniform(1, 6, size=90)
    y = 1.0 + 2.0 * (np.log(x) if power == 0 else x**power) + 0.01 * rng.normal(size=90)

    def rss_of(exponent):
        turned = np.log(x) if exponent == 0 else (x**exponent - 1.0) / exponent
        design = np.column_stack([np.ones(90), turned])
        return float(np.linalg.lstsq(design, y, rcond=None)[1][0])

    found = predictor_exponent(rss_of)
    every = [step / 100 for step in range(round(100 * LOWEST), round(100 * HIGHEST) + 1)]
    assert rss_of(found) == min(map(rss_of, every))
    assert found == pytest.approx(power, abs=0.1)


def test_nothing_to_choose_keeps_one():
    """Of equal exponents the one that changes nothing is taken."""
    assert predictor_exponent(lambda exponent: 1.0) == 1.0


def test_what_cannot_be_learned():
    """An exact fit and a model without any fit are refused with a reason."""
    with pytest.raises(NoExponent, match="exactly"):
        outcome_exponent(lambda exponent: 0.0, n=10, log_total=1.0)
    with pytest.raises(NoExponent, match="any exponent"):
        outcome_exponent(lambda exponent: math.inf, n=10, log_total=1.0)
