"""Columns that say nothing of their own: exact combinations of the ones before them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from beforehand.fit.columns import Key
from beforehand.fit.moments import Moments
from beforehand.fit.sweeping import mean_of, power, scaled, square_root, start, swept, vanishes

# A column with a smaller part in a dependence than this has none; the rest is rounding of the table.
NEGLIGIBLE_WEIGHT = Fraction(1, 10**11)


@dataclass(frozen=True, slots=True)
class Dependence:
    """A column that is an exact combination of earlier ones.

    Attributes
    ----------
    key : Key
        The column.
    weights : tuple of (Key or None, float)
        Its equation; None stands for the intercept.
    relative_pivot : float
        Length of what the earlier columns leave of it, as a share of its own length.
    """

    key: Key
    weights: tuple[tuple[Key | None, float], ...]
    relative_pivot: float


def dependence(moments: Moments, keys: Sequence[Key], *, intercept: bool) -> Dependence | None:
    """The first column that is an exact combination of the ones before it.

    Parameters
    ----------
    moments : Moments
        Of the rows in question, holding all ``keys``.
    keys : sequence of Key
        In the order in which they are looked at.
    intercept : bool
        Whether the intercept comes before them all.

    Returns
    -------
    Dependence or None
        None when every column says something of its own.
    """
    matrix, shifts, lengths = start(moments, keys, intercept)
    for k in range(len(keys)):
        if vanishes(int(matrix[k, k]), lengths[k]):
            slopes = [scaled(int(matrix[i, k]), shifts[k] - shifts[i]) for i in range(k)]
            sizes = [power(abs(s), shifts[i] - shifts[k]) for i, s in enumerate(slopes)]
            weights: list[tuple[Key | None, float]] = [
                (key, _ten_digits(slope))
                for key, slope, size in zip(keys[:k], slopes, sizes, strict=True)
                if size > NEGLIGIBLE_WEIGHT
            ]
            if intercept:
                terms = [mean_of(moments, keys[k])]
                terms += [-s * mean_of(moments, key) for key, s in zip(keys[:k], slopes, strict=True)]
                constant = sum(terms, Fraction(0))
                if abs(constant) > NEGLIGIBLE_WEIGHT * max(map(abs, terms)) or not weights:
                    weights.append((None, _ten_digits(constant)))
            relative = square_root(Fraction(max(int(matrix[k, k]), 0), lengths[k])) if lengths[k] else 0.0
            return Dependence(keys[k], tuple(weights), relative)
        matrix = swept(matrix, k)
    return None


def independent_of(moments: Moments, keys: Sequence[Key], *, intercept: bool) -> tuple[Key, ...]:
    """The columns that are no exact combination of the ones before them, in order.

    Parameters
    ----------
    moments : Moments
    keys : sequence of Key
    intercept : bool
        Whether the intercept comes before them all.

    Returns
    -------
    tuple of Key
    """
    if not keys:
        return ()
    matrix, _, lengths = start(moments, keys, intercept)
    kept: list[Key] = []
    for k, key in enumerate(keys):
        if not vanishes(int(matrix[k, k]), lengths[k]):
            matrix = swept(matrix, k)
            kept.append(key)
    return tuple(kept)


def _ten_digits(value: Fraction) -> float:
    """A weight of an equation without the rounding of the table in its last digits."""
    return float(f"{float(value):.10g}")
