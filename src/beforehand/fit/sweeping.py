"""Fixed-point arithmetic on cross-products, and the sweep (Goodnight 1979) that all fits come from.

Matrices are integers of ``BITS`` bits after the point; each column has a scale of its own, a power of
two, that brings its diagonal near to 1.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction

import numpy as np

from beforehand.faults import NumericalError
from beforehand.fit.columns import Key
from beforehand.fit.moments import Integers, Moments

# Fixed-point fraction: 77 decimal digits, of which a condition number of 1e10 costs twenty.
BITS = 256
ONE = 1 << BITS

# A column whose part that is not explained by the ones before is smaller than this share of its own
# length is an exact combination of them: rounding of doubles leaves about 1e-16, honest data more.
DEPENDENCE_TOLERANCE = 1e-13


class RankDeficient(NumericalError):  # noqa: N818 - named by what is so
    """A column is an exact combination of the others."""

    code = "rank_deficient"


def start(
    moments: Moments, keys: Sequence[Key], intercept: bool
) -> tuple[Integers, tuple[int, ...], list[int]]:
    """The matrix before any sweep.

    Parameters
    ----------
    moments : Moments
    keys : sequence of Key, length k
    intercept : bool
        Cross-products about the means; otherwise about 0.

    Returns
    -------
    matrix : integers, shape (k, k)
        Times n, each column over ``2**shift``.
    shifts : tuple of int, length k
    lengths : list of int, length k
        Squared length of each column about 0, in the units of the matrix.
    """
    about = moments.about(keys, centred=intercept)
    raw = moments.about(keys, centred=False)
    half = [(int(about[i, i]).bit_length() + 1) // 2 for i in range(len(keys))]
    # (about << 2 wide) >> (half_i + half_j) without a negative shift, then down to BITS.
    wide = max(2 * BITS, *half) if half else 2 * BITS
    up = np.array([1 << (wide - h) for h in half], object)
    matrix = ((about * up[:, None]) * up[None, :]) >> (2 * wide - BITS)
    shifts = tuple(h + moments.units[p] for h, p in zip(half, moments.index(keys), strict=True))
    lengths = [(int(raw[i, i]) << BITS) >> (2 * half[i]) for i in range(len(keys))]
    return matrix, shifts, lengths


def vanishes(pivot: int, length: int) -> bool:
    """Whether a pivot is rounding only, next to the squared length of its column."""
    return pivot <= 0 or Fraction(pivot) <= Fraction(DEPENDENCE_TOLERANCE) ** 2 * length


def swept(matrix: Integers, k: int, *, out: bool = False) -> Integers:
    """Sweep column ``k`` in or out; the inverse stands negated (Goodnight 1979)."""
    pivot = int(matrix[k, k])
    column = matrix[:, k].copy()
    row = (column * ONE) // pivot
    after: Integers = matrix - ((column[:, None] * row[None, :]) >> BITS)
    line = -row if out else row
    after[k, :] = line
    after[:, k] = line
    after[k, k] = -((ONE << BITS) // pivot)
    return after


def scaled(value: int, shift: int) -> Fraction:
    """A fixed-point number times ``2**shift``."""
    return power(Fraction(value), shift - BITS)


def fixed(value: int, shift: int) -> int:
    """``value * 2**shift`` in fixed point."""
    up = BITS + shift
    return value << up if up >= 0 else value >> -up


def fixed_of(value: Fraction, shift: int) -> int:
    """``value * 2**shift`` in fixed point."""
    up = BITS + shift
    if up >= 0:
        return (value.numerator << up) // value.denominator
    return value.numerator // (value.denominator << -up)


def power(value: Fraction, shift: int) -> Fraction:
    """``value * 2**shift``."""
    return value * (1 << shift) if shift >= 0 else value / (1 << -shift)


def square_root(value: Fraction) -> float:
    """Square root, to double precision."""
    if value <= 0:
        return 0.0
    shift = 2 * BITS + max(0, value.denominator.bit_length() - value.numerator.bit_length())
    shift += shift % 2
    return float(Fraction(math.isqrt((value.numerator << shift) // value.denominator), 1 << (shift // 2)))


def mean_of(moments: Moments, key: Key) -> Fraction:
    """Mean of a column, exactly."""
    place = moments.places[key]
    return power(Fraction(int(moments.sums[place]), moments.n), moments.units[place])
