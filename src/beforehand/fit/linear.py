"""Linear forms of rows, ``constant + sum of weight × column``, to more than double precision.

Columns and weights are cut into slices of few bits whose products BLAS adds without rounding, and
the partial sums are brought together in a fixed order of elementwise operations. The result does
not depend on the BLAS, on threads or on blocks, and keeps its digits where large terms cancel.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import FloatArray, Key, Source
from beforehand.fit.slices import BITS, ORDINARY_EXPONENT, Slicer

# Cells of a block of forms: small enough to stay in a cache while it is summed.
BLOCK_CELLS = 1 << 17

# Bits of a result that are right even where terms of the size of the largest cancel to it.
DOUBLE_BITS = 53

# More levels than this hold every bit of any double times any weight that matters.
MOST_LEVELS = 12


@dataclass(frozen=True, slots=True, kw_only=True)
class Forms:
    """Linear forms ready to be evaluated.

    Attributes
    ----------
    keys : tuple of Key
    tops : integers, shape (k,)
        Each column is below ``2**tops`` in size.
    slices : tuple of FloatArray, each of shape (k, q)
        Weights in integers of ``BITS`` bits, the coarsest first.
    scale : integers, shape (q,)
        Exponent of each form's largest term.
    constant, constant_rest : FloatArray, shape (q,)
        Constants as the sum of two doubles.
    levels : int
        How many levels of products are added.
    """

    keys: tuple[Key, ...]
    tops: NDArray[np.int64]
    slices: tuple[FloatArray, ...]
    scale: NDArray[np.int64]
    constant: FloatArray
    constant_rest: FloatArray
    levels: int


def forms_of(
    keys: Sequence[Key],
    tops: Sequence[int],
    weights: Sequence[Sequence[Fraction]],
    constants: Sequence[Fraction],
    *,
    lowest_bit: int | None = None,
) -> Forms:
    """Prepare linear forms.

    Parameters
    ----------
    keys : sequence of Key, length k
    tops : sequence of int, length k
        Exponents above each column.
    weights : rows of Fraction, shape (k, q)
    constants : sequence of Fraction, length q
    lowest_bit : int, optional
        Exponent of the last bit that a result needs; by default as many bits as a double has below
        the largest term, and as many again.

    Returns
    -------
    Forms
    """
    q = len(constants)
    scale = np.zeros(q, dtype=np.int64)
    for form in range(q):
        sizes = [_exponent(row[form]) + top for row, top in zip(weights, tops, strict=True) if row[form]]
        scale[form] = max(sizes, default=0)
    wanted = 2 * DOUBLE_BITS if lowest_bit is None else int(scale.max(initial=0)) - lowest_bit
    levels = min(MOST_LEVELS, max(3, -(-wanted // BITS)))
    slices = [np.zeros((len(keys), q)) for _ in range(levels)]
    for place, (row, top) in enumerate(zip(weights, tops, strict=True)):
        for form in range(q):
            for level, digit in enumerate(_digits(row[form], int(top) - int(scale[form]), levels)):
                slices[level][place, form] = digit
    first = [float(constant) for constant in constants]
    rest = [float(constant - Fraction(near)) for constant, near in zip(constants, first, strict=True)]
    return Forms(
        keys=tuple(keys), tops=np.array(tops, dtype=np.int64), slices=tuple(slices), scale=scale,
        constant=np.array(first), constant_rest=np.array(rest), levels=levels,
    )  # fmt: skip


def evaluated(source: Source, forms: Forms) -> Iterator[tuple[int, int, FloatArray]]:
    """Values of the forms, block by block.

    Parameters
    ----------
    source : Source
        No column may be larger than the ``tops`` with which the forms were prepared.
    forms : Forms

    Yields
    ------
    tuple of int, int and FloatArray
        Start and stop of the block, and values of shape (stop - start, q).
    """
    q = max(1, len(forms.scale))
    rows = max(256, min(8192, BLOCK_CELLS // max(q, len(forms.keys) or 1)))
    work = _Work(forms, min(rows, source.n_rows))
    for start in range(0, source.n_rows, rows):
        stop = min(start + rows, source.n_rows)
        yield start, stop, work.block(source, start, stop)


class _Work:
    """Evaluates forms block after block in one workspace."""

    def __init__(self, forms: Forms, rows: int) -> None:
        shape = (rows, len(forms.scale))
        self._forms = forms
        self._columns = np.empty((rows, len(forms.keys)), order="F")
        self._slicer = Slicer(rows, forms.tops)
        self._part, self._grown, self._back = (np.empty(shape) for _ in range(3))
        # A part in units of a level becomes a value by a power of two; far ones need ldexp.
        self._units = [forms.scale - BITS * (level + 2) for level in range(forms.levels)]
        self._near = all(int(np.abs(unit).max(initial=0)) < ORDINARY_EXPONENT for unit in self._units)

    def block(self, source: Source, start: int, stop: int) -> FloatArray:
        """The forms over one block of rows."""
        forms, n = self._forms, stop - start
        shape = (n, len(forms.scale))
        total = np.broadcast_to(forms.constant, shape).copy()
        rest = np.broadcast_to(forms.constant_rest, shape).copy()
        if not forms.keys:
            return total + rest
        columns = self._columns[:n]
        for place, key in enumerate(forms.keys):
            columns[:, place] = source.read(key, start, stop)
        slices = self._slicer.cut(columns)
        stack = self._slicer.stack[:n]
        part, grown, back = self._part[:n], self._grown[:n], self._back[:n]
        for level in range(forms.levels):
            # Slices of depth 0 to level stand side by side, their weights one above the other.
            deep = slices[: level + 1]
            weights = np.concatenate(
                [forms.slices[level - depth][one.places] for depth, one in enumerate(deep)]
            )
            np.matmul(stack[:, : len(weights)], weights, out=part)
            if self._near:
                np.multiply(part, np.ldexp(1.0, self._units[level]), out=part)
            else:
                np.ldexp(part, self._units[level], out=part)
            # Knuth's two-sum: the rounding of each addition is kept.
            np.add(total, part, out=grown)
            np.subtract(grown, total, out=back)
            part -= back
            np.subtract(grown, back, out=back)
            np.subtract(total, back, out=total)
            rest += total
            rest += part
            total, grown = grown, total
        return total + rest


def _exponent(value: Fraction) -> int:
    """Smallest e with |value| < 2^e, or one more."""
    return abs(value.numerator).bit_length() - value.denominator.bit_length() + 1


def _digits(value: Fraction, shift: int, levels: int) -> list[int]:
    """``value * 2**shift``, below 1 in size, as balanced digits of ``BITS`` bits, coarsest first."""
    up = shift + BITS * levels
    scaled = value * (1 << up) if up >= 0 else value / (1 << -up)
    rest = round(scaled)
    digits: list[int] = []
    half, base = 1 << (BITS - 1), 1 << BITS
    for _ in range(levels - 1):
        digit = (rest + half) % base - half
        digits.append(digit)
        rest = (rest - digit) >> BITS
    digits.append(rest)
    return digits[::-1]
