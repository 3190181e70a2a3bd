"""The values of design columns over the base of a run: fills applied, rungs and levels evaluated."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np
from numpy.typing import NDArray

from beforehand.fit import ladder
from beforehand.fit.columns import Factor, FloatArray, Key
from beforehand.fit.fitting import Unrepresentable
from beforehand.steps.missing_data import Base
from beforehand.table import Table


class TableSource:
    """Supplies design columns block by block; nothing wider than a block is ever made.

    Parameters
    ----------
    table : Table
    kept : array of int, shape (n_rows,)
        Rows of the table in use, ascending.
    patched : mapping of column to array
        Columns whose missing cells were filled, over all rows of the table.
    """

    def __init__(
        self,
        table: Table,
        kept: NDArray[np.int64],
        patched: Mapping[str, NDArray[np.float64]],
        *,
        whole: bool | None = None,
    ) -> None:
        self._table = table
        self._kept = kept
        self._whole = len(kept) == table.n_rows if whole is None else whole
        self._patched = patched

    @classmethod
    def of(cls, table: Table, base: Base) -> TableSource:
        """The source of a run's base."""
        patched = {
            fill.predictor: _patched(table.columns[fill.predictor].values, fill.positions, fill.values)
            for fill in base.fills
        }
        return cls(table, base.kept, patched)

    def without(self, gone: tuple[int, ...]) -> TableSource:
        """The same columns without some rows of the base."""
        if not gone:
            return self
        return TableSource(self._table, np.delete(self._kept, gone), self._patched)

    def with_column(self, column: str, values: FloatArray) -> TableSource:
        """The same rows with other values, shape (n_rows,), in one column."""
        whole = np.full(self._table.n_rows, np.nan)
        whole[self._kept] = values
        return TableSource(self._table, self._kept, {**self._patched, column: whole}, whole=self._whole)

    @property
    def n_rows(self) -> int:
        """Rows of the base."""
        return len(self._kept)

    def select(self, positions: NDArray[np.int64]) -> TableSource:
        """The same columns in some rows only, in the order given."""
        return TableSource(self._table, self._kept[positions], self._patched, whole=False)

    def raw(self, column: str, start: int = 0, stop: int | None = None) -> FloatArray:
        """A table column over base rows, fills applied: numbers, or codes of levels as floats."""
        values = self._patched.get(column)
        if values is None:
            values = self._table.columns[column].values
        rows = values[start:stop] if self._whole else values[self._kept[start:stop]]
        return np.asarray(rows, dtype=np.float64)

    def at(self, column: str, positions: NDArray[np.int64]) -> FloatArray:
        """A table column in some rows of the base."""
        values = self._patched.get(column)
        if values is None:
            values = self._table.columns[column].values
        return np.asarray(values[self._kept[positions]], dtype=np.float64)

    def levels(self, column: str) -> tuple[str, ...]:
        """Levels of a category, in their declared order."""
        return self._table.columns[column].levels

    def read(self, key: Key, start: int, stop: int) -> FloatArray:
        """Values of a design column in rows ``start`` to ``stop``."""
        return evaluate(key, lambda column: self.raw(column, start, stop), self.levels)

    def rows(self, key: Key, positions: NDArray[np.int64]) -> FloatArray:
        """Values of a design column in some rows of the base."""
        return evaluate(key, lambda column: self.at(column, positions), self.levels)

    def label(self, position: int) -> str:
        """The label of a row of the base."""
        return str(self._table.labels[int(self._kept[position])])

    def labels(self) -> list[str]:
        """Labels of all rows of the base, in canonical order."""
        labels = self._table.labels if self._whole else self._table.labels[self._kept]
        return [str(label) for label in labels.tolist()]


def _patched(
    values: NDArray[np.float64], positions: NDArray[np.int64], filled: NDArray[np.float64]
) -> NDArray[np.float64]:
    """A column with its missing cells filled."""
    whole = np.array(values, dtype=np.float64)
    whole[positions] = filled
    return whole


ReadColumn = Callable[[str], FloatArray]
ReadLevels = Callable[[str], tuple[str, ...]]


def evaluate(key: Key, read: ReadColumn, levels: ReadLevels) -> FloatArray:
    """The product of a key's factors, squared about its centre where it has one.

    The operations are elementwise and in the order of the factors, so that the result does not
    depend on blocks.
    """
    product: FloatArray | None = None
    with np.errstate(over="ignore", invalid="ignore"):
        for factor in key.factors:
            values = _factor(factor, read(factor.column), levels)
            product = values if product is None else product * values
        assert product is not None
        if key.centre is not None:
            about = product - key.centre
            product = about * about
    if (len(key.factors) > 1 or key.centre is not None) and not np.isfinite(product).all():
        what = "the square" if key.centre is not None else "the product"
        raise Unrepresentable(
            f"{what} of {' and '.join(factor.column for factor in key.factors)} is too large for a double; "
            "other units of the columns help"
        )
    return product


def _factor(factor: Factor, values: FloatArray, levels: ReadLevels) -> FloatArray:
    """One factor: the indicator of a level, or a number under its rung."""
    if factor.level:
        return np.asarray(values == levels(factor.column).index(factor.level), dtype=np.float64)
    if factor.rung == "identity":
        return values
    return ladder.apply(factor.rung, values, factor.exponent)
