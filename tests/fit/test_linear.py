"""Linear forms of rows keep their digits where terms cancel, and depend on nothing but the row."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from threadpoolctl import threadpool_limits

from beforehand.fit import linear
from beforehand.fit.linear import evaluated, forms_of
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.slices import BITS

NUMBERS = st.floats(-1e9, 1e9).map(lambda value: value if value == 0 or abs(value) > 1e-9 else 0.0)


def prepared(block, weights, constants, **options):
    """The forms and their source for the columns of a block."""
    keys = [named(f"x{j}") for j in range(block.shape[1])]
    source = ArraySource({key: np.ascontiguousarray(block[:, j]) for j, key in enumerate(keys)})
    tops = moments_of(source, keys).tops
    return source, forms_of(keys, tops, weights, constants, **options)


def values_of(source, forms):
    """All rows of the forms in one array."""
    return np.concatenate([values for _, _, values in evaluated(source, forms)])


def exact(block, weights, constants):
    """The forms by fractions."""
    return [
        [
            constants[q] + sum((Fraction(float(v)) * weights[k][q] for k, v in enumerate(row)), Fraction(0))
            for q in range(len(constants))
        ]
        for row in block
    ]


def drawn(n, k, q, seed):
    """Columns of unlike size, weights that are no doubles, constants."""
    rng = np.random.default_rng(seed)
    block = rng.normal(size=(n, k)) * 10.0 ** rng.integers(-6, 7, size=k)
    weights = [[Fraction(int(rng.integers(-999, 999)), 997) for _ in range(q)] for _ in range(k)]
    constants = [Fraction(int(rng.integers(-999, 999)), 7) for _ in range(q)]
    return block, weights, constants


@settings(max_examples=80, deadline=None, derandomize=True)
@given(st.lists(st.tuples(NUMBERS, NUMBERS, NUMBERS), min_size=1, max_size=5))
def test_values_are_right_to_an_ulp(rows):
    """Whatever the numbers, the sum of the products is rounded once, or nearly so (by fractions)."""
    block = np.array(rows)
    weights = [
        [Fraction(1, 3), Fraction(-2)],
        [Fraction(10**9), Fraction(1, 7)],
        [Fraction(-5, 11), Fraction(0)],
    ]
    constants = [Fraction(1, 9), Fraction(-1000)]
    found = values_of(*prepared(block, weights, constants))
    expected = exact(block, weights, constants)
    # Beyond a double's digits below the largest term another 40 bits are kept.
    room = float(np.abs(block).max(initial=0)) * 1e9 * 2.0**-90
    for row, wanted in zip(found, expected, strict=True):
        for value, one in zip(row, wanted, strict=True):
            assert math.isclose(value, float(one), rel_tol=4e-16, abs_tol=room)


def test_cancelling_terms_keep_their_digits():
    """Terms of 1e12 that leave 1e-6: fourteen digits of what is left (by fractions)."""
    rng = np.random.default_rng(1)
    a = rng.normal(size=200) * 1e12
    b = a / 3 + rng.normal(size=200) * 1e-3
    block = np.column_stack([a, b])
    weights, constants = [[Fraction(-1, 3)], [Fraction(1)]], [Fraction(1, 10**7)]
    found = values_of(*prepared(block, weights, constants))[:, 0]
    for value, (one,) in zip(found, exact(block, weights, constants), strict=True):
        assert math.isclose(value, float(one), rel_tol=1e-14)


def test_constants_that_cancel_the_terms():
    """A constant enters with more than a double's digits (by fractions)."""
    block = np.full((3, 1), 0.1)
    third = Fraction(1, 3)
    found = values_of(*prepared(block, [[third]], [-third * Fraction(0.1) + Fraction(1, 10**25)]))
    np.testing.assert_allclose(found, np.full((3, 1), 1e-25), rtol=1e-6)


@pytest.mark.parametrize("bit", [-30, -60, -90])
def test_the_lowest_bit_is_reached(bit):
    """With a wanted last bit, the value is right to that bit and to a double's rounding (by fractions)."""
    block, weights, constants = drawn(50, 4, 3, 2)
    found = values_of(*prepared(block, weights, constants, lowest_bit=bit))
    for row, wanted in zip(found, exact(block, weights, constants), strict=True):
        for value, one in zip(row, wanted, strict=True):
            assert (
                abs(Fraction(float(value)) - one) <= abs(one) * Fraction(1, 2**51) + Fraction(1, 2**-bit) * 8
            )


def test_more_digits_need_more_levels():
    """Levels follow the bits that are wanted, never fewer than three nor more than the most."""
    block, weights, constants = drawn(5, 2, 1, 3)
    levels = [
        prepared(block, weights, constants, lowest_bit=bit)[1].levels for bit in (100, -10, -60, -100_000)
    ]
    assert levels[0] == 3
    assert levels == sorted(levels)
    assert levels[-1] == linear.MOST_LEVELS
    assert prepared(block, weights, constants)[1].levels == -(-2 * linear.DOUBLE_BITS // BITS)


def test_blocks_threads_and_neighbours_do_not_matter(monkeypatch):
    """Any block size, one thread or two, rows alone or among others: the same doubles."""
    block, weights, constants = drawn(2000, 7, 6, 4)
    source, forms = prepared(block, weights, constants)
    whole = values_of(source, forms)
    for cells in (1 << 17, 1 << 12, 1):
        monkeypatch.setattr(linear, "BLOCK_CELLS", cells)
        for threads in (1, 2):
            with threadpool_limits(threads):
                assert (values_of(source, forms) == whole).all()
    alone = ArraySource({key: values[1234:1235] for key, values in source.columns.items()})
    assert (values_of(alone, forms) == whole[1234]).all()
    order = np.random.default_rng(0).permutation(2000)
    shuffled = ArraySource({key: values[order] for key, values in source.columns.items()})
    assert (values_of(shuffled, forms) == whole[order]).all()


def test_blocks_cover_all_rows_in_order():
    """Start and stop of the blocks run through all rows without gap."""
    block, weights, constants = drawn(20_001, 2, 1, 5)
    at = 0
    for start, stop, values in evaluated(*prepared(block, weights, constants)):
        assert start == at
        assert values.shape == (stop - start, 1)
        at = stop
    assert at == 20_001


def test_forms_of_no_column_are_their_constants():
    """Without columns each row has the constant."""
    source = ArraySource({named("x"): np.zeros(3)})
    forms = forms_of([], [], [], [Fraction(1, 3), Fraction(2)])
    assert values_of(source, forms).tolist() == [[1 / 3, 2.0]] * 3


def test_weights_of_zero():
    """A form of zero weights is its constant, beside forms of large weights."""
    block = np.array([[1e300], [-1e280]])
    found = values_of(*prepared(block, [[Fraction(0), Fraction(10)]], [Fraction(5), Fraction(0)]))
    assert found.tolist() == [[5.0, 1e301], [5.0, -1e281]]


@pytest.mark.parametrize("power", [-900, -40, 40, 900])
def test_a_power_of_two_scales_the_form(power):
    """Columns times 2^k and weights over 2^k: the same doubles."""
    block, weights, constants = drawn(30, 3, 2, 6)
    expected = values_of(*prepared(block, weights, constants))
    scaled = [[w / Fraction(2) ** power for w in row] for row in weights]
    assert (values_of(*prepared(np.ldexp(block, power), scaled, constants)) == expected).all()
