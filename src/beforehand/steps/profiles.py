"""Exponents learned from a model: the power under which its residual sum of squares is least."""

from __future__ import annotations

from collections.abc import Callable

from beforehand.fit import exponents
from beforehand.fit.columns import Key
from beforehand.fit.elementary import log
from beforehand.fit.sums import exact_sum
from beforehand.fit.sweeping import RankDeficient
from beforehand.fit.tableau import tableau_of
from beforehand.steps.state import Model, Transform, factor_of
from beforehand.steps.workings import Workings


def learned(
    workings: Workings, model: Model, name: str, rung: str, outcome: str, known: float | None = None
) -> Transform:
    """A rung with its exponent learned from a model.

    Parameters
    ----------
    workings : Workings
    model : Model
    name : str
        The predictor that is turned; '' for the outcome.
    rung : str
        Only ``box_cox`` has an exponent to learn.
    outcome : str
        The outcome's column.
    known : float, optional
        The exponent, where it was learned before and is not to be learned anew.
    """
    if rung != "box_cox":
        return Transform(rung)
    if known is not None:
        return Transform(rung, known)
    if name:
        return Transform(rung, exponents.predictor_exponent(_profile(workings, model, name, name)))
    values = workings.source(model.rows).raw(outcome)
    found = exponents.outcome_exponent(
        _profile(workings, model, "", outcome), n=model.rows.n, log_total=exact_sum(log(values))
    )
    return Transform(rung, found.exponent)


def _profile(workings: Workings, model: Model, name: str, column: str) -> Callable[[float], float]:
    """Residual sum of squares of a model with one column under a Box-Cox power.

    Parameters
    ----------
    workings : Workings
    model : Model
    name : str
        The predictor whose column is turned; '' for the outcome.
    column : str
        The column of the table that is turned.

    Returns
    -------
    callable
        From the exponent to the residual sum of squares; infinite where the model has no unique fit.
    """

    def rss_of(exponent: float) -> float:
        key = Key((factor_of(column, Transform("box_cox", exponent)),))
        source = workings.source(model.rows)
        if name:
            keys = tuple(key if k == model.term(name).keys[0] else k for k in model.keys)
            outcome = model.outcome
        else:
            keys, outcome = model.keys, key
        # A trial power is looked at once, so its cross-products are not kept with the others.
        kept = workings.moments(model.rows, (*model.keys, model.outcome))
        try:
            moments = kept.extended(source, (key,))
            return float(tableau_of(moments, outcome, keys, intercept=model.intercept).rss)
        except RankDeficient:
            return float("inf")

    return rss_of
