"""Slices add up to what was cut, hold integers of few bits, and multiply without rounding."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from threadpoolctl import threadpool_limits

from beforehand.fit.slices import BITS, BLOCK_ROWS, exponents_of, sliced

FINITE = st.floats(allow_nan=False, allow_infinity=False, allow_subnormal=True)


def put_together(slices, top, row, column):
    """The exact value that the slices of one cell stand for."""
    total = Fraction(0)
    for depth, one in enumerate(slices):
        total += Fraction(float(one[row, column])) * Fraction(2) ** (int(top[column]) - BITS * (depth + 1))
    return total


def test_a_block_of_products_fits_into_a_double():
    """Two slices of BITS bits times a block of rows stay within 53 bits (by definition of the constants)."""
    assert 2 * BITS + BLOCK_ROWS.bit_length() - 1 <= 53


@pytest.mark.parametrize(
    ("value", "exponent"),
    [(1.0, 1), (-1.0, 1), (0.75, 0), (2.0**40, 41), (5e-324, -1073), (-1.7e308, 1024), (3.0, 2)],
)
def test_exponent_is_the_smallest_power_of_two_above(value, exponent):
    """The e with 2^(e-1) <= |x| < 2^e, subnormals and the largest doubles too (frexp's definition)."""
    assert exponents_of(np.array([[value], [0.0]])).tolist() == [exponent]


def test_exponents_of_zeros_and_of_no_rows():
    """A column of zeros, and one without rows, is far below every other column."""
    assert exponents_of(np.zeros((3, 2))).tolist() == [-5000, -5000]
    assert exponents_of(np.empty((0, 2))).tolist() == [-5000, -5000]


@settings(max_examples=150, deadline=None, derandomize=True)
@given(arrays(np.float64, (3, 2), elements=FINITE))
def test_slices_add_up_to_what_was_cut(block):
    """Any finite doubles, however far apart, are the exact sum of their slices (by fractions)."""
    top = exponents_of(block)
    top = np.where(top < -4000, 0, top)
    slices = sliced(block, top)
    for row in range(3):
        for column in range(2):
            assert put_together(slices, top, row, column) == Fraction(float(block[row, column]))


@settings(max_examples=100, deadline=None, derandomize=True)
@given(arrays(np.float64, (4, 2), elements=FINITE))
def test_slices_are_integers_of_few_bits(block):
    """Each slice holds integers of at most 2^BITS in size."""
    top = exponents_of(block)
    for one in sliced(block, np.where(top < -4000, 0, top)):
        assert (one == np.rint(one)).all()
        assert np.abs(one).max() <= 2.0**BITS


@pytest.mark.parametrize("value", [0.0, 1.0, 0.1, -0.3, 5e-324, 1.7976931348623157e308])
def test_a_double_needs_no_more_than_four_slices_at_its_own_size(value):
    """53 bits in slices of 20 bits, of which a balanced one wastes one: at most 4 (arithmetic)."""
    block = np.array([[value]])
    top = exponents_of(block)
    assert len(sliced(block, np.where(top < -4000, 0, top))) <= 4


@pytest.mark.parametrize("threads", [1, 2])
def test_products_of_slices_are_exact(threads):
    """The largest sums that can occur, of a full block, equal those of Python's integers; any threads."""
    rng = np.random.default_rng(1)
    block = np.where(rng.random((BLOCK_ROWS, 3)) < 0.5, -1.0, 1.0) * np.nextafter(1.0, 0.0)
    block[:, 0] = np.nextafter(1.0, 0.0)
    first = sliced(block, exponents_of(block))[0]
    with threadpool_limits(threads):
        product = first.T @ first
    whole = first.astype(np.int64).astype(object)
    assert (product.astype(np.int64).astype(object) == whole.T @ whole).all()
    assert product[0, 0] == float(BLOCK_ROWS) * 2.0 ** (2 * BITS)
