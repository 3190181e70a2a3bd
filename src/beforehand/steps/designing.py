"""From a state to a model: which design columns each predictor has in the rows in use."""

from __future__ import annotations

import itertools

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import Factor, Key
from beforehand.plan import Plan
from beforehand.steps.keeping import product_name
from beforehand.steps.source import TableSource
from beforehand.steps.state import IDENTITY, Model, Rows, State, Term, Transform, factor_of


class Designer:
    """Knows a plan's predictors and which levels and combinations of levels occur in the rows.

    A level without a row has no column: its coefficient could not be estimated. The baseline is
    the declared one while it occurs, else the first level that does.
    """

    def __init__(self, plan: Plan, source: TableSource) -> None:
        self._plan = plan
        self._source = source
        self._categories = {p.column: p for p in plan.predictors if p.kind == "category"}
        self._numbers: dict[tuple[str, Transform], Term] = {}
        self._codes: dict[str, NDArray[np.int64]] = {}
        self._levels: dict[tuple[str, Rows], tuple[str, ...]] = {}
        self._combinations: dict[tuple[tuple[str, ...], Rows], frozenset[tuple[int, ...]]] = {}

    def model(self, state: State) -> Model:
        """The working model of a state."""
        products = {product_name(parts): parts for parts in self._plan.products}
        terms = tuple(
            self._product(name, products[name], state) if name in products else self._plain(name, state)
            for name in state.working
        )
        outcome = Key((factor_of(self._plan.outcome.column, state.outcome),))
        return Model(
            rows=state.rows,
            outcome=outcome,
            terms=terms,
            intercept=self._plan.intercept,
            errors=self.errors,
        )

    @property
    def errors(self) -> str:
        """The standard errors that the plan asks for from the start."""
        errors = self._plan.errors
        if isinstance(errors, str):
            return errors
        return "cluster" if hasattr(errors, "cluster_by") else "autocorrelation"

    def levels_in_use(self, name: str, rows: Rows) -> tuple[str, ...]:
        """Levels of a category that occur in these rows, the baseline first."""
        known = self._levels.get((name, rows))
        if known is None:
            declared = self._source.levels(name)
            counts = np.bincount(self._level_codes(name, rows), minlength=len(declared))
            present = [level for level, count in zip(declared, counts, strict=True) if count]
            baseline = self._categories[name].baseline or declared[0]
            first = [level for level in present if level == baseline]
            known = tuple(first + [level for level in present if level != baseline])
            self._levels[(name, rows)] = known
        return known

    def _level_codes(self, name: str, rows: Rows) -> NDArray[np.int64]:
        """Codes of the levels of a category in these rows."""
        codes = self._codes.get(name)
        if codes is None:
            codes = self._codes[name] = self._source.raw(name).astype(np.int64)
        return np.delete(codes, rows.gone) if rows.gone else codes

    def _plain(self, name: str, state: State) -> Term:
        """A number under its transform, or the indicators of a category."""
        if name not in self._categories:
            transform = state.transforms.get(name, IDENTITY)
            known = self._numbers.get((name, transform))
            if known is None:
                known = Term(name=name, keys=(Key((factor_of(name, transform),)),))
                self._numbers[(name, transform)] = known
            return known
        levels = self.levels_in_use(name, state.rows)
        # Without an intercept the first category keeps all its levels, as nothing else carries the mean.
        columns = levels if self._carries_mean(name, state) else levels[1:]
        keys = tuple(Key((Factor(column=name, level=level),)) for level in columns)
        return Term(name=name, keys=keys, kind="category")

    def _carries_mean(self, name: str, state: State) -> bool:
        """Whether a category stands in for the intercept: the first one of a plan that has none."""
        if self._plan.intercept:
            return False
        first = next(n for n in state.working if n in self._categories)
        return name == first

    def _product(self, name: str, parts: tuple[str, ...], state: State) -> Term:
        """Every product of the parts' columns that has a row of its own."""
        choices: list[list[Factor]] = []
        for part in parts:
            if part in self._categories:
                levels = self.levels_in_use(part, state.rows)[1:]
                choices.append([Factor(column=part, level=level) for level in levels])
            else:
                transform: Transform = state.transforms.get(part, IDENTITY)
                choices.append([factor_of(part, transform)])
        categories = tuple(part for part in parts if part in self._categories)
        present = self._present(categories, state.rows)
        keys = tuple(
            Key(tuple(factors))
            for factors in itertools.product(*choices)
            if self._codes_of(factors) in present
        )
        return Term(name=name, keys=keys, kind="product", parts=tuple(parts))

    def _codes_of(self, factors: tuple[Factor, ...]) -> tuple[int, ...]:
        """Codes of the levels in a product's column."""
        return tuple(self._source.levels(f.column).index(f.level) for f in factors if f.level)

    def _present(self, categories: tuple[str, ...], rows: Rows) -> frozenset[tuple[int, ...]]:
        """Combinations of levels that occur in these rows."""
        known = self._combinations.get((categories, rows))
        if known is None:
            if not categories:
                known = frozenset({()})
            else:
                stacked = np.column_stack([self._level_codes(name, rows) for name in categories])
                known = frozenset(tuple(int(c) for c in row) for row in np.unique(stacked, axis=0))
            self._combinations[(categories, rows)] = known
        return known
