"""Least squares from exact moments: a small tableau of fixed-point integers, swept (Goodnight 1979)."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np
from scipy.special import stdtr

from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.grids import Grid, Whole, paired
from beforehand.fit.moments import Integers, Moments
from beforehand.fit.sweeping import (
    BITS,
    ONE,
    RankDeficient,
    fixed,
    fixed_of,
    mean_of,
    power,
    scaled,
    square_root,
    start,
    swept,
    vanishes,
)

__all__ = [
    "Tableau",
    "added_column_test",
    "tableau_of",
]

# Residuals smaller than this share of the outcome's spread are rounding of the table.
EXACT_FIT_TOLERANCE = 1e-13


@dataclass(frozen=True, slots=True, eq=False)
class Tableau:
    """A model swept in: inverse, coefficients and residual sum of squares in fixed point.

    The last row and column are the outcome's. Cross-products about the mean (or 0) are
    ``grid[i, j] * 2**(shifts[i] + shifts[j]) / n``, as fixed-point numbers of ``BITS`` bits.

    Attributes
    ----------
    moments : Moments
    outcome : Key
    keys : tuple of Key, length k
        Columns that are swept in, without the intercept.
    intercept : bool
    shifts : tuple of int, length k + 1
        Scale of each column, the outcome's last.
    grid : Grid, k + 1 rows and columns
    total : int
        The outcome's own entry before the first sweep.
    means : tuple of int, length k
        Means of the columns in fixed point, in the grid's scale.
    spread : int
        ``means' C means`` of the inverse C, in the same scale: what the intercept owes to the columns.
    """

    moments: Moments
    outcome: Key
    keys: tuple[Key, ...]
    intercept: bool
    shifts: tuple[int, ...]
    grid: Grid
    total: int
    means: tuple[int, ...]
    spread: int

    @property
    def matrix(self) -> Integers:
        """The grid as integers, shape (k + 1, k + 1)."""
        return self.grid.integers()

    @property
    def residual(self) -> int:
        """The outcome's own entry: the residual sum of squares in the grid's scale."""
        return max(self.grid.entry(-1, -1), 0)

    @property
    def n(self) -> int:
        """Rows."""
        return self.moments.n

    @property
    def p(self) -> int:
        """Coefficients with the intercept."""
        return len(self.keys) + int(self.intercept)

    @property
    def df(self) -> int:
        """Residual degrees of freedom."""
        return self.n - self.p

    @property
    def rss(self) -> Fraction:
        """Residual sum of squares."""
        return self._squares(self.residual)

    @property
    def tss(self) -> Fraction:
        """Total sum of squares, about the mean with an intercept."""
        return self._squares(self.total)

    def _squares(self, value: int) -> Fraction:
        return scaled(max(value, 0), 2 * self.shifts[-1]) / self.n

    @property
    def exact(self) -> bool:
        """Whether the residuals are no more than rounding of the table."""
        return self.residual <= Fraction(EXACT_FIT_TOLERANCE) ** 2 * self.total

    def slope(self, place: int) -> Fraction:
        """A coefficient."""
        return scaled(self.grid.entry(place, -1), self.shifts[-1] - self.shifts[place])

    @property
    def estimates(self) -> tuple[float, ...]:
        """Coefficients without the intercept, shape (len(keys),)."""
        return tuple(float(self.slope(k)) for k in range(len(self.keys)))

    @property
    def constant(self) -> Fraction:
        """The intercept; 0 without one."""
        if not self.intercept:
            return Fraction(0)
        slopes = self.grid.column(-1)[:-1]
        carried = sum(slope * mean for slope, mean in zip(slopes, self.means, strict=True))
        return self._mean(self.outcome) - power(Fraction(carried, ONE * ONE), self.shifts[-1])

    def _mean(self, key: Key) -> Fraction:
        return mean_of(self.moments, key)

    @property
    def outcome_mean(self) -> Fraction:
        """Mean of the outcome."""
        return self._mean(self.outcome)

    def tops(self, keys: Sequence[Key]) -> list[int]:
        """Exponents above columns."""
        return [self.moments.tops[place] for place in self.moments.index(keys)]

    def _inverse_entry(self, i: int, j: int) -> int:
        """An entry of the inverse in fixed point, in the tableau's scale; it stands negated."""
        return -self.grid.entry(i, j)

    def inverse_roots(self) -> tuple[Fraction, ...]:
        """Roots of the diagonal of the inverse cross-products, one for each slope."""
        return tuple(self._root(k) for k in range(len(self.keys)))

    def inverse_diagonal(self, place: int) -> Fraction:
        """A slope's entry on the diagonal of the inverse cross-products."""
        return scaled(self._inverse_entry(place, place), -2 * self.shifts[place]) * self.n

    def _root(self, k: int) -> Fraction:
        return Fraction(square_root(self.inverse_diagonal(k)))

    def unit_inverse_of(self, places: Sequence[int]) -> FloatArray:
        """Part of the inverse cross-products, scaled to a unit diagonal of the inverse."""
        out = np.empty((len(places), len(places)))
        for i, one in enumerate(places):
            for j, other in enumerate(places):
                scale = math.isqrt(self._inverse_entry(one, one) * self._inverse_entry(other, other))
                out[i, j] = float(Fraction(self._inverse_entry(one, other), scale))
        return out

    def pulls(self, *, with_constant: bool = False) -> tuple[list[list[Fraction]], list[Fraction]]:
        """Weights and constants of the forms ``((X'X)⁻¹ x)_j / root_j``, one for each slope.

        Parameters
        ----------
        with_constant : bool
            Put the form of the intercept first.

        Returns
        -------
        weights : rows of Fraction, one for each column
        constants : list of Fraction, one for each form
        """
        k = len(self.keys)
        roots = self.inverse_roots()
        means = [self._mean(key) for key in self.keys] if self.intercept else [Fraction(0)] * k
        inverse = [
            [scaled(self._inverse_entry(i, j), -self.shifts[i] - self.shifts[j]) * self.n for j in range(k)]
            for i in range(k)
        ]
        weights = [[inverse[i][j] / roots[j] for j in range(k)] for i in range(k)]
        constants = _centred(weights, means)
        if with_constant:
            root = self.constant_root()
            first = [
                -sum((mean * inverse[i][j] for j, mean in enumerate(means)), Fraction(0)) / root
                for i in range(k)
            ]
            weights = [[one, *row] for one, row in zip(first, weights, strict=True)]
            about = -sum((w * mean for w, mean in zip(first, means, strict=True)), Fraction(0))
            constants = [Fraction(1, self.n) / root + about, *constants]
        return weights, constants

    def constant_root(self) -> Fraction:
        """Root of the intercept's entry in the inverse cross-products."""
        return Fraction(square_root(Fraction(self.spread * self.n + ONE // self.n, ONE)))

    def whitening(self) -> tuple[list[list[Fraction]], list[Fraction]]:
        """Weights and constants of forms that make the columns orthonormal.

        The squares of the forms of a row add to its leverage, less ``1/n`` with an intercept.
        """
        k = len(self.keys)
        lower = _cholesky([[self._inverse_entry(i, j) for j in range(k)] for i in range(k)])
        half = math.isqrt(self.n << (2 * BITS))
        weights = [
            [power(Fraction(lower[i][j] * half, 1 << (2 * BITS)), -self.shifts[i]) for j in range(k)]
            for i in range(k)
        ]
        means = [self._mean(key) for key in self.keys] if self.intercept else [Fraction(0)] * k
        return weights, _centred(weights, means)

    def leverage_of(self, values: Sequence[Fraction]) -> Fraction:
        """Leverage of a row, of this table or another, with these values of the columns."""
        k = len(self.keys)
        about = [
            value - (self._mean(key) if self.intercept else 0)
            for value, key in zip(values, self.keys, strict=True)
        ]
        scaled = [power(value, -self.shifts[j]) for j, value in enumerate(about)]
        total = sum(
            (scaled[i] * scaled[j] * self._inverse_entry(i, j) for i in range(k) for j in range(k)),
            Fraction(0),
        )
        return total * self.n / ONE + (Fraction(1, self.n) if self.intercept else 0)

    def without(self, keys: Sequence[Key]) -> Tableau:
        """The model less some of its columns, swept out in the order given."""
        grid, left, means, spread = self.grid, list(self.keys), list(self.means), self.spread
        for key in keys:
            place = left.index(key)
            # The inverse loses c c' / c_jj, and the form of the means with it.
            column = grid.column(place)
            joint = _joint(column[:-1], means)
            spread += joint * joint // column[place]
            grid = grid.without(place)
            del left[place], means[place]
        stay = [place for place, key in enumerate(self.keys) if key not in set(keys)]
        return replace(
            self, keys=tuple(left), shifts=(*(self.shifts[k] for k in stay), self.shifts[-1]), grid=grid,
            means=tuple(means), spread=spread,
        )  # fmt: skip

    def gain(self, keys: Sequence[Key]) -> int:
        """What leaving columns out adds to the residual sum of squares, in units of the tableau."""
        places = [self.keys.index(key) for key in keys]
        if len(places) == 1:
            slope = self.grid.entry(places[0], -1)
            return -(slope * slope // self.grid.entry(places[0], places[0]))
        inner: Grid = Whole(self.grid.part([*places, len(self.keys)]).integers())
        before = inner.entry(-1, -1)
        for _ in places:
            inner = inner.without(0)
        return inner.entry(-1, -1) - before


def tableau_of(moments: Moments, outcome: Key, keys: Sequence[Key], *, intercept: bool) -> Tableau:
    """Sweep a model in.

    Parameters
    ----------
    moments : Moments
        Holding the outcome and all ``keys``.
    outcome : Key
    keys : sequence of Key
        Columns of the model besides the intercept.
    intercept : bool

    Returns
    -------
    Tableau

    Raises
    ------
    RankDeficient
        When a column is an exact combination of the ones before it.
    """
    everything = (*keys, outcome)
    matrix, shifts, lengths = start(moments, everything, intercept)
    total = int(matrix[-1, -1])
    means = tuple(fixed_of(mean_of(moments, key), -shift) for key, shift in zip(keys, shifts, strict=False))
    grid: Grid | None = paired(matrix, len(keys))
    if grid is None:
        for k in range(len(keys)):
            if vanishes(int(matrix[k, k]), lengths[k]):
                raise RankDeficient(f"column {k + 1} of the model is an exact combination of the others")
            matrix = swept(matrix, k)
        grid = Whole(matrix)
    spread = -_joint(grid.times(means), means)
    return Tableau(moments, outcome, tuple(keys), intercept, shifts, grid, total, means, spread)


def added_column_test(
    tableau: Tableau, key: Key, moments: Moments | None = None
) -> tuple[float, float, int] | None:
    """t, two-sided p and degrees of freedom of one column added to a model, in O(p²).

    Parameters
    ----------
    tableau : Tableau
    key : Key
        The added column.
    moments : Moments, optional
        Moments of the same rows that hold ``key`` too; the tableau's own by default.

    Returns
    -------
    tuple or None
        None when the column is a combination of those in the model, or no residual is left.
    """
    moments = tableau.moments if moments is None else moments
    df = tableau.df - 1
    keys = (*tableau.keys, tableau.outcome, key)
    places = moments.index(keys)
    line = moments.n * moments.products[places[-1], places]
    if tableau.intercept:
        line = line - int(moments.sums[places[-1]]) * moments.sums[places]
    own = int(line[-1])
    half = (own.bit_length() + 1) // 2
    shift = half + moments.units[places[-1]]
    # Into the tableau's scale: about * 2^(u_i + u_z) = value * 2^(shift_i + shift_z - BITS).
    scaled = [
        fixed(int(v), moments.units[p] + moments.units[places[-1]] - s - shift)
        for v, p, s in zip(line[:-1], places[:-1], tableau.shifts, strict=True)
    ]
    # The inverse stands negated in the tableau.
    weighed = tableau.grid.times(scaled[:-1])
    own_fixed = fixed(own, 2 * (moments.units[places[-1]] - shift))
    pivot = own_fixed + _joint(weighed, scaled[:-1])
    raw = moments.n * int(moments.products[places[-1], places[-1]])
    if df < 1 or tableau.exact or vanishes(pivot, fixed(raw, 2 * (moments.units[places[-1]] - shift))):
        return None
    joint = scaled[-1] - _joint(tableau.grid.column(-1)[:-1], scaled[:-1])
    gain = Fraction(joint * joint, pivot * ONE)
    rest = Fraction(tableau.residual, ONE) - gain
    if rest <= Fraction(EXACT_FIT_TOLERANCE) ** 2 * Fraction(tableau.total, ONE):
        return None
    t = math.copysign(square_root(gain / (rest / df)), joint)
    return t, 2.0 * float(stdtr(df, -abs(t))), df


def _joint(one: Sequence[int], other: Sequence[int]) -> int:
    """Sum of products of two rows in fixed point."""
    return sum(a * b for a, b in zip(one, other, strict=True)) >> BITS


def _centred(weights: Sequence[Sequence[Fraction]], means: Sequence[Fraction]) -> list[Fraction]:
    """Constants that put forms about the means."""
    return [
        -sum((row[form] * mean for row, mean in zip(weights, means, strict=True)), Fraction(0))
        for form in range(len(means))
    ]


def _cholesky(matrix: list[list[int]]) -> list[list[int]]:
    """Lower triangle L with L L' the matrix, all in fixed point."""
    k = len(matrix)
    lower = [[0] * k for _ in range(k)]
    for j in range(k):
        own = (matrix[j][j] << BITS) - sum(lower[j][m] ** 2 for m in range(j))
        lower[j][j] = math.isqrt(max(own, 1))
        for i in range(j + 1, k):
            rest = (matrix[i][j] << BITS) - sum(lower[i][m] * lower[j][m] for m in range(j))
            lower[i][j] = rest // lower[j][j]
    return lower
