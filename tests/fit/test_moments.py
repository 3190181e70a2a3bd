"""Moments are exact: fractions of Python as judge, whatever the order, blocks, threads or scale."""

from __future__ import annotations

import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from threadpoolctl import threadpool_limits

from beforehand.fit import moments as module
from beforehand.fit.columns import Factor, Key
from beforehand.fit.moments import ArraySource, moments_of, named

FINITE = st.floats(allow_nan=False, allow_infinity=False, allow_subnormal=True)
MODEST = st.floats(-1e6, 1e6).map(lambda value: value if value == 0 or abs(value) > 1e-200 else 0.0)


def held(columns):
    """Keys, source and moments of plain arrays, by name."""
    keys = [named(name) for name in columns]
    source = ArraySource(
        {key: np.asarray(values, float) for key, values in zip(keys, columns.values(), strict=True)}
    )
    return keys, source, moments_of(source, keys)


def exact_sum(moments, key):
    """The sum that is held, as a fraction."""
    place = moments.places[key]
    return Fraction(int(moments.sums[place])) * Fraction(2) ** moments.units[place]


def exact_product(moments, a, b):
    """The cross-product that is held, as a fraction."""
    i, j = moments.places[a], moments.places[b]
    return Fraction(int(moments.products[i, j])) * Fraction(2) ** (moments.units[i] + moments.units[j])


def assert_is(moments, columns):
    """Sums and cross-products are those of fractions, without any rounding."""
    whole = {name: [Fraction(float(v)) for v in values] for name, values in columns.items()}
    assert moments.n == len(next(iter(whole.values())))
    for name, values in whole.items():
        assert exact_sum(moments, named(name)) == sum(values)
        for other, others in whole.items():
            expected = sum((a * b for a, b in zip(values, others, strict=True)), Fraction(0))
            assert exact_product(moments, named(name), named(other)) == expected


def assert_same(one, other):
    """Two sets of moments say the same, whatever the units and the order of columns."""
    assert one.n == other.n
    assert set(one.keys) == set(other.keys)
    for a in one.keys:
        assert exact_sum(one, a) == exact_sum(other, a)
        for b in one.keys:
            assert exact_product(one, a, b) == exact_product(other, a, b)


def drawn(n, k, seed):
    """Columns of very different size, not centred."""
    rng = np.random.default_rng(seed)
    values = (rng.normal(size=(n, k)) + rng.integers(0, 5, size=k)) * 10.0 ** rng.integers(-9, 10, size=k)
    return {f"x{j}": values[:, j] for j in range(k)}


@settings(max_examples=60, deadline=None, derandomize=True)
@given(arrays(np.float64, (5, 3), elements=FINITE))
def test_sums_and_products_are_those_of_fractions(block):
    """Any finite doubles, 1e-300 beside 1e300 and subnormals: the sums hold every bit (by fractions)."""
    columns = {f"x{j}": block[:, j] for j in range(3)}
    assert_is(held(columns)[2], columns)


@pytest.mark.parametrize(
    "values",
    [
        [1e-300, 1e300, -1e300, 3.0],
        [5e-324, 1e-310, -2.5e-323, 0.0],
        [0.0, 0.0, 0.0, 0.0],
        [-0.0, 0.0, 7.0, 7.0],
        [0.1, 0.1, 0.1, 0.1],
        [1.7976931348623157e308, -1.7976931348623157e308, 5e-324, 1.0],
    ],
)
def test_extreme_columns_beside_an_ordinary_one(values):
    """Extremes, zeros and constants are held exactly (by fractions)."""
    columns = {"extreme": values, "ordinary": [0.1, 2.0, -3.3, 4.0]}
    assert_is(held(columns)[2], columns)


def test_blocks_threads_and_row_order_do_not_matter(monkeypatch):
    """One block or many, one thread or two, rows in any order: the same integers, bit for bit."""
    columns = drawn(3000, 6, 2)
    keys, source, whole = held(columns)
    order = np.random.default_rng(0).permutation(3000)
    for rows in (8192, 1000, 7):
        monkeypatch.setattr(module, "BLOCK_ROWS", rows)
        for threads in (1, 2):
            with threadpool_limits(threads):
                again = moments_of(source, keys)
                shuffled = held({name: values[order] for name, values in columns.items()})[2]
            for other in (again, shuffled):
                assert (other.units, other.tops) == (whole.units, whole.tops)
                assert (other.sums == whole.sums).all()
                assert (other.products == whole.products).all()


