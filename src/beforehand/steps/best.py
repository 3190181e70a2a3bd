"""The best subset from cross-products, for whichever bench asks."""

from __future__ import annotations

from collections.abc import Callable

from beforehand.fit.columns import FloatArray
from beforehand.fit.subsets import best_subsets
from beforehand.plan import Plan
from beforehand.steps.keeping import Keeping
from beforehand.steps.state import Model


def best_subset(
    plan: Plan,
    model: Model,
    cross: FloatArray,
    alpha: float,
    forced: Callable[[tuple[str, ...]], bool],
    adjusted_r_squared: Callable[[Model], float],
) -> Model | None:
    """Largest adjusted R² among lawful subsets whose other predictors are significant.

    Parameters
    ----------
    plan : Plan
    model : Model
        With every predictor.
    cross : FloatArray, shape (k + 1, k + 1)
        Cross-products of its columns and, last, the outcome; about the means with an intercept.
    alpha : float
    forced : callable
        Whether keep rules and products admit a set of names.
    adjusted_r_squared : callable
        Of a model, by which the nearly best are told apart.
    """
    places = {key: place for place, key in enumerate(model.keys)}
    keeping = Keeping(plan)
    found = best_subsets(
        cross,
        [tuple(places[key] for key in term.keys) for term in model.terms],
        n=model.rows.n,
        constant=int(model.intercept),
        alpha=alpha,
        lawful=lambda chosen: forced(tuple(model.names[place] for place in chosen)),
        held=lambda place: keeping.hold(model.names[place], model.names, None) is not None,
    )
    if not found:
        return None
    models = [
        model.without(*(n for place, n in enumerate(model.names) if place not in subset.places))
        for subset in found
    ]
    adjusted = [adjusted_r_squared(one) for one in models]
    # Ties to exactness go to the smaller model, then to the earlier predictors.
    best = min(range(len(models)), key=lambda at: (-adjusted[at], len(models[at].terms), found[at].places))
    return models[best]
