"""Search of all subsets of predictors for the largest adjusted R², by branch and bound.

The tree removes one predictor after another (Furnival & Wilson 1974, Technometrics 16:499-511): no
subset of a set can leave a smaller residual sum of squares than the set itself, so a branch whose
residual sum of squares is already too large for its most favourable degrees of freedom is cut.
The search runs in plain double precision on scaled columns and returns every subset within
``WITHIN`` of the best; which of them is best is for exact fits to say.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import fdtrc

from beforehand.faults import NumericalError

# Beyond this many predictors the tree of a table of noise can take hours.
MOST_PREDICTORS = 20

# Subsets whose adjusted R² is nearer than this are told apart by exact fits only.
WITHIN = 1e-9

# A pivot smaller than this share of a unit diagonal has no digit left to search by.
SMALLEST_PIVOT = 1e-14

Matrix = NDArray[np.float64]


class NearlyDependent(NumericalError):  # noqa: N818 - named by what is so, as its neighbours are
    """Columns keep too little of their own for subsets to be told apart."""

    code = "nearly_dependent"


@dataclass(frozen=True, slots=True)
class Subset:
    """Places of the predictors in a subset, ascending, and its adjusted R²."""

    places: tuple[int, ...]
    adjusted_r_squared: float


def best_subsets(
    cross: Matrix,
    blocks: Sequence[tuple[int, ...]],
    *,
    n: int,
    constant: int,
    alpha: float,
    lawful: Callable[[tuple[int, ...]], bool],
    held: Callable[[int], bool],
) -> tuple[Subset, ...]:
    """Subsets with the largest adjusted R² whose predictors are all significant or held.

    Parameters
    ----------
    cross : array, shape (k + 1, k + 1)
        Cross-products of the k design columns and, last, the outcome; about the means when there is
        an intercept.
    blocks : sequence of tuple of int
        Columns of each predictor, in plan order.
    n : int
        Rows.
    constant : int
        1 with an intercept, 0 without.
    alpha : float
        A predictor that is not held must have a p at or below it.
    lawful : callable of places
        Whether keep rules and products allow a subset.
    held : callable of one place
        Whether a predictor need not be significant.

    Returns
    -------
    tuple of Subset
        Best first; every one within ``WITHIN`` of the best. Empty when no lawful subset has only
        significant or held predictors.

    Raises
    ------
    ValueError
        With more than ``MOST_PREDICTORS`` predictors.
    """
    if len(blocks) > MOST_PREDICTORS:
        raise ValueError(f"{len(blocks)} predictors are more than {MOST_PREDICTORS}")
    scale = np.sqrt(np.where(np.diag(cross) > 0, np.diag(cross), 1.0))
    unit = cross / np.outer(scale, scale)
    total = float(unit[-1, -1])
    if total <= 0.0:
        # The outcome does not vary in these rows: no predictor can be significant.
        return ()
    everything = _swept(unit, [column for block in blocks for column in block])
    order = _strongest_first(everything, blocks)
    search = _Search(blocks, n, constant, alpha, total, lawful, held, order)
    search.visit(everything, tuple(range(len(blocks))), 0)
    found = sorted(search.found, key=lambda subset: (-subset.adjusted_r_squared, subset.places))
    return tuple(s for s in found if s.adjusted_r_squared >= search.best - WITHIN)


def _swept(matrix: Matrix, columns: Sequence[int]) -> Matrix:
    """The matrix with columns swept in (Beaton 1964; Goodnight 1979), or out when already in."""
    swept = matrix.copy()
    for k in columns:
        pivot = swept[k, k]
        if abs(pivot) < SMALLEST_PIVOT:
            raise NearlyDependent(
                "best_subset cannot be searched, as columns of the model nearly depend on each other: let "
                "the collinearity step come first, or leave one of them out"
            )
        row = swept[k] / pivot
        column = swept[:, k].copy()
        swept -= np.outer(column, row)
        swept[k] = row
        swept[:, k] = -column / pivot
        swept[k, k] = 1.0 / pivot
    return swept


def _unswept(matrix: Matrix, columns: Sequence[int]) -> Matrix:
    """The inverse of ``_swept``: columns taken out of the model."""
    out = matrix.copy()
    for k in columns:
        pivot = out[k, k]
        row = -out[k] / pivot
        column = out[:, k].copy()
        out += np.outer(column, row)
        out[k] = row
        out[:, k] = column / pivot
        out[k, k] = 1.0 / pivot
    return out


def _gain(swept: Matrix, block: Sequence[int]) -> float:
    """What leaving a predictor out adds to the residual sum of squares."""
    columns = list(block)
    estimates = swept[columns, -1]
    inverse = swept[np.ix_(columns, columns)]
    return float(estimates @ np.linalg.solve(inverse, estimates))


def _strongest_first(swept: Matrix, blocks: Sequence[tuple[int, ...]]) -> list[int]:
    """Places of predictors, the one whose loss costs most first: its large branch is cut early."""
    return sorted(range(len(blocks)), key=lambda place: (-_gain(swept, blocks[place]), place))


class _Search:
    """The state of one search; local to the call that made it."""

    def __init__(
        self,
        blocks: Sequence[tuple[int, ...]],
        n: int,
        constant: int,
        alpha: float,
        total: float,
        lawful: Callable[[tuple[int, ...]], bool],
        held: Callable[[int], bool],
        order: list[int],
    ) -> None:
        self.blocks, self.n, self.constant, self.alpha = blocks, n, constant, alpha
        self.total, self.lawful, self.held, self.order = total, lawful, held, order
        self.best = -np.inf
        self.found: list[Subset] = []

    def adjusted(self, rss: float, columns: int) -> float:
        """Adjusted R² of a model with so many columns besides the constant."""
        df = self.n - columns - self.constant
        if df < 1:
            return -np.inf
        return 1.0 - (rss / df) / (self.total / (self.n - self.constant))

    def width(self, places: Sequence[int]) -> int:
        """Columns of a set of predictors."""
        return sum(len(self.blocks[place]) for place in places)

    def visit(self, swept: Matrix, places: tuple[int, ...], start: int) -> None:
        """Judge one set, then every set that removes predictors at or after ``start`` in the order."""
        rss = float(swept[-1, -1])
        self.judge(swept, places, rss)
        present = set(places)
        for at in range(start, len(self.order)):
            place = self.order[at]
            if place not in present:
                continue
            left = rss + _gain(swept, self.blocks[place])
            fixed = [self.order[i] for i in range(at) if self.order[i] in present]
            if self.adjusted(left, self.width(fixed)) < self.best - WITHIN:
                continue
            remaining = tuple(other for other in places if other != place)
            self.visit(_unswept(swept, self.blocks[place]), remaining, at + 1)

    def judge(self, swept: Matrix, places: tuple[int, ...], rss: float) -> None:
        """Keep a set that is as good as the best so far, lawful, and significant throughout."""
        adjusted = self.adjusted(rss, self.width(places))
        if not places or adjusted < self.best - WITHIN or not self.lawful(places):
            return
        df = self.n - self.width(places) - self.constant
        for place in places:
            block = self.blocks[place]
            f = _gain(swept, block) / len(block) / (rss / df) if rss > 0 else np.inf
            if not self.held(place) and fdtrc(len(block), df, f) > self.alpha:
                return
        self.best = max(self.best, adjusted)
        self.found.append(Subset(places, adjusted))
