"""What many runs of one plan over the same rows have in common: columns, designs, domains, models."""

from __future__ import annotations

import numpy as np

from beforehand.fit import ladder
from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.doubles import Columns, NotQuick
from beforehand.plan import Plan
from beforehand.steps.bench import Linked
from beforehand.steps.designing import Designer
from beforehand.steps.linking import linked_of
from beforehand.steps.source import TableSource
from beforehand.steps.state import Model, Rows, State, Term
from beforehand.steps.workings import Workings

# How many models are kept by the state they come from.
MODELS_AT_HAND = 4096


class Ground:
    """The predictors' side of a plan's runs over one base.

    Nothing here depends on the outcome, so that a thousand outcomes on the same rows share it.

    Parameters
    ----------
    plan : Plan
    source : TableSource
        The columns over the base.
    order, groups : FloatArray of shape (n_rows,) or None
        Rank of each row in the declared order; cluster of each row.
    """

    def __init__(
        self,
        plan: Plan,
        source: TableSource,
        *,
        order: FloatArray | None = None,
        groups: FloatArray | None = None,
    ) -> None:
        if not plan.intercept:
            raise NotQuick("a model without an intercept")
        self.plan, self.source, self.order, self.groups = plan, source, order, groups
        self.columns = Columns(lambda key: source.read(key, 0, source.n_rows), source.n_rows)
        self.designer = Designer(plan, source)
        self._workings: Workings | None = None
        self._squares: dict[Key, Key] = {}
        self._models: dict[tuple[object, ...], Model] = {}
        self._two_valued: dict[tuple[str, Rows], bool] = {}
        self._domains: dict[tuple[str, str, Rows], str] = {}
        self._linked: dict[tuple[Rows, tuple[Term, ...]], Linked | None] = {}

    def model(self, state: State) -> Model:
        """The working model of a state."""
        wanted = (state.rows, state.working, tuple(state.transforms.items()), state.outcome)
        known = self._models.get(wanted)
        if known is None:
            if len(self._models) >= MODELS_AT_HAND:
                self._models.clear()
            known = self._models[wanted] = self.designer.model(state)
        return known

    def two_valued(self, name: str, rows: Rows) -> bool:
        """Whether a numeric predictor has fewer than three values in these rows."""
        known = self._two_valued.get((name, rows))
        if known is None:
            values = self._raw(name, rows)
            low, high = values.min(), values.max()
            known = bool(np.all((values == low) | (values == high)))
            # What holds for the whole base is kept; parts of it are seldom met again.
            if not rows.gone:
                self._two_valued[(name, rows)] = known
        return known

    def domain(self, name: str, rung: str, rows: Rows) -> str:
        """Why a rung cannot be applied to a predictor; '' when it can."""
        known = self._domains.get((name, rung, rows))
        if known is None:
            known = ladder.domain(rung, self._raw(name, rows))
            if not rows.gone:
                self._domains[(name, rung, rows)] = known
        return known

    def dependence(self, model: Model) -> Linked | None:
        """The first exact linear dependence among the columns; doubles can only say that there is none."""
        if all(term.keys for term in model.terms):
            try:
                self.columns.design(model.keys, model.rows.gone)
            except NotQuick:
                pass
            else:
                return None
        known = (model.rows, model.terms)
        if known not in self._linked:
            if self._workings is None:
                self._workings = Workings(self.source, lambda _: None)
            self._linked[known] = linked_of(self._workings, model)
        return self._linked[known]

    def squares(self, model: Model) -> None:
        """Added squares of every number in a model, read at once."""
        new = [
            term.keys[0]
            for term in model.terms
            if term.kind == "number" and term.keys[0] not in self._squares
        ]
        if new:
            self.columns.places([self.square(key) for key in new])

    def square(self, key: Key) -> Key:
        """The added square of a column, about its mean in the base."""
        known = self._squares.get(key)
        if known is None:
            known = self._squares[key] = Key(key.factors, centre=self.columns.mean(key))
        return known

    def _raw(self, name: str, rows: Rows) -> FloatArray:
        values = self.source.raw(name)
        return np.delete(values, rows.gone) if rows.gone else values
