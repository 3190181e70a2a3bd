"""Exact linear dependence among the columns of a model, told by predictors."""

from __future__ import annotations

from beforehand.fit.dependence import dependence
from beforehand.fit.sweeping import RankDeficient
from beforehand.steps.bench import Linked
from beforehand.steps.state import Model, column_name
from beforehand.steps.workings import Workings


def linked_of(workings: Workings, model: Model) -> Linked | None:
    """The first exact linear dependence among the columns, in plan order, or None."""
    # A category of which one level is left, or a product of it, has no column at all.
    empty = next((term.name for term in model.terms if not term.keys), None)
    if empty is not None:
        return Linked(predictor=empty, column=empty, weights=(), constant=True, members=(empty,))
    try:
        # What can be swept in has no dependence, and is needed next.
        workings.tableau(model)
    except RankDeficient:
        pass
    else:
        return None
    moments = workings.moments(model.rows, (*model.keys, model.outcome))
    found = dependence(moments, model.keys, intercept=model.intercept)
    if found is None:
        return None
    owner = {key: term.name for term in model.terms for key in term.keys}
    members = (owner[found.key], *(owner[key] for key, _ in found.weights if key is not None))
    return Linked(
        predictor=owner[found.key],
        column=column_name(found.key),
        weights=tuple((column_name(key), weight) for key, weight in found.weights),
        constant=all(key is None for key, _ in found.weights),
        members=tuple(dict.fromkeys(members)),
    )
