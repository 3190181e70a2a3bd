"""From a lock and new cases to predictions, each with the reasons why it may not hold."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from beforehand.fit.columns import FloatArray
from beforehand.fit.ladder import IDENTITY
from beforehand.lock import Lock
from beforehand.plan import Plan
from beforehand.predicting.cases import Prepared, prepared_cases, told_apart
from beforehand.predicting.equation import Predicted, predicted
from beforehand.predicting.needs import prediction_in
from beforehand.table.preparing import AsRead

# The largest leverage of the fit stands in the lock to ten digits.
SAME_LEVERAGE = 1e-8

RANGE_CAUTION = (
    "A prediction holds inside the range that the fit has seen; beyond it nothing is known of the equation."
)
CHOSEN_CAUTION = (
    "The model was chosen on its data; the intervals take it as given and are somewhat too narrow for that."
)
MEAN_CAUTION = "No predictor is in the answer: the mean is predicted for every case."
INCONCLUSIVE_CAUTION = (
    "The model was too weak to be adopted: the mean is predicted for every case, whatever its predictors."
)
SPREAD_CAUTION = (
    "The standard errors do not lean on equal spread, but the interval of a single case does: it takes one "
    "spread for all cases."
)


@dataclass(frozen=True, slots=True, kw_only=True)
class PredictedCase:
    """One new case.

    Attributes
    ----------
    label : str
        Its row label, or its number from 1.
    prediction : float or None
        The mean of such cases, in units of the outcome; None where nothing can be said.
    mean_low, mean_high, case_low, case_high : float or None
        Ends of the interval for that mean, and for a single case.
    outside : tuple of str
        Why the case is not one of those that the fit has seen; empty where it is.
    filled : tuple of str
        Predictors whose missing cell was filled as the plan says.
    """

    label: str
    prediction: float | None
    mean_low: float | None
    mean_high: float | None
    case_low: float | None
    case_high: float | None
    outside: tuple[str, ...] = ()
    filled: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Predictions:
    """Predictions for a table of new cases.

    Attributes
    ----------
    label : str
        Column of the row labels; ``row`` where the plan has none and cases are numbered.
    outcome : str
    unit : str or None
    level : float
        Of both intervals.
    status : str
        Of the run: ``adopted``, ``mean_only`` or ``inconclusive``.
    equation : str or None
        The equation that predicts; None where the mean does.
    cases : tuple of PredictedCase
        In the order of the new table.
    cautions : tuple of str
    """

    label: str
    outcome: str
    unit: str | None
    level: float
    status: str
    equation: str | None
    cases: tuple[PredictedCase, ...]
    cautions: tuple[str, ...]

    @property
    def outside(self) -> int:
        """How many cases are outside what the fit has seen."""
        return sum(bool(case.outside) for case in self.cases)

    @property
    def unpredicted(self) -> int:
        """How many cases have no prediction."""
        return sum(case.prediction is None for case in self.cases)


def predictions(lock: Lock, plan: Plan, read: AsRead, *, name: str = "lock") -> Predictions:
    """Predict new cases from a lock alone.

    Parameters
    ----------
    lock : Lock
    plan : Plan
        As it is written in the lock.
    read : AsRead
        The columns of `needs.wanted_by`, rows in the order in which they are wanted back.
    name : str
        How a fault calls the lock's file.

    Returns
    -------
    Predictions
        An adopted equation predicts by its columns. ``mean_only`` predicts the mean; so does
        ``inconclusive``, since its model was reported and not adopted.

    Raises
    ------
    LockError
        As of `needs.prediction_in`.
    """
    prediction = prediction_in(lock, name)
    assert lock.answer is not None
    outcome = lock.answer.outcome
    cases = prepared_cases(lock, plan, prediction, read)
    exponent = 1.0 if outcome.exponent is None else outcome.exponent
    found = predicted(prediction, cases.design, rung=outcome.transform, exponent=exponent)
    _note_leverage(cases, found.leverage, prediction.largest_leverage)
    _note_way_back(cases, found, outcome.transform)
    return Predictions(
        label=plan.data.row_label or "row",
        outcome=outcome.column,
        unit=outcome.unit,
        level=prediction.level,
        status=lock.status,
        equation=lock.answer.equation if prediction.columns else None,
        cases=tuple(_cases(plan, read, cases, found)),
        cautions=tuple(_cautions(lock, plan, bool(prediction.columns))),
    )


def _note_leverage(cases: Prepared, leverage: FloatArray, largest: float) -> None:
    """Cases that lie farther out than any row of the fit, all predictors together."""
    with np.errstate(invalid="ignore"):
        rows = np.flatnonzero(leverage > largest * (1.0 + SAME_LEVERAGE)).tolist()
    for row in rows:
        said, end = told_apart(float(leverage[row]), largest, digits=2)
        cases.reasons.add(row, f"leverage {said} is above the largest in the fit, {end}")


def _note_way_back(cases: Prepared, found: Predicted, rung: str) -> None:
    """Cases for which a number on the outcome's own scale does not exist."""
    inside = np.isfinite(found.leverage)
    ends = np.column_stack([found.mean_low, found.mean_high, found.case_low, found.case_high])
    lost = ~np.isfinite(found.prediction) & inside
    some = ~np.isfinite(ends).all(axis=1) & inside & ~lost
    way = "the arithmetic" if rung == IDENTITY else f"the way back from {rung.replace('_', ' ')}"
    for row in np.flatnonzero(lost).tolist():
        cases.reasons.add(row, f"{way} gives no finite mean")
    for row in np.flatnonzero(some).tolist():
        cases.reasons.add(row, f"{way} gives no finite interval")


def _cases(plan: Plan, read: AsRead, cases: Prepared, found: Predicted) -> Iterator[PredictedCase]:
    """Each case with its numbers."""
    label = plan.data.row_label
    labels = range(1, read.n_rows + 1) if label is None else read.columns[label].tolist()
    numbers = zip(
        found.prediction.tolist(), found.mean_low.tolist(), found.mean_high.tolist(),
        found.case_low.tolist(), found.case_high.tolist(), strict=True,
    )  # fmt: skip
    for row, (one, values) in enumerate(zip(labels, numbers, strict=True)):
        prediction, mean_low, mean_high, case_low, case_high = map(_or_none, values)
        yield PredictedCase(
            label=f"{one:.15g}" if isinstance(one, float) else str(one),
            prediction=prediction,
            mean_low=mean_low,
            mean_high=mean_high,
            case_low=case_low,
            case_high=case_high,
            outside=tuple(cases.reasons.rows.get(row, ())),
            filled=tuple(cases.filled.get(row, ())),
        )


def _or_none(value: float) -> float | None:
    """A number, or None for what does not exist."""
    return value if math.isfinite(value) else None


def _cautions(lock: Lock, plan: Plan, equation: bool) -> Iterator[str]:
    """What must be known beside the numbers."""
    assert lock.answer is not None
    if lock.status == "inconclusive":
        yield INCONCLUSIVE_CAUTION
    elif not equation:
        yield MEAN_CAUTION
    else:
        yield RANGE_CAUTION
    if equation and "selection" in plan.steps and plan.selection.method != "none":
        yield CHOSEN_CAUTION
    if equation and lock.answer.errors != "classical":
        yield SPREAD_CAUTION
    rung = lock.answer.outcome.transform
    if rung != IDENTITY:
        yield (
            f"{lock.answer.outcome.column} was fitted under {rung.replace('_', ' ')}: a prediction is the "
            "mean on its own scale, by smearing, and the ends of intervals are taken back one by one."
        )
