"""Names for the columns of a design, and the protocol of what can supply their values.

A column of a design is a product of factors; a factor is a table column under a rung of the
ladder, or the indicator of one level of a category. Nothing here holds numbers of the table.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True, order=True)
class Factor:
    """A table column as it enters a design.

    Attributes
    ----------
    column : str
        Column of the table.
    rung : str
        ``identity``, or the rung of the ladder that replaces it: ``square``, ``cube``,
        ``square_root``, ``cube_root``, ``log``, ``reciprocal``, ``box_cox``.
    level : str
        For a category: the level whose indicator this is; empty for a number.
    exponent : float
        The learned exponent of ``box_cox``; 1.0 otherwise.
    """

    column: str
    rung: str = "identity"
    level: str = ""
    exponent: float = 1.0


@dataclass(frozen=True, slots=True, order=True)
class Key:
    """One column of a design: a product of factors, or the square of it about a centre.

    Attributes
    ----------
    factors : tuple of Factor
        One factor for a plain column, two or more for a product.
    centre : float or None
        When given, the column is ``(product - centre) ** 2``: the added square of the
        curvature check. None for an ordinary column.
    """

    factors: tuple[Factor, ...]
    centre: float | None = None
    # Keys are looked up far more often than made.
    _hash: int = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_hash", hash((self.factors, self.centre)))

    def __hash__(self) -> int:
        """The hash, taken once."""
        return self._hash

    def __reduce__(self) -> tuple[type[Key], tuple[object, ...]]:
        """Made anew in another process, where text hashes otherwise."""
        return Key, (self.factors, self.centre)


class Source(Protocol):
    """What supplies the values of columns, block by block, for a fixed set of rows."""

    @property
    def n_rows(self) -> int:
        """Rows that a full pass runs over."""
        ...

    def read(self, key: Key, start: int, stop: int) -> FloatArray:
        """Values of ``key`` in rows ``start`` to ``stop`` (exclusive), shape ``(stop - start,)``."""
        ...
