"""The real run of a plan as a rehearsal looks at it."""

from __future__ import annotations

import numpy as np

from beforehand.rehearsing.observed import Observed, SeenRuling
from beforehand.rehearsing.predicting import agreement, predictions
from beforehand.rehearsing.stage import Collector
from beforehand.rehearsing.trial import Ended
from beforehand.rehearsing.trials import Subjects
from beforehand.running import Trail
from beforehand.steps.state import State

# What is said of single rows, which another sample need not have.
_OF_ROWS = frozenset({"influence"})
# Rows drawn with replacement have no order that could be checked.
_OF_ORDER = "independence_"

_NOT_OF_PREDICTORS = frozenset({"incomplete rows", "flagged rows", "all rows"})


def observed_of(trail: Trail, subjects: Subjects, lock: str) -> Observed:
    """What a real run came to.

    Parameters
    ----------
    trail : Trail
    subjects : Subjects
    lock : str
        Digest of its lock.
    """
    final = Collector(trail.plan, subjects, 1)
    final.take(0, _ended(trail, trail.state, trail.status))
    full = Collector(trail.plan, subjects, 1)
    model = trail.state.full_model
    if model is not None and model.terms and trail.status != "stopped":
        fitted = trail.bench.fit(model, "full model")
        ended = Ended(
            status="adopted", state=trail.state, rulings=(), final=fitted,
            residual=lambda one: trail.bench.values(one).residual, quick=False,
        )  # fmt: skip
        full.take(0, ended)
    elif trail.status == "adopted":
        full = final
    made, whole = final.trials, full.trials
    return Observed(
        lock=lock,
        status=trail.status,
        adopted=made.adopted[0],
        transformed=made.transformed[0],
        estimates=made.estimates[0],
        errors=made.errors[0],
        full_estimates=whole.estimates[0],
        full_errors=whole.errors[0],
        r_squared=float(made.r_squared[0]),
        adjusted_r_squared=float(made.adjusted_r_squared[0]),
        apparent=_apparent(trail),
        model_p=float(made.model_p[0]) if trail.status == "adopted" else float(np.nan),
        rulings=tuple(
            SeenRuling(id=ruling.id, step=ruling.step, subject=ruling.subject, ground=ruling.ground)
            for ruling in trail.rulings
            if ruling.step not in _OF_ROWS
            and ruling.subject not in _NOT_OF_PREDICTORS
            and not ruling.ground.startswith(_OF_ORDER)
        ),
    )


def _apparent(trail: Trail) -> float:
    """R² of the answer's predictions over the base."""
    if trail.status != "adopted" or trail.final is None:
        return 0.0
    predicted = predictions(_ended(trail, trail.state, trail.status), trail.source, trail.source)
    return agreement(trail.source.raw(trail.plan.outcome.column), predicted)[0]


def _ended(trail: Trail, state: State, status: str) -> Ended:
    return Ended(
        status=status, state=state, rulings=trail.rulings, final=trail.final,
        residual=lambda model: trail.bench.values(model).residual, quick=False,
    )  # fmt: skip
