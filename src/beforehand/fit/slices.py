"""Error-free slicing: doubles cut into integers of few bits, whose products BLAS adds exactly.

After Ozaki, Ogita, Oishi & Rump (2012, Numerical Algorithms 59:95-118).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import FloatArray

# A product of two slices has at most 2 * BITS bits, and a block adds 2^13 of them: 2 * 20 + 13 = 53.
BITS = 20
BLOCK_ROWS = 8192

# Every double is below 2 to this.
LARGEST_EXPONENT = 1024

# Stands for the exponent of 0.
ZERO_EXPONENT = -5000


def exponents_of(block: FloatArray) -> NDArray[np.int64]:
    """Smallest e with |x| < 2^e for all x of a column.

    Parameters
    ----------
    block : FloatArray
        Finite values, shape (n, k).

    Returns
    -------
    array of int, shape (k,)
        ``ZERO_EXPONENT``, far below every double's, for a column of zeros.
    """
    largest = np.abs(block).max(axis=0, initial=0.0)
    _, exponent = np.frexp(largest)
    return np.where(largest > 0, exponent, ZERO_EXPONENT).astype(np.int64)


def sliced(block: FloatArray, top: NDArray[np.int64]) -> list[FloatArray]:
    """Cut a block into slices that add up to it exactly.

    Parameters
    ----------
    block : FloatArray
        Finite values, shape (n, k).
    top : array of int, shape (k,)
        Each column is below ``2**top`` in size.

    Returns
    -------
    list of FloatArray, each of shape (n, k)
        Integers of at most ``2**BITS`` in size; slice j counts units of ``2**(top - BITS * (j + 1))``.
    """
    slices: list[FloatArray] = []
    # The nearest multiple of a unit may lie above the largest double; the one towards 0 does not.
    whole = np.rint if int(top.max(initial=0)) < LARGEST_EXPONENT else np.trunc
    rest = block
    unit = top.astype(np.int64)
    while True:
        unit -= BITS
        counted = whole(np.ldexp(rest, -unit))
        slices.append(counted)
        rest = rest - np.ldexp(counted, unit)
        if not rest.any():
            return slices
