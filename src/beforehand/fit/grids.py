"""The matrix of a swept model, held exactly enough for what is asked of it.

`Whole` holds fixed-point integers of 256 bits and stands any design. `Pairs` holds paired doubles and
is many times faster where there are many columns; `paired` says whether a design stands it.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from beforehand.fit.columns import FloatArray
from beforehand.fit.moments import Integers
from beforehand.fit.pairs import Pair, difference, product, quotient, total
from beforehand.fit.sweeping import BITS, swept

# Fewer columns than this are swept as integers: there is little to gain.
FEWEST_PAIRED = 64

# Paired doubles carry 104 bits. A design stands them when so many are left after what its condition
# may cost: a double's 53, and 13 more so that the last one is hardly ever rounded another way.
PAIR_BITS = 104
BITS_LEFT = 66

# A pivot is the share of a column that the others leave; one as small as this is looked at in integers.
SMALLEST_PIVOT = 1e-10

# So many more bits of a root, so that one of a small number has those of a double.
_ROOT_BITS = 200

# Bits below the point with which paired doubles are turned into integers.
_EXACT = 400


class Grid(Protocol):
    """A symmetric matrix of fixed-point numbers of ``BITS`` bits, the outcome's row the last."""

    def entry(self, i: int, j: int) -> int:
        """One number."""
        ...

    def diagonal(self) -> list[int]:
        """The numbers on the diagonal."""
        ...

    def column(self, j: int) -> list[int]:
        """One column."""
        ...

    def part(self, places: Sequence[int]) -> Grid:
        """The rows and columns of these places."""
        ...

    def without(self, place: int) -> Grid:
        """The matrix after a column was swept out and left."""
        ...

    def solution(self, df: int) -> tuple[list[float], list[float]]:
        """Slopes, and the roots of residual times inverse over df, in the grid's scale."""
        ...

    def times(self, line: Sequence[int]) -> list[int]:
        """``M line`` over the columns without the outcome."""
        ...

    def integers(self) -> Integers:
        """The whole matrix as integers."""
        ...


