"""Logarithm, exponential and cube root of arrays, the same bits on every machine.

The library's own differ in the last place with the vector width of the processor. These use only
operations that IEEE 754 rounds in one way (sums, products, quotients, scaling by powers of two).
Errors stay below 2 units in the last place, below 1 for the cube root.
"""

from __future__ import annotations

import math

import numpy as np

from beforehand.fit.columns import FloatArray

# log 2 in two parts; the first has 32 trailing zero bits, so that its product with an exponent of a
# double is exact (the splitting of Tang 1990, ACM TOMS 16:378-400).
_LOG2_HIGH = 0.6931471803691238
_LOG2_LOW = 1.9082149292705877e-10

# 2 atanh(s) = log((1 + s) / (1 - s)): with |s| at most 0.1716 the next term is below 2^-58 of the sum.
_ATANH = tuple(2.0 / k for k in range(23, 2, -2))

# exp(r) - 1 for |r| at most log(2) / 2: the term after r^14 / 14! is below 2^-59.
_EXP = tuple(1.0 / math.factorial(k) for k in range(14, 2, -1))

_SPLITTER = 134217729.0  # 2^27 + 1 (Dekker 1971, Numer. Math. 18:224-242)

# Beyond this exp overflows a double, and below its negative it vanishes.
_LARGEST_EXPONENT = 745.2


def log(values: FloatArray) -> FloatArray:
    """Natural logarithm of positive ``values``; shape kept. Others give NaN (0 gives -inf)."""
    mantissa, exponent = np.frexp(values)
    low = mantissa < math.sqrt(0.5)
    mantissa = np.where(low, mantissa * 2.0, mantissa)
    power = (exponent - low).astype(np.float64)
    with np.errstate(invalid="ignore", divide="ignore"):
        s = (mantissa - 1.0) / (mantissa + 1.0)
        square = s * s
        tail = np.zeros_like(s)
        for coefficient in _ATANH:
            tail = (tail + coefficient) * square
        result: FloatArray = power * _LOG2_HIGH + ((tail * s + power * _LOG2_LOW) + 2.0 * s)
        result = np.where(values > 0.0, result, np.where(values == 0.0, -np.inf, np.nan))
        return np.where(np.isposinf(values), np.inf, result)


def expm1(values: FloatArray) -> FloatArray:
    """``exp(values) - 1`` without loss near 0; shape kept."""
    tail, power = _reduced(values)
    with np.errstate(over="ignore"):
        scale = np.ldexp(1.0, power)
        result: FloatArray = np.ldexp(tail, power) + (scale - 1.0)
    return np.where(values > _LARGEST_EXPONENT, np.inf, result)


def exp(values: FloatArray) -> FloatArray:
    """Exponential of ``values``; shape kept."""
    tail, power = _reduced(values)
    with np.errstate(over="ignore", under="ignore"):
        result: FloatArray = np.ldexp(1.0 + tail, power)
    return result


def cbrt(values: FloatArray) -> FloatArray:
    """Cube root of ``values`` of any sign; shape kept.

    The library's root is off by a unit in the last place at most; one Newton step with the
    remainder ``x - r^3`` in doubled precision gives the nearest double from any such start.
    """
    mantissa, exponent = np.frexp(values)
    # Scaled to [1/8, 1), so that no square over- or underflows; exact.
    shift = -((-exponent) // 3)
    scaled = np.ldexp(mantissa, exponent - 3 * shift)
    root = np.cbrt(scaled)
    square, square_error = _product(root, root)
    cubed, cubed_error = _product(square, root)
    remainder = (scaled - cubed) - (cubed_error + square_error * root)
    with np.errstate(invalid="ignore", divide="ignore"):
        step = np.where(square > 0.0, remainder / (3.0 * square), 0.0)
    result: FloatArray = np.ldexp(root + step, shift)
    return result


def _reduced(values: FloatArray) -> tuple[FloatArray, np.ndarray[tuple[int, ...], np.dtype[np.int64]]]:
    """``exp(r) - 1`` and k with ``values = k log 2 + r``."""
    bounded = np.clip(values, -_LARGEST_EXPONENT, _LARGEST_EXPONENT)
    power = np.rint(bounded / math.log(2.0))
    rest = (bounded - power * _LOG2_HIGH) - power * _LOG2_LOW
    tail = np.zeros_like(rest)
    for coefficient in _EXP:
        tail = (tail + coefficient) * rest
    square = rest * rest
    whole = rest + (0.5 * square + tail * square)
    return whole, np.nan_to_num(power).astype(np.int64)


def _product(a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Product and its rounding error (Dekker 1971)."""
    product = a * b
    a_high, a_low = _halves(a)
    b_high, b_low = _halves(b)
    error = ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low
    return product, error


def _halves(a: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Split a double into the sum of two of half its bits."""
    scaled = _SPLITTER * a
    high = scaled - (scaled - a)
    return high, a - high
