"""Error-free slicing: doubles cut into integers of few bits, whose products BLAS adds exactly.

After Ozaki, Ogita, Oishi & Rump (2012, Numerical Algorithms 59:95-118).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import FloatArray

# A product of two slices has at most 2 * BITS bits, and a block adds 2^13 of them: 2 * 20 + 13 = 53.
BITS = 20
BLOCK_ROWS = 8192

# Every double is below 2 to this.
LARGEST_EXPONENT = 1024

# Columns whose exponent is no further from 0 can be scaled by a double.
ORDINARY_EXPONENT = 500

# Slices of most columns: 53 bits, and as many as its smallest value is below its largest.
USUAL_SLICES = 4

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


@dataclass(frozen=True, slots=True)
class Slice:
    """One slice of a block.

    Attributes
    ----------
    places : array of int, shape (m,)
        The columns that have anything in this slice.
    values : FloatArray, shape (n, m)
        Their part; it is overwritten by the next cut.
    """

    places: NDArray[np.int64]
    values: FloatArray


class Slicer:
    """Cuts block after block as `sliced` does, in one workspace, side by side.

    Parameters
    ----------
    rows : int
        Rows of the largest block.
    top : array of int, shape (k,)
        Each column is below ``2**top`` in size.
    """

    def __init__(self, rows: int, top: NDArray[np.int64]) -> None:
        self._top = top
        self._ordinary = int(np.abs(top).max(initial=0)) < ORDINARY_EXPONENT
        self._rest = np.empty((rows, len(top)), order="F")
        self._stack = np.empty((rows, USUAL_SLICES * max(1, len(top))), order="F")
        self._width = 0

    @property
    def stack(self) -> FloatArray:
        """All slices of the last block side by side, shape (rows of the whole workspace, width)."""
        return self._stack[:, : self._width]

    def cut(self, block: FloatArray) -> list[Slice]:
        """Slices of a block of shape (n, k), without columns in which nothing is left."""
        n = len(block)
        self._width = 0
        rest = self._rest[:n]
        if self._ordinary:
            # Times a power of two is faster than ldexp and exact, unless it falls among the subnormals.
            np.multiply(block, np.ldexp(1.0, -self._top), out=rest)
            checked = self._room(block.shape[1])[:n]
            np.multiply(rest, np.ldexp(1.0, self._top), out=checked)
            if np.array_equal(checked, block):
                return self._cut(rest)
        found: list[Slice] = []
        for one in sliced(block, self._top):
            places = np.flatnonzero(one.any(axis=0))
            values = self._room(len(places))[:n]
            values[...] = one[:, places]
            self._width += len(places)
            found.append(Slice(places, values))
        return found

    def _cut(self, rest: FloatArray) -> list[Slice]:
        """Slices of values below 1 in size; ``rest`` is used up."""
        found: list[Slice] = []
        places = np.arange(rest.shape[1])
        while True:
            rest *= float(1 << BITS)
            values = self._room(len(places))[: len(rest)]
            np.rint(rest, out=values)
            rest -= values
            self._width += len(places)
            found.append(Slice(places, values))
            left = rest.any(axis=0)
            if not left.any():
                return found
            if not left.all():
                rest, places = rest[:, left], places[left]

    def _room(self, columns: int) -> FloatArray:
        """The next columns of the workspace, which grows where it must."""
        wanted = self._width + columns
        if wanted > self._stack.shape[1]:
            grown = np.empty((len(self._stack), max(wanted, 2 * self._stack.shape[1])), order="F")
            grown[:, : self._width] = self._stack[:, : self._width]
            self._stack = grown
        return self._stack[:, self._width : wanted]
