"""Arithmetic of arrays of paired doubles: each number is an unevaluated sum of two.

About 104 bits, by elementwise operations only, so that a result is the same on every machine. The
error-free sums and products are those of Knuth (1969) and Dekker (1971, Numerische Mathematik
18:224-242).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from beforehand.fit.columns import FloatArray

# Cuts a double into two halves whose products are exact (Veltkamp).
_SPLITTER = float((1 << 27) + 1)


class Pair(NamedTuple):
    """High and low parts, arrays of one shape; the low part is below half a unit of the high one."""

    high: FloatArray
    low: FloatArray


def product(a: Pair, b: Pair) -> Pair:
    """Products, elementwise with broadcasting."""
    high = a.high * b.high
    a1, a2 = _halves(a.high)
    b1, b2 = _halves(b.high)
    low = a1 * b1
    low -= high
    low += a1 * b2
    low += a2 * b1
    low += a2 * b2
    low += a.high * b.low
    low += a.low * b.high
    return _tidy(high, low)


def difference(a: Pair, b: Pair) -> Pair:
    """``a - b``, elementwise."""
    high, error = _two_sum(a.high, -b.high)
    low, rest = _two_sum(a.low, -b.low)
    error += low
    high, error = _tidy(high, error)
    error += rest
    return _tidy(high, error)


def quotient(a: Pair, b: Pair) -> Pair:
    """``a / b`` by long division with three partial quotients."""
    first = a.high / b.high
    rest = difference(a, product(Pair(first, np.zeros_like(first)), b))
    second = rest.high / b.high
    rest = difference(rest, product(Pair(second, np.zeros_like(second)), b))
    high, low = _tidy(first, second)
    low += rest.high / b.high
    return _tidy(high, low)


def total(a: Pair) -> Pair:
    """Sums along the last axis, halving it again and again so that there is one order only."""
    while a.high.shape[-1] > 1:
        half = a.high.shape[-1] // 2
        left = Pair(a.high[..., :half], a.low[..., :half])
        right = Pair(-a.high[..., half : 2 * half], -a.low[..., half : 2 * half])
        added = difference(left, right)
        a = Pair(
            np.concatenate([added.high, a.high[..., 2 * half :]], axis=-1),
            np.concatenate([added.low, a.low[..., 2 * half :]], axis=-1),
        )
    return Pair(a.high[..., 0], a.low[..., 0])


def _halves(a: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Two doubles of 26 bits that add up to each."""
    scaled = _SPLITTER * a
    high = scaled - (scaled - a)
    return high, a - high


def _two_sum(a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Sum and its rounding error."""
    added = a + b
    back = added - a
    return added, (a - (added - back)) + (b - back)


def _tidy(high: FloatArray, low: FloatArray) -> Pair:
    """The same sum with the low part below half a unit of the high one."""
    added = high + low
    return Pair(added, low - (added - high))
