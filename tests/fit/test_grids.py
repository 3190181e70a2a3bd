"""Paired doubles against fractions, and the two grids against each other and against statsmodels."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
import statsmodels.api as sm
from hypothesis import given, settings
from hypothesis import strategies as st

from beforehand.fit import grids
from beforehand.fit.fitting import fit_of
from beforehand.fit.grids import Pairs, Whole, paired
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.pairs import Pair, difference, product, total
from beforehand.fit.sweeping import ONE, start, swept
from beforehand.fit.tableau import tableau_of

SIZED = st.floats(-1e60, 1e60, allow_nan=False, allow_subnormal=False).filter(
    lambda v: v == 0 or abs(v) > 1e-60
)


def pair(high, low):
    """A pair of one number, tidied."""
    added = high + low
    return Pair(np.array([added]), np.array([low - (added - high)]))


def exact(value):
    """What a pair of one number stands for."""
    return Fraction(float(value.high.ravel()[0])) + Fraction(float(value.low.ravel()[0]))


@settings(max_examples=300, deadline=None)
@given(SIZED, SIZED, st.floats(-1, 1), st.floats(-1, 1))
def test_products_and_differences_to_a_hundred_bits(a, b, c, d):
    """Within 2^-100 of the exact product, and of the sizes that a difference is made of (fractions)."""
    one, other = pair(a, a * c * 2.0**-54), pair(b, b * d * 2.0**-54)
    wanted = exact(one) * exact(other)
    assert abs(exact(product(one, other)) - wanted) <= abs(wanted) * Fraction(1, 2**100)
    sizes = abs(exact(one)) + abs(exact(other))
    assert abs(exact(difference(one, other)) - (exact(one) - exact(other))) <= sizes * Fraction(1, 2**100)


@settings(max_examples=50, deadline=None)
@given(st.lists(SIZED, min_size=1, max_size=40))
def test_totals_to_a_hundred_bits(values):
    """Whatever the number of terms, within 2^-97 of the sum of their sizes."""
    found = total(Pair(np.array(values), np.zeros(len(values))))
    wanted = sum(map(Fraction, values), Fraction(0))
    size = sum((abs(Fraction(value)) for value in values), Fraction(0))
    assert abs(exact(Pair(found.high.reshape(1), found.low.reshape(1))) - wanted) <= size * Fraction(1, 2**97)


def drawn(seed, n=400, k=70, mix=0.3, offset=3):
    """Columns that hang together a little, an outcome, and their keys and moments."""
    rng = np.random.default_rng(seed)
    x = rng.normal(size=(n, k)) + mix * rng.normal(size=(n, 1))
    x = x * 10.0 ** rng.integers(-4, 5, size=k) + rng.integers(0, offset, size=k)
    y = x[:, 0] + rng.normal(size=n)
    keys = [named(f"x{j}") for j in range(k)]
    source = ArraySource({**{key: x[:, j] for j, key in enumerate(keys)}, named("y"): y})
    return x, y, keys, moments_of(source, (*keys, named("y")))


def both(seed=1, k=70):
    """The same swept matrix as paired doubles and as integers."""
    _, _, keys, moments = drawn(seed, k=k)
    matrix, _, _ = start(moments, (*keys, named("y")), True)
    quick = paired(matrix, k)
    for place in range(k):
        matrix = swept(matrix, place)
    return quick, Whole(matrix)


def close(one, other, bits=75):
    """Two fixed-point numbers of size about 1 or above, alike to so many bits."""
    return abs(one - other) <= (max(abs(other), ONE) >> bits)


def test_paired_doubles_give_what_integers_give():
    """Every entry, form, part and sweep out, to 75 bits."""
    quick, slow = both()
    assert quick is not None
    assert all(map(close, quick.integers().ravel().tolist(), slow.integers().ravel().tolist()))
    assert all(map(close, quick.diagonal(), slow.diagonal()))
    assert all(map(close, quick.column(-1), slow.column(-1)))
    assert close(quick.entry(3, 5), slow.entry(3, 5))
    line = [ONE // (place + 1) for place in range(70)]
    assert all(map(close, quick.times(line), slow.times(line)))
    forms = [sum(a * b for a, b in zip(grid.times(line), line, strict=True)) // ONE for grid in (quick, slow)]
    assert close(*forms)
    quick, slow = quick.without(4), slow.without(4)
    assert all(map(close, quick.integers().ravel().tolist(), slow.integers().ravel().tolist()))
    places = [2, 7, 69]
    assert all(map(close, quick.part(places).integers().ravel(), slow.part(places).integers().ravel()))


def test_solutions_of_both_grids_are_the_same_doubles():
    """Slopes and roots of variances, each to the last digit or one beside it."""
    quick, slow = both(seed=2)
    for one, other in zip(quick.solution(329), slow.solution(329), strict=True):
        assert np.allclose(one, other, rtol=3e-16, atol=0.0)


@pytest.mark.parametrize("intercept", [True, False])
def test_a_backward_path_from_many_columns(intercept, monkeypatch):
    """Seventy columns, then ever fewer: the same fits by either grid, and those of statsmodels."""
    x, y, keys, moments = drawn(3, offset=3 if intercept else 1)
    quick = tableau_of(moments, named("y"), keys, intercept=intercept)
    assert isinstance(quick.grid, Pairs)
    monkeypatch.setattr(grids, "FEWEST_PAIRED", 10**6)
    slow = tableau_of(moments, named("y"), keys, intercept=intercept)
    assert isinstance(slow.grid, Whole)
    for gone in (keys[5], keys[60], keys[33]):
        quick, slow = quick.without([gone]), slow.without([gone])
        one = fit_of(quick, {"x0": (keys[0],), "some": tuple(keys[7:10])})
        other = fit_of(slow, {"x0": (keys[0],), "some": tuple(keys[7:10])})
        for a, b in zip(one.coefficients, other.coefficients, strict=True):
            assert math.isclose(a.estimate, b.estimate, rel_tol=1e-15)
            assert math.isclose(a.standard_error, b.standard_error, rel_tol=1e-15)
        assert math.isclose(one.tests["some"].statistic, other.tests["some"].statistic, rel_tol=1e-13)
    design = np.column_stack([x[:, j] for j, key in enumerate(keys) if key in quick.keys])
    judge = sm.OLS(y, sm.add_constant(design, has_constant="add") if intercept else design).fit()
    assert np.allclose([c.estimate for c in one.coefficients], judge.params, rtol=1e-8)
    assert np.allclose([c.standard_error for c in one.coefficients], judge.bse, rtol=1e-8)


def test_designs_that_paired_doubles_do_not_stand_go_to_integers():
    """Too few columns, a near dependence and an exact one are handed back."""
    _, _, keys, moments = drawn(4)
    matrix, _, _ = start(moments, (*keys, named("y")), True)
    assert paired(matrix, 70) is not None
    few, _, _ = start(moments, (*keys[:20], named("y")), True)
    assert paired(few, 20) is None
    for noise in (1e-7, 0.0):
        x, y, keys, _ = drawn(4)
        x[:, 69] = x[:, 1] + x[:, 2] + noise * np.random.default_rng(0).normal(size=len(x))
        source = ArraySource({**{key: x[:, j] for j, key in enumerate(keys)}, named("y"): y})
        moments = moments_of(source, (*keys, named("y")))
        matrix, _, _ = start(moments, (*keys, named("y")), True)
        assert paired(matrix, 70) is None
