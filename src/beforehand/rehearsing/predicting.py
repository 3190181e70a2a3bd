"""Predictions of a replicate's answer for rows that it need not have seen."""

from __future__ import annotations

import numpy as np

from beforehand.fit.columns import FloatArray
from beforehand.fit.ladder import IDENTITY, RUNGS, undo
from beforehand.rehearsing.trial import Ended
from beforehand.steps.source import TableSource

# The way back to the outcome's scale is a smooth curve: so many points of it are computed, and the
# rows between them are read off it.
POINTS = 512


def predictions(ended: Ended, seen: TableSource, rows: TableSource) -> FloatArray:
    """What the answer of a replicate predicts, in units of the outcome.

    Parameters
    ----------
    ended : Ended
        With a final fit.
    seen : TableSource
        The base that it was fitted on.
    rows : TableSource
        Rows to predict, without missing cells in the model's predictors.

    Returns
    -------
    FloatArray, shape (rows.n_rows,)
        NaN where a level had not been seen, or a rung does not apply.
    """
    assert ended.final is not None
    model = ended.final.model
    n = rows.n_rows
    total = np.zeros(n)
    unknown = np.zeros(n, dtype=bool)
    for coefficient in ended.final.fit.coefficients:
        if coefficient.key is None:
            total += coefficient.estimate
            continue
        with np.errstate(all="ignore"):
            total += coefficient.estimate * rows.read(coefficient.key, 0, n)
    for term in model.terms:
        for column in term.parts or (term.name,):
            levels = rows.levels(column)
            if levels:
                kept = np.delete(seen.raw(column), model.rows.gone)
                unknown |= ~np.isin(rows.raw(column), kept)
        for key in term.keys:
            for factor in key.factors:
                outside = RUNGS[factor.rung].outside if not factor.level else None
                if outside is not None:
                    unknown |= np.asarray(outside(rows.raw(factor.column)), dtype=bool)
    factor = model.outcome.factors[0]
    if factor.rung != IDENTITY:
        total = _on_own_scale(total, ended.residual(model), factor.rung, factor.exponent)
    return np.where(unknown | ~np.isfinite(total), np.nan, total)


def _on_own_scale(values: FloatArray, residual: FloatArray, rung: str, exponent: float) -> FloatArray:
    """The smearing estimate (Duan 1983) at fitted values; NaN where it does not exist."""
    inside = values[np.isfinite(values)]
    if not len(inside):
        return values
    at = np.unique(inside) if len(inside) <= POINTS else np.linspace(inside.min(), inside.max(), POINTS)
    means = np.array([float(undo(rung, one + residual, exponent).mean()) for one in at.tolist()])
    return np.asarray(np.interp(values, at, means))


def agreement(outcome: FloatArray, predicted: FloatArray) -> tuple[float, float]:
    """R² of predictions, and the slope of the outcome on them; NaN where they do not exist.

    The slope is 1 for predictions that are neither too extreme nor too timid (Cox 1958).
    """
    known = np.isfinite(predicted)
    if known.sum() < 2:
        return float("nan"), float("nan")
    y, guess = outcome[known], predicted[known]
    about = y - y.mean()
    total = float(about @ about)
    error = y - guess
    r_squared = 1.0 - float(error @ error) / total if total > 0.0 else float("nan")
    spread = guess - guess.mean()
    own = float(spread @ spread)
    # Predictions that are all the same differ by rounding only.
    slope = float(about @ spread) / own if own > 1e-20 * max(total, 1e-300) else float("nan")
    return r_squared, slope
