"""What a step may ask for: fits, checks and row measures of a model.

A run and a rehearsal call the same steps with a different bench. The recording bench keeps every
fit and check under a number for the lock; a quick one keeps none and numbers nothing.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.results import Check, Fit
from beforehand.steps.state import Model, Rows, State, Transform

FloatArray = NDArray[np.float64]
Positions = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Fitted:
    """A fit under its number in the record."""

    id: str
    model: Model
    fit: Fit

    def p_of(self, name: str) -> float | None:
        """The p of a predictor: its t test's for one column, its block's F test's otherwise."""
        return self.fit.tests[name].p

    def statistic_of(self, name: str) -> float:
        """|t| of a predictor of one column, or the F of its block; infinite in an exact fit."""
        statistic = self.fit.tests[name].statistic
        return float("inf") if statistic is None else abs(statistic)

    def significant(self, name: str, alpha: float) -> bool:
        """Whether the predictor's p is at or below alpha; in an exact fit every one counts."""
        p = self.p_of(name)
        return p is None or p <= alpha


@dataclass(frozen=True, slots=True)
class Checked:
    """A check under its number in the record, held against its level."""

    id: str
    check: Check
    alpha: float
    fit: str

    @property
    def failed(self) -> bool:
        """The check was made and its p is below its level."""
        return self.check.p is not None and self.check.p < self.alpha


@dataclass(frozen=True, slots=True)
class Linked:
    """An exact linear dependence: ``predictor`` is determined by the ones in ``weights``."""

    predictor: str
    column: str
    weights: tuple[tuple[str, float], ...]
    constant: bool
    members: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Measures:
    """Influence measures of every row in use, in canonical order; arrays of shape ``(n,)``.

    ``sole`` marks rows of leverage 1: without one of them a coefficient cannot be estimated.
    """

    positions: Positions
    leverage: FloatArray
    studentized: FloatArray
    cooks_distance: FloatArray
    dffits: FloatArray
    largest_dfbetas: FloatArray | None
    covariance_ratio: FloatArray
    sole: NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Comparison:
    """One row left out alone, against the fit with it.

    ``change_coefficient`` is the largest change of a coefficient other than the intercept, in
    standard errors of the fit with the row, and ``of`` the column in question. Both are None for
    a row of leverage 1, where a coefficient cannot be estimated without it.
    """

    position: int
    change_r_squared: float | None
    change_coefficient: float | None
    of: str
    significance_changes: tuple[str, ...] = ()
    sign_changes: tuple[str, ...] = ()


class Bench(Protocol):
    """What supplies a step with numbers.

    ``step`` is the step that asks; whoever calls the steps sets it.
    """

    step: str

    def design(self, state: State) -> Model:
        """The working model of a state."""
        ...

    def fit(self, model: Model, why: str) -> Fitted:
        """Least squares; the same model asked for twice is one fit."""
        ...

    def label(self, position: int) -> str:
        """The label of a row of the base."""
        ...

    def two_valued(self, name: str, rows: Rows) -> bool:
        """Whether a numeric predictor has fewer than three values in these rows."""
        ...

    def domain(self, name: str, rung: str, rows: Rows) -> str:
        """Why a rung cannot be applied to a predictor (or the outcome, name ''); '' when it can."""
        ...

    def learn(self, model: Model, name: str, rung: str) -> Transform:
        """The rung with its exponent learned from this model (``box_cox``), else as it is."""
        ...

    def curvature(self, fitted: Fitted, name: str, alpha: float) -> Checked:
        """T test of the predictor's added square."""
        ...

    def spread(self, fitted: Fitted, name: str | None, test: str, alpha: float) -> Checked:
        """Equal spread along one predictor, or along the whole design for None."""
        ...

    def normality(self, fitted: Fitted, test: str, alpha: float) -> Checked:
        """Normal residuals."""
        ...

    def independence(self, fitted: Fitted, test: str, lags: int, alpha: float) -> Checked:
        """Serial independence in the declared order."""
        ...

    def reset(self, fitted: Fitted, alpha: float) -> Checked:
        """Powers of the fitted values added to the model."""
        ...

    def dependence(self, model: Model) -> Linked | None:
        """The first exact linear dependence among the columns, in plan order."""
        ...

    def correlations(self, model: Model) -> Sequence[tuple[str, str, float]]:
        """Correlations of every pair of single-column predictors."""
        ...

    def inflation(self, model: Model) -> Sequence[tuple[str, float]]:
        """VIF of each predictor; for a block the generalized VIF to the power 1/df."""
        ...

    def inflation_without(self, model: Model, name: str) -> Mapping[str, float]:
        """The same for one predictor, after each other predictor in turn has been left out."""
        ...

    def measures(self, fitted: Fitted, *, dfbetas: bool) -> Measures:
        """Influence measures of every row; DFBETAS only where a limit asks for them."""
        ...

    def without_each(
        self, fitted: Fitted, measures: Measures, flagged: Positions, alpha: float
    ) -> Sequence[Comparison]:
        """Each flagged row (indices into the measures) left out alone, in the order given."""
        ...

    def robust(self, fitted: Fitted, errors: str, why: str) -> Fitted:
        """The same coefficients with other standard errors."""
        ...

    def best_subset(
        self, model: Model, alpha: float, forced: Callable[[tuple[str, ...]], bool]
    ) -> Model | None:
        """Largest adjusted R² among the subsets that ``forced`` admits and whose rest is significant."""
        ...

    def keep_check(self, kind: str, make: Callable[[], object]) -> None:
        """Put a table of the step in the record, if one is kept; only then is it made."""
        ...
