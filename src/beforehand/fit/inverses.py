"""Inverses and triangles of cross-products on their own, without an outcome."""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction

import numpy as np

from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.moments import Integers, Moments
from beforehand.fit.sweeping import BITS, RankDeficient, square_root, start, swept, vanishes


def unit_inverse(moments: Moments, keys: Sequence[Key], *, centred: bool) -> FloatArray:
    """Inverse of the cross-products scaled to a unit diagonal, shape (k, k).

    Parameters
    ----------
    moments : Moments
    keys : sequence of Key, length k
    centred : bool
        Cross-products about the means; otherwise about 0.

    Raises
    ------
    RankDeficient
        When a column is an exact combination of the ones before it.
    """
    matrix, lengths = _swept_in(moments, keys, centred)
    return _unit_inverse(matrix, lengths)


def unit_inverses_without(
    moments: Moments, own: Sequence[Key], others: Sequence[Sequence[Key]], *, centred: bool
) -> tuple[FloatArray, ...]:
    """The part of ``own`` in that inverse after each group of ``others`` has left alone.

    All of them come from one sweep, in the same fixed point: where a group is nearly a copy of
    ``own``, next to nothing of the inverse is left when it has gone.

    Parameters
    ----------
    moments : Moments
    own : sequence of Key, length q
    others : sequence of sequences of Key
        With ``own`` all columns of the model.
    centred : bool

    Returns
    -------
    tuple of FloatArray, each of shape (q, q)

    Raises
    ------
    RankDeficient
        When a column of the whole model is an exact combination of the ones before it.
    """
    keys = [*own, *(key for group in others for key in group)]
    matrix, lengths = _swept_in(moments, keys, centred)
    stay, found, first = list(range(len(own))), [], len(own)
    for group in others:
        places = [*range(first, first + len(group)), *stay]
        first += len(group)
        inner = matrix[np.ix_(places, places)]
        for place in range(len(group)):
            inner = swept(inner, place, out=True)
        found.append(_unit_inverse(inner[len(group) :, len(group) :], lengths[: len(own)]))
    return tuple(found)


def triangle_of(moments: Moments, keys: Sequence[Key], *, intercept: bool) -> FloatArray:
    """Upper triangle R with R'R the cross-products of all columns scaled to unit length.

    The intercept, where there is one, is the first column; nothing is centred.

    Parameters
    ----------
    moments : Moments
    keys : sequence of Key, length k
    intercept : bool

    Returns
    -------
    FloatArray, shape (p, p)
        With ``p = k + 1`` columns where there is an intercept, else ``k``; a positive diagonal.

    Raises
    ------
    RankDeficient
        When a column is an exact combination of the ones before it.
    """
    size = len(keys) + int(intercept)
    places = moments.index(keys)
    gram = np.zeros((size, size), object)
    first = int(intercept)
    gram[first:, first:] = moments.products[np.ix_(places, places)]
    if intercept:
        gram[0, 0] = moments.n
        gram[0, 1:] = gram[1:, 0] = moments.sums[places]
    half = [(int(gram[i, i]).bit_length() + 1) // 2 for i in range(size)]
    wide = max(2 * BITS, *half) if half else 2 * BITS
    up = np.array([1 << (wide - h) for h in half], object)
    matrix = ((gram * up[:, None]) * up[None, :]) >> (2 * wide - BITS)
    lengths = [int(matrix[k, k]) for k in range(size)]
    out = np.zeros((size, size))
    for k in range(size):
        pivot = int(matrix[k, k])
        if pivot <= 0:
            raise RankDeficient(f"column {k + 1} is an exact combination of the others")
        row = matrix[k, k:]
        for j in range(k, size):
            value = Fraction(int(row[j - k]) ** 2, pivot * lengths[j])
            out[k, j] = math.copysign(square_root(value), int(row[j - k]))
        rest = matrix[k + 1 :, k + 1 :] - ((matrix[k + 1 :, k][:, None] * row[1:][None, :]) // pivot)
        matrix[k + 1 :, k + 1 :] = rest
    return out


def _swept_in(moments: Moments, keys: Sequence[Key], centred: bool) -> tuple[Integers, list[int]]:
    """All columns swept in, and the diagonal before."""
    matrix, _, lengths = start(moments, keys, centred)
    diagonal = [int(matrix[k, k]) for k in range(len(keys))]
    for k in range(len(keys)):
        if vanishes(int(matrix[k, k]), lengths[k]):
            raise RankDeficient(f"column {k + 1} is an exact combination of the others")
        matrix = swept(matrix, k)
    return matrix, diagonal


def _unit_inverse(matrix: Integers, diagonal: Sequence[int]) -> FloatArray:
    """A negated inverse in fixed point, scaled by the roots of the diagonal before it."""
    size = len(diagonal)
    out = np.empty((size, size))
    for i in range(size):
        for j in range(i + 1):
            scale = math.isqrt(diagonal[i] * diagonal[j])
            out[i, j] = out[j, i] = float(Fraction(-int(matrix[i, j]) * scale, 1 << (2 * BITS)))
    return out
