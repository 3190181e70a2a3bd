"""Exact moments: sums and cross-products of columns as integers, without any rounding."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import Factor, FloatArray, Key, Source
from beforehand.fit.slices import BITS, BLOCK_ROWS, ZERO_EXPONENT, exponents_of, sliced

Integers = NDArray[Any]  # of Python integers

# Fixed-point fraction of the ratios that are formed from the integers.
FRACTION_BITS = 256


def named(name: str) -> Key:
    """Key of a plain column."""
    return Key((Factor(name),))


@dataclass(frozen=True, slots=True)
class ArraySource:
    """Columns that are plain arrays, all of the same length.

    Attributes
    ----------
    columns : mapping of Key to FloatArray, each of shape (n,)
    """

    columns: Mapping[Key, FloatArray]

    @property
    def n_rows(self) -> int:
        """Length of the arrays."""
        return len(next(iter(self.columns.values()))) if self.columns else 0

    def read(self, key: Key, start: int, stop: int) -> FloatArray:
        """Values of ``key`` in rows ``start`` to ``stop``."""
        return self.columns[key][start:stop]


@dataclass(frozen=True, slots=True, eq=False)
class Moments:
    """Exact sums and cross-products.

    Attributes
    ----------
    keys : tuple of Key
    n : int
        Rows.
    units : tuple of int
        Column ``k`` is counted in units of ``2**units[k]``.
    tops : tuple of int
        Column ``k`` is below ``2**tops[k]`` in size.
    sums : integers, shape (k,)
    products : integers, shape (k, k)
    places : mapping of Key to int
        Place of each column.
    """

    keys: tuple[Key, ...]
    n: int
    units: tuple[int, ...]
    tops: tuple[int, ...]
    sums: Integers
    products: Integers
    places: Mapping[Key, int]

    def __contains__(self, key: object) -> bool:
        """Whether a column is held."""
        return key in self.places

    def extended(self, source: Source, keys: Sequence[Key]) -> Moments:
        """These moments and those of more columns, in one pass over the rows.

        Parameters
        ----------
        source : Source
            The same rows; it supplies the columns held already too.
        keys : sequence of Key
            Those held already are passed over.
        """
        new = tuple(key for key in dict.fromkeys(keys) if key not in self.places)
        if not new:
            return self
        return _extended(self, source, new)

    def without(self, rows: FloatArray) -> Moments:
        """The moments less some rows.

        Parameters
        ----------
        rows : FloatArray, shape (m, k)
            Values of rows that are in these moments, columns in the order of ``keys``.
        """
        counted = _counted(rows, self.units)
        sums, products = self.sums.copy(), self.products.copy()
        for row in counted:
            sums = sums - row
            products = products - row[:, None] * row[None, :]
        return Moments(self.keys, self.n - len(rows), self.units, self.tops, sums, products, self.places)

    def restricted(self, keys: Sequence[Key]) -> Moments:
        """The moments of some of the columns."""
        keys = tuple(dict.fromkeys(keys))
        places = self.index(keys)
        return Moments(
            keys, self.n, tuple(self.units[p] for p in places), tuple(self.tops[p] for p in places),
            self.sums[places], self.products[np.ix_(places, places)], {key: k for k, key in enumerate(keys)},
        )  # fmt: skip

    def index(self, keys: Sequence[Key]) -> list[int]:
        """Places of columns."""
        return [self.places[key] for key in keys]

    def mean(self, key: Key) -> float:
        """Mean, correctly rounded."""
        k = self.places[key]
        return float(Fraction(int(self.sums[k]), self.n) * Fraction(2) ** self.units[k])

    def sd(self, key: Key) -> float:
        """Standard deviation with divisor n - 1, to the last digit; it needs two rows."""
        k = self.places[key]
        about = self.n * int(self.products[k, k]) - int(self.sums[k]) ** 2
        variance = Fraction(about, self.n * (self.n - 1)) * Fraction(4) ** self.units[k]
        return _root(variance)

    def correlation(self, a: Key, b: Key) -> float:
        """Pearson's correlation; 0 for a constant column."""
        about = self.about((a, b), centred=True)
        scale = math.isqrt((int(about[0, 0]) * int(about[1, 1])) << (2 * FRACTION_BITS))
        if scale == 0:
            return 0.0
        return (int(about[0, 1]) << (2 * FRACTION_BITS)) // scale / (1 << FRACTION_BITS)

    def constant(self, key: Key) -> bool:
        """Whether a column has one value only."""
        k = self.places[key]
        return self.n * int(self.products[k, k]) == int(self.sums[k]) ** 2

    def raw(self, left: Sequence[Key], right: Sequence[Key]) -> FloatArray:
        """Cross-products about 0 of two sets of columns, each correctly rounded."""
        out = np.empty((len(left), len(right)))
        for i, p in enumerate(self.index(left)):
            for j, q in enumerate(self.index(right)):
                value = Fraction(int(self.products[p, q])) * Fraction(2) ** (self.units[p] + self.units[q])
                out[i, j] = float(value)
        return out

    def about(self, keys: Sequence[Key], *, centred: bool) -> Integers:
        """Cross-products times n, about the means or about 0, in the columns' units."""
        places = self.index(keys)
        products = self.n * self.products[np.ix_(places, places)]
        if centred:
            sums = self.sums[places]
            products = products - sums[:, None] * sums[None, :]
        return products

    def cross(self, keys: Sequence[Key], *, centred: bool) -> FloatArray:
        """Cross-products scaled to a unit diagonal (0 for a column without spread), as doubles."""
        about = self.about(keys, centred=centred)
        k = len(keys)
        out = np.zeros((k, k))
        for i in range(k):
            for j in range(i + 1):
                scale = math.isqrt((int(about[i, i]) * int(about[j, j])) << (2 * FRACTION_BITS))
                if scale:
                    value = (int(about[i, j]) << (2 * FRACTION_BITS)) // scale / (1 << FRACTION_BITS)
                    out[i, j] = out[j, i] = value
        return out


