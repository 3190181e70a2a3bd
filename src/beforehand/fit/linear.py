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
from beforehand.fit.slices import BITS, sliced

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
    for start in range(0, source.n_rows, rows):
        stop = min(start + rows, source.n_rows)
        yield start, stop, _block(source, forms, start, stop)


def _block(source: Source, forms: Forms, start: int, stop: int) -> FloatArray:
    """The forms over one block of rows."""
    shape = (stop - start, len(forms.scale))
    total = np.broadcast_to(forms.constant, shape).copy()
    rest = np.broadcast_to(forms.constant_rest, shape).copy()
    if forms.keys:
        block = np.empty((stop - start, len(forms.keys)), order="F")
        for place, key in enumerate(forms.keys):
            block[:, place] = source.read(key, start, stop)
        sums: list[FloatArray | None] = [None] * forms.levels
        for depth, one in enumerate(sliced(block, forms.tops)):
            for level in range(depth, forms.levels):
                product = one @ forms.slices[level - depth]
                known = sums[level]
                sums[level] = product if known is None else known + product
        for level, partial in enumerate(sums):
            if partial is not None:
                part = np.ldexp(partial, forms.scale - BITS * (level + 2))
                # Knuth's two-sum: the rounding of each addition is kept.
                grown = total + part
                back = grown - total
                rest += (total - (grown - back)) + (part - back)
                total = grown
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
