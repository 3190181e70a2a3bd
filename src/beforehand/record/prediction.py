"""What the lock says for predictions of new cases: the adopted equation about the means of its columns."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction

import numpy as np

from beforehand.answer import term_name
from beforehand.fit.columns import Factor, FloatArray
from beforehand.fit.ladder import BOX_COX, IDENTITY
from beforehand.fit.linear import evaluated, forms_of
from beforehand.fit.robust import PULL_BITS, spread_of
from beforehand.fit.sums import exact_mean
from beforehand.fit.sweeping import mean_of
from beforehand.fit.tableau import Tableau
from beforehand.lock.numbers import as_recorded
from beforehand.lock.prediction import (
    Prediction,
    PredictionColumn,
    PredictionFactor,
    Seen,
    SeenTogether,
    residual_groups,
)
from beforehand.running import Trail, mean_model, order_column, ranks_in_base
from beforehand.steps.source import TableSource
from beforehand.steps.state import Model

Weights = Sequence[Sequence[Fraction]]


def prediction_of(trail: Trail) -> Prediction | None:
    """What a prediction needs of a run.

    Parameters
    ----------
    trail : Trail

    Returns
    -------
    Prediction or None
        None where a run stopped, has no answer, or fits exactly, so that its residuals are rounding.
        A run that is inconclusive adopted no equation: its prediction is the mean.
    """
    final = trail.final
    if final is None or trail.status == "stopped":
        return None
    adopted = trail.status != "inconclusive"
    model = final.model if adopted else mean_model(final.model)
    tableau = trail.bench.tableau(model)
    if tableau.exact or tableau.df < 1:
        return None
    values = trail.bench.values(model)
    source = trail.source.without(model.rows.gone)
    weights, constants = tableau.whitening()
    centres = [as_recorded(float(mean)) for mean in _means(tableau)]
    spread, df = None, tableau.df
    if adopted and final.fit.errors != "classical":
        spread, df = _spread(trail, model, source, weights, constants)
    transformed = model.outcome.factors[0].rung != IDENTITY
    return Prediction(
        level=1.0 - trail.plan.alpha,
        rows=tableau.n,
        df=df,
        residual_variance=float(tableau.rss / tableau.df),
        intercept=model.intercept,
        at_centres=_at(tableau, centres),
        level_spread=float(spread[0, 0]) if spread is not None and model.intercept else None,
        largest_leverage=float(values.leverage.max()),
        columns=_columns(model, tableau, centres, weights, constants, spread),
        seen=_seen(model, source, trail),
        together=_together(model, source),
        residuals=groups_of(values.residual) if transformed else None,
    )


def groups_of(residuals: FloatArray) -> tuple[float, ...]:
    """Residuals in ascending order, shape (n,); many of them as means of groups of neighbours.

    A function that bends little within a group has nearly the same mean over the groups as over the
    rows.
    """
    ends = residual_groups(len(residuals))
    return tuple(exact_mean(group) for group in np.split(np.sort(residuals), ends[:-1]))


def _means(tableau: Tableau) -> list[Fraction]:
    """Exact means of the columns; 0 where there is no intercept, so that nothing is centred."""
    if not tableau.intercept:
        return [Fraction(0)] * len(tableau.keys)
    return [mean_of(tableau.moments, key) for key in tableau.keys]


def _at(tableau: Tableau, centres: Sequence[float]) -> float:
    """The fitted value where each column has its centre, which is its mean to ten digits.

    It comes by way of the outcome's mean: an intercept may be far from the data and large.
    """
    if not tableau.intercept:
        return 0.0
    means = _means(tableau)
    off = (
        tableau.slope(place) * (Fraction(centre) - mean)
        for place, (centre, mean) in enumerate(zip(centres, means, strict=True))
    )
    return float(sum(off, tableau.outcome_mean))


def _columns(
    model: Model,
    tableau: Tableau,
    centres: Sequence[float],
    weights: Weights,
    constants: Sequence[Fraction],
    spread: FloatArray | None,
) -> tuple[PredictionColumn, ...]:
    """The columns of the design, each with its rows of the triangles."""
    first = int(model.intercept)
    return tuple(
        PredictionColumn(
            term=term_name(key),
            factors=tuple(_factor(factor) for factor in key.factors),
            coefficient=float(tableau.slope(place)),
            centre=centres[place],
            inverse_root=tuple(float(weights[place][form]) for form in range(place + 1)),
            offset=float(
                constants[place]
                + sum(
                    (row[place] * Fraction(c) for row, c in zip(weights, centres, strict=True)), Fraction(0)
                )
            ),
            spread=None
            if spread is None
            else tuple(float(one) for one in spread[place + first, : place + first + 1]),
        )
        for place, key in enumerate(model.keys)
    )


def _factor(factor: Factor) -> PredictionFactor:
    """A factor of a design column."""
    return PredictionFactor(
        column=factor.column,
        rung=None if factor.rung == IDENTITY else factor.rung,
        exponent=factor.exponent if factor.rung == BOX_COX else None,
        level=factor.level or None,
    )


def _spread(
    trail: Trail, model: Model, source: TableSource, weights: Weights, constants: Sequence[Fraction]
) -> tuple[FloatArray, int]:
    """Covariance of the coefficients of the orthonormal design, the level's first, shape (p, p).

    In this basis the columns do not depend on each other, however much the predictors do, so that
    ten digits of it are ten digits of every interval.
    """
    assert trail.final is not None
    tableau, plan = trail.bench.tableau(model), trail.plan
    first = int(model.intercept)
    rows = np.empty((source.n_rows, len(model.keys) + first), order="F")
    if first:
        rows[:, 0] = 1.0 / np.sqrt(float(tableau.n))
    if model.keys:
        tops = tableau.tops(tableau.keys)
        forms = forms_of(tableau.keys, tops, weights, constants, lowest_bit=-PULL_BITS)
        for start, stop, block in evaluated(source, forms):
            rows[start:stop, first:] = block
    groups = ranks_in_base(trail.table, getattr(plan.errors, "cluster_by", None), trail.base)
    order = ranks_in_base(trail.table, order_column(plan), trail.base)
    return spread_of(
        rows,
        trail.final.fit,
        trail.bench.values(model),
        errors=trail.final.fit.errors,
        groups=None if groups is None else np.delete(groups, model.rows.gone),
        order=None if order is None else np.delete(order, model.rows.gone),
        lags=getattr(plan.errors, "autocorrelation_lags", None),
    )


def _used(model: Model) -> tuple[str, ...]:
    """Predictors of which the model's columns are made, each once."""
    return tuple(dict.fromkeys(part for term in model.terms for part in (term.parts or (term.name,))))