def moments_of(source: Source, keys: Sequence[Key]) -> Moments:
    """Exact moments of columns over all rows of a source.

    Parameters
    ----------
    source : Source
        Finite values.
    keys : sequence of Key
        Repeated ones are held once.

    Returns
    -------
    Moments
        The same integers whatever the order of the rows, the blocks, the BLAS or its threads.
    """
    empty = Moments((), source.n_rows, (), (), np.empty(0, object), np.empty((0, 0), object), {})
    return _extended(empty, source, tuple(dict.fromkeys(keys)))


def _root(value: Fraction) -> float:
    """Square root of a fraction to double precision."""
    if value <= 0:
        return 0.0
    shift = 2 * (FRACTION_BITS // 2)
    extra = max(0, value.denominator.bit_length() - value.numerator.bit_length())
    shift += extra + extra % 2
    root = math.isqrt((value.numerator << shift) // value.denominator)
    return float(Fraction(root, 1 << (shift // 2)))


def _counted(rows: FloatArray, units: Sequence[int]) -> Integers:
    """Values as integers in the columns' units."""
    out = np.empty(rows.shape, object)
    for i in range(rows.shape[0]):
        for j in range(rows.shape[1]):
            numerator, denominator = float(rows[i, j]).as_integer_ratio()
            shift = -units[j] - (denominator.bit_length() - 1)
            out[i, j] = numerator << shift if shift >= 0 else numerator >> -shift
    return out


def _blocks(source: Source, keys: Sequence[Key]) -> Iterator[FloatArray]:
    """Values of all columns, block by block: shape (rows, len(keys))."""
    for start in range(0, source.n_rows, BLOCK_ROWS):
        stop = min(start + BLOCK_ROWS, source.n_rows)
        block = np.empty((stop - start, len(keys)), order="F")
        for place, key in enumerate(keys):
            block[:, place] = source.read(key, start, stop)
        yield block


# Sums of blocks stay below 2^53 each, so that this many fit into 63 bits.
_FLUSH = 512


def _extended(old: Moments, source: Source, new: tuple[Key, ...]) -> Moments:
    """Moments with more columns: one pass to find their size, one to add up products of slices."""
    keys = (*old.keys, *new)
    top = np.full(len(keys), ZERO_EXPONENT, dtype=np.int64)
    for block in _blocks(source, keys):
        top = np.maximum(top, exponents_of(block))
    top = np.where(top == ZERO_EXPONENT, 0, top)
    count, k, m = len(old.keys), len(keys), len(new)
    totals: dict[tuple[int, int], Any] = {}
    sums: dict[int, Any] = {}
    running: dict[tuple[int, int], NDArray[np.int64]] = {}
    running_sums: dict[int, NDArray[np.int64]] = {}

    def flush() -> None:
        for pair, matrix in running.items():
            totals[pair] = totals.get(pair, 0) + matrix.astype(object)
        for place, vector in running_sums.items():
            sums[place] = sums.get(place, 0) + vector.astype(object)
        running.clear()
        running_sums.clear()

    for number, block in enumerate(_blocks(source, keys)):
        slices = sliced(block, top)
        for i, one in enumerate(slices):
            s = one[:, count:].sum(axis=0).astype(np.int64)
            running_sums[i] = running_sums[i] + s if i in running_sums else s
            for j, other in enumerate(slices):
                product = (one[:, count:].T @ other).astype(np.int64)
                running[(i, j)] = running[(i, j)] + product if (i, j) in running else product
        if number % _FLUSH == _FLUSH - 1:
            flush()
    flush()
    depth = max(sums, default=-1) + 1
    units = [int(t) - BITS * depth for t in top]
    total_products: Any = np.zeros((m, k), object)
    for (i, j), matrix in totals.items():
        total_products = total_products + matrix * (1 << (BITS * (2 * depth - 2 - i - j)))
    total_sums: Any = np.zeros(m, object)
    for i, vector in sums.items():
        total_sums = total_sums + vector * (1 << (BITS * (depth - 1 - i)))
    # Columns that were held before keep their finer or coarser unit: bring both to the finer.
    final = [min(unit, old.units[p]) if p < count else unit for p, unit in enumerate(units)]
    up_new = np.array([1 << (units[p] - final[p]) for p in range(k)], object)
    up_old = np.array([1 << (old.units[p] - final[p]) for p in range(count)], object)
    products = np.zeros((k, k), object)
    if count:
        products[:count, :count] = old.products * up_old[:, None] * up_old[None, :]
    fresh = total_products * up_new[count:][:, None] * up_new[None, :]
    products[count:, :] = fresh
    products[:count, count:] = fresh[:, :count].T
    all_sums = np.concatenate([old.sums * up_old, total_sums * up_new[count:]])
    return Moments(
        keys, source.n_rows, tuple(final), tuple(int(t) for t in top), all_sums, products,
        {key: p for p, key in enumerate(keys)},
    )  # fmt: skip