def test_running_sums_are_carried_over_before_they_are_full(monkeypatch):
    """Moving the running sums of blocks to Python's integers early or late changes nothing (fractions)."""
    columns = drawn(90, 2, 3)
    monkeypatch.setattr(module, "BLOCK_ROWS", 5)
    monkeypatch.setattr(module, "_FLUSH", 2)
    assert_is(held(columns)[2], columns)


def test_column_order_does_not_matter():
    """Columns named in another order give the same sums and cross-products."""
    columns = drawn(50, 5, 4)
    keys, source, one = held(columns)
    assert_same(one, moments_of(source, keys[::-1]))


def test_a_key_named_twice_is_held_once():
    """Repeated keys are one column."""
    keys, source, _ = held({"a": [1.0, 2.0], "b": [3.0, 5.0]})
    assert moments_of(source, [*keys, keys[0]]).keys == tuple(keys)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(arrays(np.float64, (6, 4), elements=FINITE))
def test_extended_is_all_at_once(block):
    """Columns added later, one by one or together, equal one pass over all, for any finite doubles."""
    keys, source, whole = held({f"x{j}": block[:, j] for j in range(4)})
    assert_same(moments_of(source, keys[:2]).extended(source, keys[2:]), whole)
    one_by_one = moments_of(source, [])
    for key in keys:
        one_by_one = one_by_one.extended(source, [key])
    assert_same(one_by_one, whole)
    assert one_by_one.keys == whole.keys


def test_extended_by_nothing_new_is_itself():
    """Nothing is read when every column is held already."""
    keys, _, whole = held({"a": [1.0, 2.0], "b": [3.0, 5.0]})
    assert whole.extended(ArraySource({}), keys) is whole
    assert keys[0] in whole
    assert named("c") not in whole


@settings(max_examples=40, deadline=None, derandomize=True)
@given(arrays(np.float64, (7, 3), elements=FINITE), st.sets(st.integers(0, 6), max_size=5))
def test_without_rows_is_the_moments_of_the_others(block, gone):
    """Rows taken out exactly: the moments of the remaining rows, for any finite doubles."""
    keys, _, whole = held({f"x{j}": block[:, j] for j in range(3)})
    left = whole.without(block[sorted(gone)])
    rest = np.delete(block, sorted(gone), axis=0)
    assert_same(left, held({f"x{j}": rest[:, j] for j in range(3)})[2])
    assert left.keys == tuple(keys)


def test_extending_moments_that_lost_rows():
    """Rows out, then a column in from the remaining rows: the moments of what is left."""
    columns = drawn(40, 3, 5)
    _, _, whole = held({"x0": columns["x0"], "x1": columns["x1"]})
    gone = [3, 17, 39]
    left = {name: np.delete(values, gone) for name, values in columns.items()}
    rows = np.column_stack([columns["x0"][gone], columns["x1"][gone]])
    all_keys, rest, fresh = held(left)
    assert_same(whole.without(rows).extended(rest, all_keys), fresh)


def test_restricted_to_some_columns():
    """Fewer columns in another order: the same sums and products."""
    columns = drawn(20, 4, 6)
    keys, source, whole = held(columns)
    some = [keys[3], keys[1], keys[3]]
    assert_same(whole.restricted(some), moments_of(source, some))
    assert whole.restricted(some).keys == (keys[3], keys[1])
    assert whole.index(some) == [3, 1, 3]


@settings(max_examples=60, deadline=None, derandomize=True)
@given(arrays(np.float64, 6, elements=FINITE))
def test_mean_and_sd_are_rounded_once(values):
    """The mean is the nearest double to the exact one; the standard deviation within an ulp (mpmath)."""
    keys, _, moments = held({"x": values})
    whole = [Fraction(float(v)) for v in values]
    mean = sum(whole) / 6
    assert moments.mean(keys[0]) == float(mean)
    variance = sum((v - mean) ** 2 for v in whole) / 5
    with mpmath.workdps(60):
        sd = float(mpmath.sqrt(mpmath.mpf(variance.numerator) / variance.denominator))
    assert math.isclose(moments.sd(keys[0]), sd, rel_tol=2e-16, abs_tol=5e-324)


