"""What a prediction needs: a lock with an answer, and some columns of the new table."""

from __future__ import annotations

from collections.abc import Mapping

from beforehand.faults import Fault, LockError
from beforehand.fit.ladder import IDENTITY, RUNGS
from beforehand.lock import Lock
from beforehand.lock.prediction import Prediction, residual_groups
from beforehand.plan import Plan, parse_formula
from beforehand.plan.arithmetic import names_in
from beforehand.table.wanted import Wanted, wanted_of


def prediction_in(lock: Lock, name: str) -> Prediction:
    """What a lock says for predictions.

    Parameters
    ----------
    lock : Lock
    name : str
        How a fault calls the lock's file.

    Raises
    ------
    LockError
        It is of a dry run, it stopped, its fit is exact, or it was written before locks had this part.
    """
    if lock.scrambled is not None:
        raise _refused(name, "is of a dry run on a shuffled outcome: it predicts nothing", "scrambled")
    if lock.status == "stopped" or lock.answer is None:
        raise _refused(name, "the run stopped and adopted nothing that could predict", "stopped")
    if lock.prediction is not None:
        transformed = lock.answer.outcome.transform != IDENTITY
        if not _fits_together(lock.prediction) or (transformed and lock.prediction.residuals is None):
            raise _refused(name, "its part for predictions does not fit together", "prediction")
        return lock.prediction
    fit = next((fit for fit in lock.fits if fit.id == lock.answer.fit), None)
    if fit is not None and fit.exact:
        what = "its equation fits exactly, so that nothing is known of how far a case may lie from it"
        raise _refused(name, what, "exact")
    what = "this lock was written by an earlier version, without what predictions need: run the plan again"
    raise _refused(name, what, "no_prediction")


def wanted_by(plan: Plan, prediction: Prediction) -> Mapping[str, Wanted]:
    """The columns that new cases must have, by the plan's names, in its order.

    Those of which the model's predictors are made, those of eligibility, and the row label. The
    outcome is not among them, nor what is said of it, since a new case need not have one.
    """
    formulas = {line.column: names_in(parse_formula(line.from_)) for line in plan.derive}
    needed: set[str] = set()
    left = list(prediction.seen)
    while left:
        column = left.pop()
        if column in formulas:
            left.extend(formulas[column])
        else:
            needed.add(column)
    needed |= {line.column for line in plan.eligibility if line.column != plan.outcome.column}
    if plan.data.row_label is not None:
        needed.add(plan.data.row_label)
    return {column: want for column, want in wanted_of(plan).items() if column in needed}


def _fits_together(found: Prediction) -> bool:
    """Whether triangles have their shape and columns their predictors, as in every lock that a run writes."""
    first = int(found.intercept)
    triangles = all(
        len(column.inverse_root) == place + 1
        and (column.spread is None or len(column.spread) == place + 1 + first)
        for place, column in enumerate(found.columns)
    )
    robust = {column.spread is not None for column in found.columns}
    whole = robust != {True, False} and (robust != {True} or (found.level_spread is not None) == bool(first))
    factors = [factor for column in found.columns for factor in column.factors]
    seen = all(
        factor.column in found.seen
        and (factor.level is not None) == (found.seen[factor.column].levels is not None)
        and (factor.rung is None or factor.rung in RUNGS)
        for factor in factors
    )
    numbers = all(
        one.levels is not None or (one.low is not None and one.high is not None)
        for one in found.seen.values()
    )
    pairs = all({one.first, one.second} <= set(found.seen) for one in found.together or ())
    residuals = found.residuals is None or len(found.residuals) == len(residual_groups(found.rows))
    enough = residuals and found.rows > 0 and found.df > 0 and all(column.factors for column in found.columns)
    return triangles and whole and seen and numbers and pairs and enough and 0.0 < found.level < 1.0


def _refused(name: str, what: str, code: str) -> LockError:
    """The error of a lock that cannot predict."""
    return LockError([Fault(file=name, line=None, place="", what=what, code=f"lock.{code}")])
