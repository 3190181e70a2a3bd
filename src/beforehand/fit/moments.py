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
from beforehand.fit.slices import BITS, BLOCK_ROWS, ZERO_EXPONENT, Slicer, exponents_of

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
        gone = moments_of(
            ArraySource({key: rows[:, place] for place, key in enumerate(self.keys)}), self.keys
        )
        units = [min(one, other) for one, other in zip(self.units, gone.units, strict=True)]
        sums, products = self._in_units(units)
        gone_sums, gone_products = gone._in_units(units)
        return Moments(
            self.keys, self.n - len(rows), tuple(units), self.tops, sums - gone_sums,
            products - gone_products, self.places,
        )  # fmt: skip

    def _in_units(self, units: Sequence[int]) -> tuple[Integers, Integers]:
        """Sums and cross-products in units that are no coarser than those held."""
        up = np.array([1 << (own - unit) for own, unit in zip(self.units, units, strict=True)], object)
        return self.sums * up, self.products * up[:, None] * up[None, :]

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


def _block_rows(n: int, k: int) -> int:
    """Rows of a block of k columns: few enough for a cache, so many that its products are worth it."""
    return min(n, BLOCK_ROWS, BLOCK_ROWS // 4 if k < 100 else BLOCK_ROWS)


def _blocks(source: Source, keys: Sequence[Key]) -> Iterator[FloatArray]:
    """Values of all columns, block by block: shape (rows, len(keys))."""
    # One workspace for all blocks: a block is used up before the next one is asked for.
    rows = _block_rows(source.n_rows, len(keys))
    whole = np.empty((rows, len(keys)), order="F")
    for start in range(0, source.n_rows, rows or 1):
        stop = min(start + rows, source.n_rows)
        block = whole[: stop - start]
        for place, key in enumerate(keys):
            block[:, place] = source.read(key, start, stop)
        yield block


# Sums of blocks stay below 2^53 each, so that this many fit into 63 bits.
_FLUSH = 512


def _extended(old: Moments, source: Source, new: tuple[Key, ...]) -> Moments:
    """Moments with more columns: one pass to find their size, one to add up products of slices."""
    keys = (*old.keys, *new)
    count, k = len(old.keys), len(keys)
    top = np.array([*old.tops, *_tops(source, new)], dtype=np.int64)
    sums, products, depth = _added_up(source, keys, count, top)
    units = [int(t) - BITS * depth for t in top]
    # Columns that were held before keep their finer or coarser unit: bring both to the finer.
    final = [min(unit, old.units[p]) if p < count else unit for p, unit in enumerate(units)]
    up_new = np.array([1 << (units[p] - final[p]) for p in range(k)], object)
    old_sums, old_products = old._in_units(final[:count])
    whole = np.zeros((k, k), object)
    whole[:count, :count] = old_products
    fresh = products * up_new[count:][:, None] * up_new[None, :]
    whole[count:, :] = fresh
    whole[:count, count:] = fresh[:, :count].T
    return Moments(
        keys, source.n_rows, tuple(final), tuple(int(t) for t in top),
        np.concatenate([old_sums, sums * up_new[count:]]), whole, {key: p for p, key in enumerate(keys)},
    )  # fmt: skip


def _tops(source: Source, keys: tuple[Key, ...]) -> list[int]:
    """Exponents above columns; 0 above a column of zeros."""
    top = np.full(len(keys), ZERO_EXPONENT, dtype=np.int64)
    for block in _blocks(source, keys):
        top = np.maximum(top, exponents_of(block))
    return [0 if t == ZERO_EXPONENT else int(t) for t in top]


def _added_up(
    source: Source, keys: tuple[Key, ...], count: int, top: NDArray[np.int64]
) -> tuple[Integers, Integers, int]:
    """Sums of the columns from ``count`` on, their products with all columns, and the depth of the slices.

    Both are counted in units of ``2**(top - BITS * depth)``.
    """
    k, m = len(keys), len(keys) - count
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

    slicer = Slicer(_block_rows(source.n_rows, len(keys)), top)
    for number, block in enumerate(_blocks(source, keys)):
        # All slices of all columns side by side, without those of zeros: one product for the block.
        alive = [one.places for one in slicer.cut(block)]
        stack = slicer.stack[: len(block)]
        if count:
            fresh = [places >= count for places in alive]
            left = stack[:, np.concatenate(fresh)]
            alive_left = [places[new] - count for places, new in zip(alive, fresh, strict=True)]
        else:
            left, alive_left = stack, alive
        product = (left.T @ stack).astype(np.int64)
        added = left.sum(axis=0).astype(np.int64)
        starts = np.cumsum([0, *map(len, alive)])
        starts_left = np.cumsum([0, *map(len, alive_left)])
        for i, rows in enumerate(alive_left):
            if not len(rows):
                continue
            own = slice(starts_left[i], starts_left[i + 1])
            held_sums = running_sums.setdefault(i, np.zeros(m, dtype=np.int64))
            held_sums[rows] += added[own]
            for j, columns in enumerate(alive):
                if not len(columns):
                    continue
                held = running.get((i, j))
                if held is None:
                    held = running[(i, j)] = np.zeros((m, k), dtype=np.int64)
                part = product[own, starts[j] : starts[j + 1]]
                if part.shape == held.shape:
                    held += part
                else:
                    held[np.ix_(rows, columns)] += part
        if number % _FLUSH == _FLUSH - 1:
            flush()
    flush()
    depth = 1 + max((max(pair) for pair in totals), default=-1)
    total_products: Any = np.zeros((m, k), object)
    for (i, j), matrix in totals.items():
        total_products = total_products + matrix * (1 << (BITS * (2 * depth - 2 - i - j)))
    total_sums: Any = np.zeros(m, object)
    for i, vector in sums.items():
        total_sums = total_sums + vector * (1 << (BITS * (depth - 1 - i)))
    return total_sums, total_products, depth