def test_scaling_a_column_scales_its_mean_and_sd():
    """A power of two scales both exactly."""
    values = np.random.default_rng(7).normal(size=30) + 3
    keys, _, one = held({"x": values, "y": values * 2.0**200, "z": values * 2.0**-300})
    for key, power in ((keys[1], 200), (keys[2], -300)):
        assert one.mean(key) == math.ldexp(one.mean(keys[0]), power)
        assert one.sd(key) == math.ldexp(one.sd(keys[0]), power)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(arrays(np.float64, (6, 2), elements=MODEST))
def test_correlation_is_that_of_fractions(block):
    """Pearson's correlation to the last digit, 0 where a column is constant (by fractions, mpmath)."""
    keys, _, moments = held({"a": block[:, 0], "b": block[:, 1]})
    a, b = ([Fraction(float(v)) for v in block[:, j]] for j in (0, 1))
    a, b = [v - sum(a) / 6 for v in a], [v - sum(b) / 6 for v in b]
    aa, bb, ab = (sum(p * q for p, q in zip(*two, strict=True)) for two in ((a, a), (b, b), (a, b)))
    if aa == 0 or bb == 0:
        assert moments.correlation(*keys) == 0.0
        assert moments.cross(keys, centred=True)[0, 1] == 0.0
        return
    with mpmath.workdps(60):
        square = mpmath.mpf((ab * ab / aa / bb).numerator) / (ab * ab / aa / bb).denominator
        expected = math.copysign(float(mpmath.sqrt(square)), ab)
    assert math.isclose(moments.correlation(*keys), expected, rel_tol=3e-16, abs_tol=1e-70)
    assert moments.correlation(*keys) == moments.correlation(*keys[::-1])
    assert moments.cross(keys, centred=True)[0, 1] == moments.correlation(*keys)


def test_correlation_of_a_column_with_its_multiple_is_one():
    """Exactly 1 and -1, whatever the scale."""
    x = np.random.default_rng(8).normal(size=20)
    keys, _, moments = held({"x": x, "y": x * 2.0**70, "z": -x})
    assert moments.correlation(keys[0], keys[1]) == 1.0
    assert moments.correlation(keys[0], keys[2]) == -1.0


@pytest.mark.parametrize(
    ("values", "constant"),
    [
        ([0.1] * 5, True),
        ([0.0] * 5, True),
        ([0.1] * 4 + [0.1 + 5e-18], True),
        ([1.0] * 4 + [1.0 + 2.3e-16], False),
        ([1e300] * 4 + [np.nextafter(1e300, 0)], False),
    ],
)
def test_constant_means_one_value_only(values, constant):
    """A difference in the last bit is a difference (0.1 + 5e-18 is 0.1 in doubles)."""
    keys, _, moments = held({"x": values})
    assert moments.constant(keys[0]) is constant
    assert (moments.sd(keys[0]) == 0.0) is constant


def test_raw_products_are_rounded_once():
    """Cross-products about 0 are the nearest doubles (by fractions)."""
    columns = drawn(25, 3, 9)
    keys, _, moments = held(columns)
    found = moments.raw(keys[:2], keys)
    for i in range(2):
        for j in range(3):
            pairs = zip(columns[f"x{i}"], columns[f"x{j}"], strict=True)
            exact = sum(Fraction(float(a)) * Fraction(float(b)) for a, b in pairs)
            assert found[i, j] == float(exact)


@pytest.mark.parametrize("centred", [True, False])
def test_cross_products_have_a_unit_diagonal(centred):
    """Scaled cross-products as numpy's, with a diagonal of ones; a column without spread gives zeros."""
    columns = {f"x{j}": values / np.abs(values).max() for j, values in enumerate(drawn(30, 3, 10).values())}
    keys, _, moments = held({**columns, "same": np.full(30, 0.3)})
    found = moments.cross(keys[:3], centred=centred)
    wide = np.column_stack(list(columns.values()))
    wide = wide - wide.mean(axis=0) * centred
    unit = wide / np.linalg.norm(wide, axis=0)
    np.testing.assert_allclose(found, unit.T @ unit, rtol=1e-12, atol=1e-13)
    assert (np.diag(found) == 1.0).all()
    if centred:
        assert (moments.cross(keys, centred=True)[3] == 0.0).all()


def test_array_source_reads_rows_of_columns():
    """A plain source gives the rows asked for, and has none when it has no columns."""
    source = ArraySource({named("a"): np.array([1.0, 2.0, 3.0])})
    assert source.n_rows == 3
    assert source.read(named("a"), 1, 3).tolist() == [2.0, 3.0]
    assert ArraySource({}).n_rows == 0
    assert named("a") == Key((Factor("a"),))