def _seen(model: Model, source: TableSource, trail: Trail) -> Mapping[str, Seen]:
    """Values of each predictor of the model in the rows of the fit, filled cells among them."""
    baselines = {p.column: p.baseline for p in trail.plan.predictors}
    found: dict[str, Seen] = {}
    for name in _used(model):
        values = source.raw(name)
        declared = source.levels(name)
        if not declared:
            found[name] = Seen(low=float(values.min()), high=float(values.max()))
            continue
        counts = np.bincount(values.astype(np.int64), minlength=len(declared))
        present = [level for level, count in zip(declared, counts.tolist(), strict=True) if count]
        baseline = baselines[name] or declared[0]
        found[name] = Seen(levels=tuple(sorted(present, key=lambda level: level != baseline)))
    return found


def _together(model: Model, source: TableSource) -> tuple[SeenTogether, ...] | None:
    """Levels of the two categories of a product that occur together."""
    found: list[SeenTogether] = []
    for term in model.terms:
        categories = [part for part in term.parts if source.levels(part)]
        if len(categories) != 2:
            continue
        first, second = categories
        codes = np.column_stack([source.raw(first), source.raw(second)]).astype(np.int64)
        pairs = tuple(
            (source.levels(first)[one], source.levels(second)[other])
            for one, other in np.unique(codes, axis=0).tolist()
        )
        found.append(SeenTogether(first=first, second=second, pairs=pairs))
    return tuple(found) or None
