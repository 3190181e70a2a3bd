"""Fixed-point arithmetic and the sweep, against fractions."""

from __future__ import annotations

import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.sweeping import (
    BITS,
    DEPENDENCE_TOLERANCE,
    ONE,
    fixed,
    fixed_of,
    mean_of,
    power,
    scaled,
    square_root,
    start,
    swept,
    vanishes,
)

WHOLE = st.integers(-(10**30), 10**30)


@given(WHOLE, st.integers(-900, 900))
def test_fixed_point_and_back(value, shift):
    """A number times a power of two is cut below the last of ``BITS`` bits only (by fractions)."""
    exact = Fraction(value) * Fraction(2) ** shift
    assert exact - Fraction(1, ONE) < scaled(fixed(value, shift), 0) <= exact
    assert fixed_of(Fraction(value), shift) == fixed(value, shift)
    assert power(Fraction(value, 3), shift) == Fraction(value, 3) * Fraction(2) ** shift


@settings(deadline=None)
@given(st.integers(1, 10**40), st.integers(1, 10**40), st.integers(-900, 900))
def test_square_root_to_the_last_digit(numerator, denominator, shift):
    """Within an ulp of the root in 80 digits, for fractions of any size (mpmath)."""
    value = power(Fraction(numerator, denominator), 2 * shift)
    with mpmath.workdps(80):
        expected = float(mpmath.sqrt(mpmath.mpf(value.numerator) / value.denominator))
    assert math.isclose(square_root(value), expected, rel_tol=3e-16)


def test_square_root_of_nothing():
    """Rounding below 0 counts as 0."""
    assert square_root(Fraction(0)) == square_root(Fraction(-1, 10**80)) == 0.0


def test_mean_is_exact():
    """The mean of 0.1, 0.2 and 1e300 as the fraction that it is."""
    values = [0.1, 0.2, 1e300]
    moments = moments_of(ArraySource({named("x"): np.array(values)}), [named("x")])
    assert mean_of(moments, named("x")) == sum(map(Fraction, values)) / 3


def drawn(seed, k=4):
    """Keys and moments of columns of unlike size."""
    rng = np.random.default_rng(seed)
    values = (rng.normal(size=(20, k)) + 1.0) * 10.0 ** rng.integers(-200, 200, size=k)
    keys = [named(f"x{j}") for j in range(k)]
    return keys, moments_of(ArraySource({key: values[:, j] for j, key in enumerate(keys)}), keys)


@pytest.mark.parametrize("intercept", [True, False])
def test_the_start_is_scaled_to_one(intercept):
    """Whatever the size of the columns, the diagonal lies between 1/4 and 1, and no length is below it."""
    keys, moments = drawn(1)
    matrix, shifts, lengths = start(moments, keys, intercept)
    assert len(shifts) == 4
    for k in range(4):
        assert ONE // 4 <= matrix[k, k] <= ONE
        assert lengths[k] >= matrix[k, k]
    assert (matrix == matrix.T).all()


def test_a_sweep_out_undoes_a_sweep_in():
    """In and out again leaves the matrix, but for a few of the 256 bits (Goodnight 1979)."""
    keys, moments = drawn(2)
    matrix, _, _ = start(moments, keys, True)
    for k in range(4):
        again = swept(swept(matrix, k), k, out=True)
        assert max(abs(v) for v in (again - matrix).ravel().tolist()) < 1 << (BITS - 200)


def test_all_columns_swept_in_are_the_negated_inverse():
    """Times the matrix before, the result is minus one on the diagonal and 0 beside it."""
    keys, moments = drawn(3)
    before, _, _ = start(moments, keys, False)
    after = before
    for k in range(4):
        after = swept(after, k)
    product = before @ after
    for i in range(4):
        for j in range(4):
            assert abs(Fraction(int(product[i, j]), ONE * ONE) + (i == j)) < Fraction(1, 10**50)


def test_what_vanishes():
    """A pivot at or below the squared tolerance of its column's squared length, 0 and below."""
    limit = Fraction(DEPENDENCE_TOLERANCE) ** 2 * ONE
    assert vanishes(math.floor(limit), ONE)
    assert not vanishes(math.floor(limit) + 1, ONE)
    assert vanishes(0, 0)
    assert vanishes(-1, ONE)
