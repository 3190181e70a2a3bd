"""From a run to what its pictures are drawn from; every count and mean the same for any order of rows."""

from __future__ import annotations

import math
from collections.abc import Iterable

import numpy as np

from beforehand.answer import shown_exponent
from beforehand.fit.columns import Factor, FloatArray, Key
from beforehand.fit.influence import measures_of
from beforehand.lock.pictures import (
    MOST_BINS,
    MOST_QUANTILES,
    Histogram,
    PictureData,
    SpreadAlong,
    Straight,
    WithOutcome,
)
from beforehand.record.plane import edges_of, places_of, plane_of, shares_of
from beforehand.running import Trail
from beforehand.steps.bench import Fitted
from beforehand.steps.state import IDENTITY, Model, Term

# Up to here a half more or less can be told from a whole number.
LARGEST_WHOLE = 2.0**50


def pictures_of(trail: Trail) -> PictureData:
    """What the pictures of a run are drawn from.

    Parameters
    ----------
    trail : Trail
        A run of any status. Without a final fit that has residuals and predictors only the columns
        can be shown.

    Returns
    -------
    PictureData
        Of bounded size: at most 20 bins a column, 48 × 32 cells a cloud, 24 points a line.
    """
    final = trail.final
    histograms = tuple(_histograms(trail))
    drawable = final is not None and final.model.terms and not final.fit.exact
    if final is None or not drawable:
        return PictureData(
            histograms=histograms, with_outcome=_with_outcome(trail) if final is not None else (),
            straight=(), spread=None, normal=(), pull=None,
        )  # fmt: skip
    values = trail.bench.values(final.model)
    tableau = trail.bench.tableau(final.model)
    studentized = measures_of(
        values.leverage, values.residual, rss=float(tableau.rss), p=tableau.p, df=tableau.df
    ).external
    shown = np.isfinite(studentized)
    fitted, studentized, leverage = values.fitted[shown], studentized[shown], values.leverage[shown]
    pulled = plane_of(leverage, studentized, x_low=0.0)
    return PictureData(
        histograms=histograms,
        with_outcome=_with_outcome(trail),
        straight=tuple(_straight(trail, final, values.residual)),
        spread=_spread(fitted, studentized),
        normal=_quantiles(values.residual),
        pull=None if pulled is None else pulled.cloud,
    )


def _histograms(trail: Trail) -> Iterable[Histogram]:
    """Every numeric column of the plan, as its descriptives are taken."""
    for name in (trail.plan.outcome.column, *(p.column for p in trail.plan.predictors)):
        column = trail.table.columns[name]
        if column.kind == "number":
            present = column.values[~np.isnan(column.values)]
            if len(present):
                yield histogram_of(name, np.asarray(present, dtype=np.float64))


def histogram_of(name: str, values: FloatArray) -> Histogram:
    """Count values in bins: by Rice's rule, whole numbers as many to each.

    Parameters
    ----------
    name : str
    values : FloatArray, shape (n,), n at least 1, finite
    """
    low, high = edges_of(values)
    smallest, largest = float(values.min()), float(values.max())
    # Twice the cube root of n, as many as can be told apart.
    bins = min(MOST_BINS, max(1, math.ceil(2.0 * round(len(values) ** (1 / 3), 9))))
    whole = max(-smallest, largest) < LARGEST_WHOLE and _whole(values[:1000]) and _whole(values)
    if whole:
        # Each bin holds as many whole numbers as the next, or a comb would be seen where there is none.
        span = int(largest - smallest) + 1
        width = 1 if span <= MOST_BINS else -(-span // bins)
        bins = -(-span // width)
        low = smallest - 0.5
        high = low + bins * width
    counts = np.bincount(places_of(shares_of(values, low, high), bins), minlength=bins)
    return Histogram(column=name, low=low, high=high, counts=tuple(int(count) for count in counts))


def _whole(values: FloatArray) -> bool:
    return bool((values == np.floor(values)).all())


def _with_outcome(trail: Trail) -> tuple[WithOutcome, ...]:
    """Correlations of the plan's numbers with the outcome, from the exact moments."""
    # What left for missing cells has no value in some of the rows.
    left = {departure.predictor for departure in trail.state.departures if departure.step == "missing_data"}
    terms = tuple(
        Term(name=p.column, keys=(Key((Factor(column=p.column),)),))
        for p in trail.plan.predictors
        if p.kind == "number" and p.column not in left
    )
    outcome = Key((Factor(column=trail.plan.outcome.column),))
    model = Model(rows=trail.state.rows, outcome=outcome, terms=terms)
    moments = trail.bench.moments(model)
    return tuple(
        WithOutcome(predictor=term.name, r=moments.correlation(term.keys[0], outcome))
        for term in terms
        if not moments.constant(term.keys[0])
    )


def _straight(trail: Trail, final: Fitted, residual: FloatArray) -> Iterable[Straight]:
    """Component plus residual of every number in the final model (Ezekiel 1924)."""
    source = trail.source.without(final.model.rows.gone)
    moments = trail.bench.moments(final.model)
    estimates = {c.key: c.estimate for c in final.fit.coefficients}
    for term in final.model.terms:
        if term.kind != "number":
            continue
        key = term.keys[0]
        transform = trail.state.transforms.get(term.name, IDENTITY)
        x = source.read(key, 0, source.n_rows)
        slope, mean = estimates[key], moments.mean(key)
        part = slope * (x - mean) + residual
        plane = plane_of(x, part)
        if plane is not None:
            yield Straight(
                predictor=term.name,
                transform=transform.rung,
                exponent=shown_exponent(transform),
                at_low=slope * (plane.cloud.x_low - mean),
                at_high=slope * (plane.cloud.x_high - mean),
                cloud=plane.cloud,
                line=plane.line,
            )


def _spread(fitted: FloatArray, studentized: FloatArray) -> SpreadAlong | None:
    """Studentized residuals along the fitted values, with their mean and width in groups."""
    plane = plane_of(fitted, studentized)
    return None if plane is None else SpreadAlong(cloud=plane.cloud, line=plane.line, width=plane.width)


def _quantiles(values: FloatArray) -> tuple[float, ...]:
    """Quantiles at (i - 1/2)/m, i = 1 … m, Hyndman & Fan's (1996) definition 5.

    It puts order statistics where plotting positions do, so that the tails of a small table do not
    shrink.
    """
    n = len(values)
    m = min(n, MOST_QUANTILES)
    # Place n(i - 1/2)/m - 1/2 among the ordered values from 0 on, counted in whole numbers.
    places = [divmod(n * (2 * i + 1) - m, 2 * m) for i in range(m)]
    wanted = sorted({min(at + step, n - 1) for at, _ in places for step in (0, 1)})
    ordered = np.partition(values + 0.0, wanted)
    found: list[float] = []
    for at, part in places:
        below, above = float(ordered[at]), float(ordered[min(at + 1, n - 1)])
        weight = part / (2 * m)
        found.append(below if below == above else below * (1.0 - weight) + above * weight)
    return tuple(found)
