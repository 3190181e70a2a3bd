"""Error-free slicing: doubles cut into integers of few bits, whose products BLAS adds exactly.

After Ozaki, Ogita, Oishi & Rump (2012, Numerical Algorithms 59:95-118).
"""

from __future__ import annotations

import numpy as np

from beforehand.fit.columns import FloatArray

# A product of two slices has at most 2 * BITS bits, and a block adds 2^13 of them: 2 * 20 + 13 = 53.
BITS = 20
BLOCK_ROWS = 8192


def exponents_of(block: FloatArray) -> np.ndarray:
    """Smallest e with |x| < 2^e for each column of ``block``, shape (k,); a large negative for 0."""
    largest = np.abs(block).max(axis=0, initial=0.0)
    _, exponent = np.frexp(largest)
    return np.where(largest > 0, exponent, -5000)


def sliced(block: FloatArray, top: np.ndarray) -> list[FloatArray]:
    """Slices of a block, each an array of integers; slice j counts units of 2^(top - BITS (j + 1))."""
    slices: list[FloatArray] = []
    rest = block
    unit = top.astype(np.int64)
    while True:
        unit = unit - BITS
        counted = np.rint(np.ldexp(rest, -unit))
        slices.append(counted)
        rest = rest - np.ldexp(counted, unit)
        if not rest.any():
            return slices
