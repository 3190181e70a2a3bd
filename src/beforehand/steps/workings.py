"""The workings of a run: moments, tableaus and row values of models, kept at hand while they are near."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import TypeVar

import numpy as np

from beforehand.fit.columns import Key
from beforehand.fit.moments import Moments, moments_of
from beforehand.fit.rows import RowValues, row_values
from beforehand.fit.tableau import Tableau, tableau_of
from beforehand.steps.source import TableSource
from beforehand.steps.state import Model, Rows

_K = TypeVar("_K")
_V = TypeVar("_V")

# How many tableaus and sets of row values are kept at hand; older ones are computed anew.
AT_HAND = 6

# Models that differ from one at hand by at most so many columns are reached by taking them out.
NEAR = 40


class Workings:
    """Computes what a model needs from the rows, and from what was computed before.

    Parameters
    ----------
    base : TableSource
        The columns over the base of the run.
    tell : callable
        Hears what is being done, a few words at a time.
    """

    def __init__(self, base: TableSource, tell: Callable[[str], None]) -> None:
        self._base = base
        self._tell = tell
        self._moments: Moments | None = None
        self._reduced: dict[tuple[int, ...], Moments] = {}
        self._sources: dict[tuple[int, ...], TableSource] = {}
        self._tableaus: dict[Model, Tableau] = {}
        self._row_values: dict[Model, RowValues] = {}

    def two_valued(self, column: str, rows: Rows) -> bool:
        """Whether a number has fewer than three values in these rows."""
        values = self.source(rows).raw(column)
        low, high = values.min(), values.max()
        return bool(np.all((values == low) | (values == high)))

    def mean(self, key: Key) -> float:
        """Mean of a column over the base."""
        assert self._moments is not None
        return self._moments.mean(key)

    def tableau(self, model: Model) -> Tableau:
        """The swept cross-products of a model, reached from a near one where there is one."""
        plain = replace(model, errors="classical")
        known = self._tableaus.get(plain)
        if known is None:
            known = self._from_near(plain) or tableau_of(
                self.moments(plain.rows, (*plain.keys, plain.outcome)),
                plain.outcome,
                plain.keys,
                intercept=plain.intercept,
            )
            _remember(self._tableaus, plain, known)
        return known

    def values(self, model: Model) -> RowValues:
        """Fitted values, residuals and leverages of the rows in use."""
        plain = replace(model, errors="classical")
        known = self._row_values.get(plain)
        if known is None:
            known = row_values(self.source(plain.rows), self.tableau(plain))
            _remember(self._row_values, plain, known)
        return known

    def moments(self, rows: Rows, keys: Sequence[Key]) -> Moments:
        """Moments of these rows that hold at least these columns."""
        if self._moments is None:
            self._tell(f"cross-products of {rows.base:,} rows")
            self._moments = moments_of(self._base, tuple(dict.fromkeys(keys)))
        missing = [key for key in dict.fromkeys(keys) if key not in self._moments]
        if missing:
            self._moments = self._moments.extended(self._base, missing)
        if not rows.gone:
            return self._moments
        reduced = self._reduced.get(rows.gone)
        if reduced is None or any(key not in reduced for key in keys):
            positions = np.array(rows.gone, dtype=np.int64)
            values = np.column_stack([self._base.rows(key, positions) for key in self._moments.keys])
            reduced = self._moments.without(values)
            _remember(self._reduced, rows.gone, reduced)
        return reduced

    def _from_near(self, model: Model) -> Tableau | None:
        """A tableau at hand whose model holds this one and a few columns more."""
        wanted = set(model.keys)
        best: tuple[int, Model] | None = None
        for other in self._tableaus:
            if (other.rows, other.outcome, other.intercept) != (model.rows, model.outcome, model.intercept):
                continue
            extra = len(other.keys) - len(model.keys)
            if 0 <= extra <= NEAR and (best is None or extra < best[0]) and wanted.issubset(other.keys):
                best = (extra, other)
        if best is None:
            return None
        gone = [key for key in best[1].keys if key not in wanted]
        return self._tableaus[best[1]].without(gone)

    def source(self, rows: Rows) -> TableSource:
        """The columns over these rows."""
        if not rows.gone:
            return self._base
        known = self._sources.get(rows.gone)
        if known is None:
            known = self._base.without(rows.gone)
            _remember(self._sources, rows.gone, known)
        return known


def _remember(cache: dict[_K, _V], key: _K, value: _V) -> None:
    """Keep the newest few."""
    cache[key] = value
    while len(cache) > AT_HAND:
        del cache[next(iter(cache))]
