"""Descriptives and sums against scipy, fractions and the order of rows."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
from scipy import stats

from beforehand.fit.descriptives import describe, shape_of
from beforehand.fit.sums import exact_mean, exact_sum, sums_by_group


def test_sum_is_the_exactly_rounded_one() -> None:
    """Sums equal Python's exactly rounded sum, at every scale and across blocks."""
    random = np.random.default_rng(31)
    for scale in (1.0, 1e5, 1e-300, 1e280, 1e300):
        for size in (0, 1, 2, 1000, 32_768, 70_001):
            values = random.standard_normal(size) * scale * 10.0 ** random.uniform(-6, 3, size)
            assert exact_sum(values) == math.fsum(values.tolist())


def test_sum_of_what_cancels() -> None:
    """Large values that cancel leave the small ones behind to the last digit."""
    values = np.array([1e100, 1.0, -1e100, 2.0**-60, 3e-300])
    assert exact_sum(values) == 1.0 + 2.0**-60
    assert exact_sum(np.array([5e-324, 5e-324])) == 1e-323


def test_sums_by_group_are_exact_and_without_order() -> None:
    """Group sums agree with exact sums of each group and do not feel a shuffle."""
    random = np.random.default_rng(32)
    values = random.standard_normal(5000) * 10.0 ** random.uniform(-8, 8, 5000)
    groups = random.integers(0, 40, 5000)
    found = sums_by_group(values, groups, 41)
    for group in range(40):
        exact = math.fsum(values[groups == group].tolist())
        assert found[group] == pytest.approx(exact, rel=1e-15, abs=1e-9)
    assert found[40] == 0.0
    shuffled = random.permutation(5000)
    assert np.array_equal(sums_by_group(values[shuffled], groups[shuffled], 41), found)


def test_exact_shape_of_the_tiny_table() -> None:
    """Residuals 2/7, 34/35 … have squared skewness 137780/1296351 and kurtosis 996997/568575."""
    residuals = [Fraction(value, 35) for value in (10, 34, -47, 12, -69, 60)]
    shape = shape_of(np.array([float(value) for value in residuals]))
    assert shape.skewness**2 == pytest.approx(float(Fraction(137780, 1296351)), rel=1e-13)
    assert shape.kurtosis == pytest.approx(float(Fraction(996997, 568575)), rel=1e-13)


@pytest.mark.parametrize("size", [2, 3, 4, 5, 6, 7, 50, 1001])
def test_as_scipy_and_numpy(size: int) -> None:
    """Mean, sd, quartiles, skewness and kurtosis agree with numpy and scipy."""
    random = np.random.default_rng(size)
    for scale, shift in [(1.0, 0.0), (1e-200, 0.0), (1e200, 0.0), (3.0, 1e6)]:
        values = random.gamma(2.0, size=size) * scale + shift
        found = describe(values)
        assert (found.n, found.missing) == (size, 0)
        assert found.mean == pytest.approx(values.mean(), rel=1e-14)
        unit = values / scale
        assert found.sd == pytest.approx(np.std(unit, ddof=1) * scale, rel=1e-9)
        quartiles = np.quantile(values, [0, 0.25, 0.5, 0.75, 1])
        given = [found.minimum, found.lower_quartile, found.median, found.upper_quartile, found.maximum]
        assert given == pytest.approx(quartiles.tolist(), rel=1e-14)
        assert found.skewness == pytest.approx(stats.skew(unit), rel=1e-7, abs=1e-9)
        assert found.kurtosis == pytest.approx(stats.kurtosis(unit, fisher=False), rel=1e-7)


def test_large_mean_costs_no_digits() -> None:
    """Values with a mean a million times their spread keep the spread exact."""
    whole = [1, 3, 2, 5, 4, 9]
    found = describe(np.array([10.0**9 + value for value in whole]))
    assert found.sd == pytest.approx(math.sqrt(8.0), rel=1e-14)
    assert found.mean == 10**9 + 4


def test_order_of_rows_does_not_matter() -> None:
    """A shuffle changes no bit of the description."""
    random = np.random.default_rng(33)
    values = random.lognormal(size=4000)
    values[::7] = np.nan
    values[1] = -0.0
    values[2] = 0.0
    assert repr(describe(values)) == repr(describe(random.permutation(values)))


def test_missing_cells_are_counted_and_left_out() -> None:
    """Missing cells are counted; what remains is described."""
    found = describe(np.array([np.nan, 4.0, np.nan, 2.0]))
    assert (found.n, found.missing, found.mean, found.median) == (2, 2, 3.0, 3.0)


def test_constant_column_has_no_shape() -> None:
    """A constant column has spread 0 and no skewness; 0.1 thrice has the mean 0.1."""
    found = describe(np.array([0.1, 0.1, 0.1]))
    assert (found.mean, found.sd, found.skewness, found.kurtosis) == (0.1, 0.0, None, None)


def test_one_value_and_none() -> None:
    """One value has no sd; no value has nothing."""
    one = describe(np.array([7.0]))
    assert (one.n, one.mean, one.sd, one.median, one.skewness) == (1, 7.0, None, 7.0, None)
    none = describe(np.array([np.nan]))
    assert (none.n, none.missing, none.mean, none.sd, none.maximum) == (0, 1, None, None, None)


def test_mean_of_a_thousand_tenths() -> None:
    """The mean of exact sums has no drift."""
    assert exact_mean(np.full(1000, 0.1)) == 0.1
