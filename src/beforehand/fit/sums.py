"""Sums over rows that do not depend on the order of the rows, nor on how an adder groups them.

Plain floating-point sums differ in the last digits with order, vector width and threads. Here a
block is cut into slices that are multiples of one power of two and so short that their sum is exact
in any order (Rump, Ogita, Oishi 2008, "Accurate floating-point summation I", algorithm 3.2); the
exact sums of the slices are then added with a single rounding.
"""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import FloatArray

# Rows of one block: small enough to stay in a core's cache through the passes over it.
BLOCK = 32_768

# Above this size the power of two that cuts the slices could overflow; there Python's own exactly
# rounded sum takes over. Far below the largest double, far above any real column.
LARGEST_SLICED = 2.0**900


def exact_sum(values: FloatArray) -> float:
    """Sum of ``values`` with one rounding, the same for every order of them.

    Parameters
    ----------
    values : FloatArray
        Shape ``(n,)``, finite.

    Returns
    -------
    float
        The double nearest to the exact sum; 0.0 for none.
    """
    if len(values) and not _largest(values) < LARGEST_SLICED:
        return math.fsum(values.tolist())
    rest, piece = (np.empty(min(BLOCK, len(values))) for _ in range(2))
    parts: list[float] = []
    for start in range(0, len(values), BLOCK):
        block = values[start : start + BLOCK]
        parts += _parts(block, rest[: len(block)], piece[: len(block)])
    return math.fsum(parts)


def exact_mean(values: FloatArray) -> float:
    """Mean of ``values``, shape ``(n,)`` with n at least 1: the exact sum, rounded, over n."""
    return exact_sum(values) / len(values)


def sums_by_group(values: FloatArray, groups: NDArray[np.intp], count: int) -> FloatArray:
    """Sum of ``values`` in each of ``count`` groups, the same for every order of the rows.

    Parameters
    ----------
    values : FloatArray
        Shape ``(n,)``, finite and below 2^900.
    groups : ndarray of int
        Shape ``(n,)``, from 0 to ``count - 1``.

    Returns
    -------
    FloatArray
        Shape ``(count,)``; each correct to a unit or two in the last place of the largest term.
    """
    sums = [np.bincount(groups, weights=piece, minlength=count) for piece in _slices(values)]
    total = np.zeros(count)
    for part in reversed(sums):
        total += part
    return total


def _slices(values: FloatArray) -> Iterator[FloatArray]:
    """Pieces that add up to ``values`` exactly, each of which sums exactly in any order."""
    rest = values
    while len(rest):
        cutter = _cutter(rest)
        if cutter == 0.0:
            return
        piece = (rest + cutter) - cutter
        yield piece
        rest = rest - piece


def _parts(block: FloatArray, rest: FloatArray, piece: FloatArray) -> Iterator[float]:
    """Sums of the slices of a block, made in two arrays of its length."""
    rest[...] = block
    while cutter := _cutter(rest):
        np.add(rest, cutter, out=piece)
        piece -= cutter
        rest -= piece
        yield float(piece.sum())


def _cutter(values: FloatArray) -> float:
    """What cuts the next slice off by adding and taking away; 0.0 when nothing is left."""
    largest = _largest(values)
    if largest == 0.0:
        return 0.0
    # |value| <= 2^exponent, so that with this cutter the piece is a multiple of 2^-53 of it and
    # the sum of all pieces stays at most the cutter itself: 53 bits, no rounding.
    return math.ldexp(1.0, math.frexp(largest)[1] + math.ceil(math.log2(len(values) + 2)))


def _largest(values: FloatArray) -> float:
    """The largest size among values."""
    return max(float(values.max()), -float(values.min()))
