"""How nearly predictors say the same: variance inflation, condition indices, variance shares."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.inverses import triangle_of, unit_inverse, unit_inverses_without
from beforehand.fit.moments import Moments

# Columns are orthogonal when their cosine is below this: a few units in the last place.
ORTHOGONAL = 2.0**-50

# Rotations stop after so many rounds through all pairs; Jacobi's method needs six to ten.
MOST_SWEEPS = 60


@dataclass(frozen=True, slots=True, kw_only=True)
class Condition:
    """Condition indices with the share of each coefficient's variance that goes with them.

    Attributes
    ----------
    keys : tuple of Key or None
        Columns, None for the intercept.
    indices : tuple of float
        Ascending, the first is 1.
    shares : FloatArray
        Shape ``(len(indices), len(keys))``; each column adds to 1.
    """

    keys: tuple[Key | None, ...]
    indices: tuple[float, ...]
    shares: FloatArray


def inflation_of(
    moments: Moments, blocks: Mapping[str, tuple[Key, ...]], *, intercept: bool
) -> dict[str, float]:
    """Variance inflation of each predictor.

    Parameters
    ----------
    moments : Moments
    blocks : mapping of predictor to its columns
        Together free of exact dependence.
    intercept : bool
        With one, inflation is about the means (Marquardt 1970); without, about 0.

    Returns
    -------
    dict
        VIF for one column; for a block of df columns the generalized VIF of Fox & Monette (1992,
        JASA 87:178-183) to the power 1/df, which is comparable to a VIF.
    """
    keys = [key for block in blocks.values() for key in block]
    inverse = unit_inverse(moments, keys, centred=intercept)
    unit = moments.cross(keys, centred=intercept)
    found: dict[str, float] = {}
    start = 0
    for name, block in blocks.items():
        places = slice(start, start + len(block))
        start += len(block)
        found[name] = _inflation(inverse[places, places], unit[places, places])
    return found


def inflation_without(
    moments: Moments, blocks: Mapping[str, tuple[Key, ...]], name: str, *, intercept: bool
) -> dict[str, float]:
    """Variance inflation of one predictor after each other predictor in turn has been left out.

    Parameters
    ----------
    moments : Moments
    blocks : mapping of predictor to its columns
        Together free of exact dependence.
    name : str
        The predictor in question.
    intercept : bool

    Returns
    -------
    dict
        By the predictor that was left out, in the order of ``blocks``; measured as in
        `inflation_of`.
    """
    own = blocks[name]
    others = {other: block for other, block in blocks.items() if other != name}
    inverses = unit_inverses_without(moments, own, tuple(others.values()), centred=intercept)
    unit = moments.cross(own, centred=intercept)
    return {other: _inflation(inverse, unit) for other, inverse in zip(others, inverses, strict=True)}


def _inflation(inverse: FloatArray, unit: FloatArray) -> float:
    """VIF of one column, or the generalized one of a block to the power 1/df.

    ``inverse`` is the block's part of the inverse, ``unit`` its own cross-products, both scaled to a
    unit diagonal of the cross-products; shapes (df, df).
    """
    if not len(unit):
        # A category with one level in these rows has no column that could be inflated.
        return 1.0
    if len(unit) == 1:
        return float(inverse[0, 0])
    return float((_determinant(inverse) * _determinant(unit)) ** (1.0 / len(unit)))


def condition(moments: Moments, keys: Sequence[Key], *, intercept: bool) -> Condition:
    """Condition indices and variance shares (Belsley, Kuh & Welsch 1980, ch. 3).

    Columns, the intercept among them, are scaled to unit length and not centred.

    Parameters
    ----------
    moments : Moments
    keys : sequence of Key
        Columns of the model, free of exact dependence.
    intercept : bool
        Whether the intercept is one of the columns; it stands first.

    Returns
    -------
    Condition

    Raises
    ------
    RankDeficient
        When a column is an exact combination of the ones before it.
    """
    triangle = triangle_of(moments, keys, intercept=intercept)
    values, vectors = _singular(triangle)
    order = np.argsort(-values, kind="stable")
    values, vectors = values[order], vectors[:, order]
    parts = (vectors / values) ** 2
    totals = np.array([math.fsum(row) for row in parts.tolist()])
    shares = (parts / totals[:, None]).T
    names: tuple[Key | None, ...] = (None, *keys) if intercept else tuple(keys)
    return Condition(keys=names, indices=tuple(float(values[0] / value) for value in values), shares=shares)


def _determinant(matrix: FloatArray) -> float:
    """Determinant of a small positive matrix by elimination in a fixed order, whatever the BLAS."""
    rest = matrix.copy()
    product = 1.0
    for k in range(len(rest)):
        pivot = float(rest[k, k])
        product *= pivot
        rest[k + 1 :] = rest[k + 1 :] - (rest[k + 1 :, k] / pivot)[:, None] * rest[k]
    return product


def _singular(triangle: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Singular values and right vectors by one-sided Jacobi rotations (Hestenes 1958).

    The small values come out to nearly full relative precision (Demmel & Veselić 1992), and as the
    operations are elementwise and in a fixed order, the same on every machine. All disjoint pairs
    of a round are rotated at once.
    """
    k = triangle.shape[1]
    columns, vectors = triangle.copy(), np.eye(k)
    rounds = _rounds(k)
    for _ in range(MOST_SWEEPS):
        rotated = False
        for left, right in rounds:
            a, b = columns[:, left], columns[:, right]
            # A sum along the first axis adds row after row, in that order.
            alpha, beta, gamma = (a * a).sum(axis=0), (b * b).sum(axis=0), (a * b).sum(axis=0)
            turn = np.abs(gamma) > ORTHOGONAL * np.sqrt(alpha * beta)
            if not turn.any():
                continue
            rotated = True
            safe = np.where(turn, gamma, 1.0)
            zeta = (beta - alpha) / (2.0 * safe)
            tangent = np.where(zeta >= 0, 1.0, -1.0) / (np.abs(zeta) + np.sqrt(1.0 + zeta * zeta))
            cosine = np.where(turn, 1.0 / np.sqrt(1.0 + tangent * tangent), 1.0)
            sine = np.where(turn, cosine * tangent, 0.0)
            columns[:, left], columns[:, right] = cosine * a - sine * b, sine * a + cosine * b
            v, w = vectors[:, left], vectors[:, right]
            vectors[:, left], vectors[:, right] = cosine * v - sine * w, sine * v + cosine * w
        if not rotated:
            break
    return np.sqrt((columns * columns).sum(axis=0)), vectors


def _rounds(k: int) -> list[tuple[list[int], list[int]]]:
    """Rounds of disjoint pairs that meet every pair of ``k`` columns once (a round robin)."""
    places: list[int] = list(range(k + k % 2))
    half = len(places) // 2
    rounds: list[tuple[list[int], list[int]]] = []
    for _ in range(len(places) - 1):
        pairs = [
            (min(one, other), max(one, other))
            for one, other in zip(places[:half], reversed(places[half:]), strict=True)
            if one < k and other < k
        ]
        rounds.append(([one for one, _ in pairs], [other for _, other in pairs]))
        places = [places[0], places[-1], *places[1:-1]]
    return rounds
