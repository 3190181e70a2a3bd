"""Least squares in plain doubles, for work that is done thousands of times and recorded nowhere.

Columns are centred and brought to unit length, and their cross-products computed once; a model is
a Cholesky factor of a part of these. Where doubles do not carry a decision (columns that nearly
depend on each other, a fit that is nearly exact) it says so instead of answering, and the exact
moments take over.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.lapack import dpotrf, dpotri

from beforehand.faults import NumericalError
from beforehand.fit.columns import FloatArray, Key

Places = NDArray[np.intp]

# What a column keeps of its squared length once the ones before it are taken out: below this too few
# digits of a double are left to rule on.
SMALLEST_PIVOT = 1e-8

# The same of the outcome: a fit that leaves less is nearly exact.
SMALLEST_REST = 1e-8

# A column that varies by less than this share of its mean is constant, or needs more than doubles.
ROUNDING = 1e-7

# What rows that leave must leave of the outcome's sum of squares: it is taken from the whole by
# subtraction, and as many digits are lost as it is smaller.
SMALLEST_LEFT = 1e-5

# So much of a limit on either side of it is left to exact arithmetic.
KNIFE_EDGE = 1e-8

# How many factored designs are kept at hand.
AT_HAND = 64
PLACES_AT_HAND = 4096


class NotQuick(NumericalError):  # noqa: N818 - named by what is so, as its neighbours are
    """Doubles do not suffice here; the exact moments do."""

    code = "not_quick"


def require_clear(values: Sequence[float | None], limit: float | None) -> None:
    """Make sure that no value is so near to a limit that the digits of a double decide on which side.

    Raises
    ------
    NotQuick
        One is.
    """
    if limit is None:
        return
    near = KNIFE_EDGE * abs(limit)
    low, high = limit - near, limit + near
    if any(value is not None and low <= value <= high for value in values):
        raise NotQuick("a value lies on the edge of a limit")


@dataclass(frozen=True, slots=True, eq=False)
class Design:
    """Columns of one model over some rows of the base, factored.

    Attributes
    ----------
    places : array of int, shape (k,)
        Columns in the store.
    gone : array of int
        Rows of the base that are not in use.
    n : int
        Rows in use.
    mean : FloatArray, shape (k,)
        Mean of each column, as it stands in the store, over the rows in use.
    gram, inverse : FloatArray, shape (k, k)
        Cross-products about the mean, and their inverse.
    """

    places: Places
    gone: Places
    n: int
    mean: FloatArray
    gram: FloatArray
    inverse: FloatArray
    _kept: dict[str, FloatArray] = field(default_factory=dict)

    @property
    def k(self) -> int:
        """Columns, without the intercept."""
        return len(self.places)

    @property
    def df(self) -> int:
        """Residual degrees of freedom."""
        return self.n - self.k - 1

    def inverse_without(self, places: Sequence[int]) -> FloatArray:
        """Inverse cross-products once some columns (places in this design) are out; they are zero."""
        inverse = self.inverse
        if len(places) == 1:
            at = places[0]
            left: FloatArray = inverse - np.outer(inverse[:, at], inverse[at]) / inverse[at, at]
            return left
        rows = inverse[list(places)]
        left = inverse - rows.T @ np.linalg.solve(rows[:, list(places)], rows)
        return left


class Columns:
    """Columns over the rows of one base: centred, of unit length, with their cross-products.

    Parameters
    ----------
    read : callable
        Values of a column over the base, shape (n_rows,).
    n_rows : int
    """

    def __init__(self, read: Callable[[Key], FloatArray], n_rows: int) -> None:
        self.n_rows = n_rows
        self._read = read
        self._place: dict[Key, int] = {}
        self._places: dict[tuple[Key, ...], Places] = {}
        self._values = np.empty((n_rows, 0), order="F")
        self._gram = np.empty((0, 0))
        self._centre = np.empty(0)
        self._length = np.empty(0)
        self._designs: dict[tuple[tuple[int, ...], tuple[Key, ...]], Design] = {}

    @property
    def width(self) -> int:
        """How many columns there are so far."""
        return len(self._place)

    @property
    def values(self) -> FloatArray:
        """All columns, shape (n_rows, width)."""
        return self._values[:, : self.width]

    def places(self, keys: Sequence[Key]) -> Places:
        """Where columns stand; those that are new are added."""
        wanted = tuple(keys)
        known = self._places.get(wanted)
        if known is None:
            missing = [key for key in wanted if key not in self._place]
            if missing:
                self._add(list(dict.fromkeys(missing)))
            known = np.array([self._place[key] for key in wanted], dtype=np.intp)
            if len(self._places) >= PLACES_AT_HAND:
                self._places.clear()
            self._places[wanted] = known
        return known

    def length(self, places: Places) -> FloatArray:
        """Length of columns about their mean in the base, in their own units."""
        return self._length[places]

    def centre(self, places: Places) -> FloatArray:
        """Mean of columns over the base, in their own units."""
        return self._centre[places]

    def mean(self, key: Key) -> float:
        """Mean of one column over the base."""
        return float(self._centre[self.places((key,))[0]])

    def design(self, keys: Sequence[Key], gone: tuple[int, ...]) -> Design:
        """The factored model of some columns in the rows of the base less those that are gone.

        Raises
        ------
        NotQuick
            When a column keeps too little of its length beside the ones before it.
        """
        wanted = (gone, tuple(keys))
        known = self._designs.get(wanted)
        if known is None:
            known = self._design(keys, gone)
            self._designs[wanted] = known
            if len(self._designs) > AT_HAND:
                del self._designs[next(iter(self._designs))]
        return known

    def about_mean(self, design: Design) -> FloatArray:
        """Columns of a design about their mean in the rows in use, shape (n, k)."""
        found = design._kept.get("about_mean")
        if found is None:
            values = self._values[:, design.places]
            if len(design.gone):
                values = np.delete(values, design.gone, axis=0) - design.mean
            found = design._kept["about_mean"] = values
        return found

    def pulls(self, design: Design) -> FloatArray:
        """``(X'X)⁻¹ x`` of each row in use, slopes only, shape (n, k)."""
        found = design._kept.get("pulls")
        if found is None:
            found = design._kept["pulls"] = self.about_mean(design) @ design.inverse
        return found

    def leverage(self, design: Design) -> FloatArray:
        """Diagonal of the hat matrix, shape (n,)."""
        found = design._kept.get("leverage")
        if found is None:
            found = np.einsum("ij,ij->i", self.pulls(design), self.about_mean(design)) + 1.0 / design.n
            design._kept["leverage"] = found
        return found

    def cross(self, one: Places, other: Places, gone: Places) -> FloatArray:
        """Cross-products of columns about their means in the rows in use."""
        found = self._gram[np.ix_(one, other)]
        if len(gone):
            left = self._values[gone]
            sums = left.sum(axis=0)
            found = found - left[:, one].T @ left[:, other]
            found -= np.outer(sums[one], sums[other]) / (self.n_rows - len(gone))
        return found

    def _design(self, keys: Sequence[Key], gone: tuple[int, ...]) -> Design:
        places, rows = self.places(keys), np.array(gone, dtype=np.intp)
        n = self.n_rows - len(rows)
        mean = -self._values[np.ix_(rows, places)].sum(axis=0) / n if len(rows) else np.zeros(len(places))
        gram = self.cross(places, places, rows)
        return Design(
            places=places, gone=rows, n=n, mean=mean, gram=gram, inverse=inverse_of(gram)
        )  # fmt: skip

    def _add(self, keys: list[Key]) -> None:
        """Read, centre and scale columns, and take their cross-products with all."""
        new = np.empty((self.n_rows, len(keys)), order="F")
        for at, key in enumerate(keys):
            new[:, at] = self._read(key)
        centre = new.mean(axis=0)
        new -= centre
        with np.errstate(over="ignore", invalid="ignore"):
            length = np.sqrt(np.einsum("ij,ij->j", new, new))
        if not np.isfinite(length).all():
            raise NotQuick("a column is too large for doubles alone")
        # What is left of a constant column is rounding of its mean.
        length[length <= ROUNDING * np.sqrt(self.n_rows) * np.abs(centre)] = 0.0
        new *= np.where(length > 0.0, 1.0 / np.where(length > 0.0, length, 1.0), 0.0)
        old, width = self.width, self.width + len(keys)
        if width > self._values.shape[1]:
            room = max(width, min(2 * width, width + 32))
            grown = np.empty((self.n_rows, room), order="F")
            grown[:, :old] = self._values[:, :old]
            self._values = grown
        self._values[:, old:width] = new
        gram = np.empty((width, width))
        gram[:old, :old] = self._gram
        across = self._values[:, :width].T @ new
        gram[:, old:] = across
        gram[old:] = across.T
        self._gram = gram
        self._centre = np.concatenate([self._centre, centre])
        self._length = np.concatenate([self._length, length])
        self._place |= {key: old + at for at, key in enumerate(keys)}


def inverse_of(gram: FloatArray) -> FloatArray:
    """Inverse of cross-products of columns that had unit length, by Cholesky's factor.

    Raises
    ------
    NotQuick
        When a pivot is below ``SMALLEST_PIVOT``.
    """
    if not len(gram):
        return gram
    factor, failed = dpotrf(gram, lower=1)
    if failed or not bool((factor.diagonal() ** 2 > SMALLEST_PIVOT).all()):
        raise NotQuick("columns nearly depend on each other")
    inverse, _ = dpotri(factor, lower=1)
    lower = np.tril(inverse)
    whole: FloatArray = lower + lower.T
    np.fill_diagonal(whole, lower.diagonal())
    return whole


class Response:
    """An outcome over the rows of a base, with its cross-products with the columns.

    Parameters
    ----------
    columns : Columns
    values : FloatArray, shape (n_rows,)
    cross : FloatArray, optional
        Cross-products of the first so many columns with the values about their mean.
    """

    def __init__(self, columns: Columns, values: FloatArray, cross: FloatArray | None = None) -> None:
        self._columns = columns
        self.centre = float(values.mean())
        self.about = values - self.centre
        with np.errstate(over="ignore"):
            self.total = float(self.about @ self.about)
        if not np.isfinite(self.total) or self.total < 1e-250:
            raise NotQuick("the outcome is too large or too small for doubles alone")
        self._cross = np.empty(0) if cross is None else cross

    def cross(self, places: Places) -> FloatArray:
        """Cross-products with columns, over the base."""
        width, known = self._columns.width, len(self._cross)
        if known < width:
            more = self.about @ self._columns.values[:, known:]
            self._cross = np.concatenate([self._cross, more])
        found: FloatArray = self._cross[places]
        return found

    def cross_in(self, places: Places, gone: Places) -> FloatArray:
        """Cross-products with columns about the means in the rows in use."""
        found = self.cross(places)
        if len(gone):
            left, own = self._columns.values[np.ix_(gone, places)], self.about[gone]
            n = self._columns.n_rows - len(gone)
            found = found - own @ left - left.sum(axis=0) * (own.sum() / n)
        return found

    def total_in(self, gone: Places) -> float:
        """Sum of squares about the mean in the rows in use."""
        if not len(gone):
            return self.total
        own = self.about[gone]
        left = self.total - float(own @ own) - float(own.sum()) ** 2 / (len(self.about) - len(gone))
        if left < SMALLEST_LEFT * self.total:
            raise NotQuick("the rows that are gone were nearly all of the outcome's variation")
        return left

    def in_use(self, gone: Places) -> FloatArray:
        """Values about their mean in the rows in use."""
        if not len(gone):
            return self.about
        kept: FloatArray = np.delete(self.about, gone)
        kept -= kept.mean()
        return kept


@dataclass(frozen=True, slots=True, eq=False)
class Solved:
    """Least squares of a response on a design.

    Attributes
    ----------
    design : Design
    slopes : FloatArray, shape (k,)
        Of the columns as they stand in the store, in units of the outcome.
    rss, tss : float
    """

    design: Design
    slopes: FloatArray
    rss: float
    tss: float

    @property
    def s2(self) -> float:
        """Residual mean square."""
        return self.rss / self.design.df


def solved(design: Design, response: Response) -> Solved:
    """Slopes and sums of squares.

    Raises
    ------
    NotQuick
        When the fit is nearly exact, or there is no residual degree of freedom.
    """
    cross = response.cross_in(design.places, design.gone)
    slopes = design.inverse @ cross
    total = response.total_in(design.gone)
    rss = total - float(cross @ slopes)
    if design.df < 1 or not rss > SMALLEST_REST * response.total:
        raise NotQuick("the fit is nearly exact")
    return Solved(design=design, slopes=slopes, rss=rss, tss=total)


def residual_of(columns: Columns, fit: Solved, response: Response) -> FloatArray:
    """Residuals of the rows in use, shape (n,)."""
    about = response.in_use(fit.design.gone)
    return about - columns.about_mean(fit.design) @ fit.slopes if fit.design.k else about