@dataclass(frozen=True, slots=True, eq=False)
class Whole:
    """Integers, shape (k, k)."""

    values: Integers

    def entry(self, i: int, j: int) -> int:
        """One number."""
        return int(self.values[i, j])

    def diagonal(self) -> list[int]:
        """The numbers on the diagonal."""
        return [int(value) for value in self.values.diagonal().tolist()]

    def column(self, j: int) -> list[int]:
        """One column."""
        return [int(value) for value in self.values[:, j].tolist()]

    def part(self, places: Sequence[int]) -> Whole:
        """The rows and columns of these places."""
        return Whole(self.values[np.ix_(places, places)])

    def without(self, place: int) -> Whole:
        """The matrix after a column was swept out and left."""
        stay = [k for k in range(len(self.values)) if k != place]
        return Whole(swept(self.values, place, out=True)[np.ix_(stay, stay)])

    def solution(self, df: int) -> tuple[list[float], list[float]]:
        """Slopes, and the roots of residual times inverse over df, in the grid's scale.

        Integers throughout: a fraction would look for common factors at each step.
        """
        slopes, inverse = self.column(-1), self.diagonal()
        residual = max(inverse[-1], 0) << (2 * _ROOT_BITS)
        roots = [math.isqrt(residual * -own // df) for own in inverse[:-1]]
        return (
            [math.ldexp(float(slope), -BITS) for slope in slopes[:-1]],
            [math.ldexp(float(root), -BITS - _ROOT_BITS) for root in roots],
        )

    def times(self, line: Sequence[int]) -> list[int]:
        """``M line`` over the columns without the outcome."""
        k = len(line)
        return [
            sum(int(one) * weight for one, weight in zip(row, line, strict=True)) >> BITS
            for row in self.values[:k, :k].tolist()
        ]

    def integers(self) -> Integers:
        """The whole matrix as integers."""
        return self.values


@dataclass(frozen=True, slots=True, eq=False)
class Pairs:
    """Paired doubles, shape (k, k)."""

    values: Pair

    def entry(self, i: int, j: int) -> int:
        """One number."""
        return _integer(float(self.values.high[i, j]), float(self.values.low[i, j]))

    def diagonal(self) -> list[int]:
        """The numbers on the diagonal."""
        return _integers(self.values.high.diagonal(), self.values.low.diagonal())

    def column(self, j: int) -> list[int]:
        """One column."""
        return _integers(self.values.high[:, j], self.values.low[:, j])

    def part(self, places: Sequence[int]) -> Pairs:
        """The rows and columns of these places."""
        rows = np.ix_(places, places)
        return Pairs(Pair(self.values.high[rows], self.values.low[rows]))

    def without(self, place: int) -> Pairs:
        """The matrix after a column was swept out and left."""
        stay = np.delete(np.arange(len(self.values.high)), place)
        column, pivot = self._line(place)
        column = Pair(column.high[stay], column.low[stay])
        return Pairs(_less_outer(self.part(stay.tolist()).values, column, pivot))

    def swept(self, place: int) -> Pairs:
        """The matrix after a column was swept in; the inverse stands negated."""
        column, pivot = self._line(place)
        after = _less_outer(self.values, column, pivot)
        row = quotient(column, pivot)
        for part, line in zip(after, row, strict=True):
            part[place, :] = line
            part[:, place] = line
        one = quotient(Pair(np.ones(1), np.zeros(1)), pivot)
        after.high[place, place], after.low[place, place] = -one.high[0], -one.low[0]
        return Pairs(after)

    def solution(self, df: int) -> tuple[list[float], list[float]]:
        """Slopes, and the roots of residual times inverse over df, in the grid's scale."""
        high, low = self.values.high.diagonal(), self.values.low.diagonal()
        inner = product(Pair(-high[:-1], -low[:-1]), Pair(high[-1:], low[-1:]))
        ratio = quotient(inner, Pair(np.array([float(df)]), np.zeros(1)))
        # One step of Newton's mends the last bit of the root.
        root = np.sqrt(np.maximum(ratio.high, 0.0))
        rest = difference(ratio, product(Pair(root, np.zeros_like(root)), Pair(root, np.zeros_like(root))))
        step = np.divide(rest.high, 2.0 * root, out=np.zeros_like(root), where=root > 0)
        return self.values.high[:-1, -1].tolist(), (root + step).tolist()

    def times(self, line: Sequence[int]) -> list[int]:
        """``M line`` over the columns without the outcome."""
        k = len(line)
        weights = _pair_of(np.array(line, object))
        inner = Pair(self.values.high[:k, :k], self.values.low[:k, :k])
        rows = total(product(inner, Pair(weights.high[None, :], weights.low[None, :])))
        return _integers(rows.high, rows.low)

    def integers(self) -> Integers:
        """The whole matrix as integers."""
        k = len(self.values.high)
        flat = _integers(self.values.high.ravel(), self.values.low.ravel())
        return np.array(flat, object).reshape(k, k)

    def _line(self, place: int) -> tuple[Pair, Pair]:
        """A column, and its own entry."""
        high, low = self.values.high[:, place].copy(), self.values.low[:, place].copy()
        return Pair(high, low), Pair(high[place : place + 1].copy(), low[place : place + 1].copy())


def paired(matrix: Integers, k: int) -> Pairs | None:
    """The first ``k`` columns of a matrix swept in, or None where paired doubles are not enough.

    Parameters
    ----------
    matrix : integers, shape (k + 1, k + 1)
        Each column scaled to a size near 1.
    k : int
    """
    if k < FEWEST_PAIRED:
        return None
    grid = Pairs(_pair_of(matrix))
    for place in range(k):
        if not float(grid.values.high[place, place]) > SMALLEST_PIVOT:
            return None
        grid = grid.swept(place)
    # The diagonal of the inverse bounds what the sweeps can have lost.
    inflation = float(np.abs(grid.values.high.diagonal()[:k]).max())
    return grid if k * k * inflation < 2.0 ** (PAIR_BITS - BITS_LEFT) else None


def _less_outer(values: Pair, column: Pair, pivot: Pair) -> Pair:
    """``values - column column' / pivot``."""
    row = quotient(column, pivot)
    outer = product(
        Pair(column.high[:, None], column.low[:, None]), Pair(row.high[None, :], row.low[None, :])
    )
    return difference(values, outer)


def _pair_of(values: Integers) -> Pair:
    """Fixed-point integers as paired doubles, to the nearest."""
    flat = values.ravel().tolist()
    high = [float(value) for value in flat]
    low = [float(value - int(near)) for value, near in zip(flat, high, strict=True)]
    shape = values.shape
    return Pair(np.ldexp(np.array(high).reshape(shape), -BITS), np.ldexp(np.array(low).reshape(shape), -BITS))


def _integer(high: float, low: float) -> int:
    """Paired doubles as a fixed-point integer."""
    return (int(math.ldexp(high, _EXACT)) + int(math.ldexp(low, _EXACT))) >> (_EXACT - BITS)


def _integers(high: FloatArray, low: FloatArray) -> list[int]:
    return [_integer(one, other) for one, other in zip(high.tolist(), low.tolist(), strict=True)]
