"""Sources of columns that a check makes itself, laid over the columns of the table.

Auxiliary regressions need columns that the table has not: squared residuals, lagged residuals,
powers of fitted values, columns times a weight. They are supplied here, so that their cross-products
are as exact as those of the table.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from beforehand.fit.columns import Factor, FloatArray, Key, Source

# No rung of the ladder, so that no column of a table can have the same key.
_MADE = "made"


def made(name: str) -> Key:
    """Key of a column that a check makes."""
    return Key((Factor(column=name, rung=_MADE),))


ONES = made("ones")


@dataclass(frozen=True, slots=True)
class Overlay:
    """The columns of ``base`` and some more.

    Attributes
    ----------
    base : Source
    columns : mapping of Key to FloatArray
        Each of shape ``(base.n_rows,)``, in the row order of ``base``.
    """

    base: Source
    columns: Mapping[Key, FloatArray] = field(default_factory=dict)

    @property
    def n_rows(self) -> int:
        """Rows of the base."""
        return self.base.n_rows

    def read(self, key: Key, start: int, stop: int) -> FloatArray:
        """Values of ``key`` in rows ``start`` to ``stop`` (exclusive)."""
        if key in self.columns:
            return self.columns[key][start:stop]
        return self.base.read(key, start, stop)


@dataclass(frozen=True, slots=True)
class Weighted:
    """Every column of ``base`` times a weight of its row; ``ONES`` is the weight itself.

    Attributes
    ----------
    base : Source
    weight : FloatArray
        Shape ``(base.n_rows,)``.
    """

    base: Source
    weight: FloatArray

    @property
    def n_rows(self) -> int:
        """Rows of the base."""
        return self.base.n_rows

    def read(self, key: Key, start: int, stop: int) -> FloatArray:
        """Values of ``key`` times the weight, in rows ``start`` to ``stop`` (exclusive)."""
        weight = self.weight[start:stop]
        return weight if key == ONES else self.base.read(key, start, stop) * weight


@dataclass(frozen=True, slots=True)
class Made:
    """Columns of arrays alone, all of the same length."""

    columns: Mapping[Key, FloatArray]

    @property
    def n_rows(self) -> int:
        """Length of the arrays."""
        return len(next(iter(self.columns.values())))

    def read(self, key: Key, start: int, stop: int) -> FloatArray:
        """Values of ``key`` in rows ``start`` to ``stop`` (exclusive)."""
        return self.columns[key][start:stop]
