"""Figures and their Monte Carlo errors."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import scipy.stats

from beforehand.rehearsing.figures import (
    Estimate,
    jackknifed,
    mean,
    proportion,
    quantile,
    relative_bias,
    root_mean_square,
    share,
    shifted,
    tail_share,
)


def test_a_share_has_the_binomial_error() -> None:
    """The binomial distribution of scipy says how far a count strays."""
    got = proportion(np.arange(2000) < 96)
    assert got is not None
    assert got.value == 0.048
    assert got.mc_error == pytest.approx(scipy.stats.binom.std(2000, 0.048) / 2000, rel=1e-9)
    # The issue's own example: 4.8 % of 2,000 replicates, give or take half a point.
    assert round(got.mc_error or 0, 3) == 0.005


@pytest.mark.parametrize("count", [0, 40])
def test_none_or_all_is_not_without_error(count: int) -> None:
    """The error of none or all is that of a share next to it, not 0."""
    got = share(count, 40)
    assert got is not None
    near = 1 / 42
    assert got == Estimate(value=count / 40, mc_error=(near * (1 - near) / 40) ** 0.5)


def test_shares_and_means_of_nothing_are_nothing() -> None:
    """No figure is made of no replicate."""
    nothing = np.array([np.nan, np.nan])
    assert share(0, 0) is None
    assert proportion(np.zeros(0, dtype=bool)) is None
    assert mean(nothing) is None
    assert quantile(nothing, 0.5) is None
    assert root_mean_square(nothing, 1.0) is None
    assert relative_bias(nothing, 1.0) is None
    assert jackknifed(lambda mask: float("nan"), 10) is None
    assert shifted(None, 1.0) is None


def test_a_p_value_is_never_nothing() -> None:
    """None of 1,999 replicates is as extreme: p is 1 of 2,000; all of them: 1."""
    assert tail_share(0, 1999).value == 1 / 2000
    assert tail_share(1999, 1999).value == 1.0
    assert (tail_share(1999, 1999).mc_error or 0) > 0


def test_a_mean_has_the_standard_error_of_scipy_and_passes_over_nan() -> None:
    """What is NaN is not counted."""
    values = np.random.default_rng(3).gamma(2.0, size=300)
    got = mean(np.append(values, [np.nan, np.nan]))
    assert got is not None
    assert got.value == pytest.approx(values.mean(), rel=1e-9)
    assert got.mc_error == pytest.approx(scipy.stats.sem(values), rel=1e-9)


def test_a_single_replicate_shows_no_error() -> None:
    """One value has a mean and no spread."""
    one = np.array([2.0])
    assert mean(one) == Estimate(value=2.0, mc_error=None)
    assert quantile(one, 0.5) == Estimate(value=2.0, mc_error=None)
    assert root_mean_square(one, 4.0) == Estimate(value=0.5, mc_error=None)
    assert jackknifed(lambda mask: 2.0, 1) == Estimate(value=2.0, mc_error=None)


def test_sums_do_not_hang_on_the_order_of_replicates() -> None:
    """Values of very different size, shuffled, have the same mean to the last bit."""
    values = 10.0 ** np.random.default_rng(4).uniform(-12, 12, 500)
    assert mean(values) == mean(values[::-1]) == mean(np.sort(values))


def errors_and_spread(figure: Callable[[np.ndarray], Estimate | None], count: int) -> tuple[float, float]:
    """The mean of the errors told in many samples of normal numbers, and how far the figure strays."""
    random = np.random.default_rng(5)
    made = [figure(random.normal(3.0, 2.0, count)) for _ in range(2000)]
    assert all(made)
    errors = [one.mc_error or 0.0 for one in made if one]
    return float(np.sqrt(np.mean(np.square(errors)))), float(np.std([one.value for one in made if one]))


@pytest.mark.parametrize("level", [0.05, 0.5, 0.95])
def test_the_error_of_a_quantile_is_how_far_it_strays(level: float) -> None:
    """Over 2,000 samples of 1,000 the told error is within 8 % of the spread (its own bound is 1.6 %)."""
    told, true = errors_and_spread(lambda values: quantile(values, level), 1000)
    assert told == pytest.approx(true, rel=0.08)
    density = scipy.stats.norm.pdf(scipy.stats.norm.ppf(level)) / 2.0
    assert told == pytest.approx((level * (1 - level) / 1000) ** 0.5 / density, rel=0.08)


def test_a_quantile_is_that_of_numpy() -> None:
    """Linear between order statistics."""
    values = np.random.default_rng(6).normal(size=101)
    got = quantile(np.append(values, np.nan), 0.95)
    assert got is not None
    assert got.value == pytest.approx(np.quantile(values, 0.95), rel=1e-9)


def test_the_errors_of_ratios_are_how_far_they_stray() -> None:
    """Delta method and jackknife, over 2,000 samples of 400."""
    told, true = errors_and_spread(lambda values: root_mean_square(values, 2.0), 400)
    assert told == pytest.approx(true, rel=0.08)
    told, true = errors_and_spread(lambda values: relative_bias(values, -4.0), 400)
    assert told == pytest.approx(true, rel=0.08)
    told, true = errors_and_spread(
        lambda values: jackknifed(lambda mask: float(values[mask].std() / values[mask].mean()), len(values)),
        400,
    )
    assert told == pytest.approx(true, rel=0.08)


def test_ratios_need_something_to_divide_by() -> None:
    """A truth of 0, or one that is not known, has no relative bias; no unit, no ratio."""
    values = np.array([1.0, 2.0])
    assert relative_bias(values, 0.0) is None
    assert relative_bias(values, float("nan")) is None
    assert root_mean_square(values, float("nan")) is None
    assert root_mean_square(values, 0.0) is None
    assert relative_bias(np.array([3.0, 5.0]), 2.0) == Estimate(value=1.0, mc_error=0.5)


def test_the_jackknife_of_a_mean_is_its_standard_error() -> None:
    """With a group for each replicate both are the same number."""
    values = np.random.default_rng(7).normal(size=40)
    got = jackknifed(lambda mask: float(values[mask].mean()), 40)
    assert got is not None
    assert got.mc_error == pytest.approx(scipy.stats.sem(values), rel=1e-8)
