"""The numbers of predictions: fitted value, leverage and intervals, and the way back to the outcome's scale.

About the centres c of the columns, with L the recorded triangle, the form w = L'(x - c) + offset has
the leverage 1/n + w'w. The variance of the mean is s² times that, or q' M q with q = (1/√n, w) and M the
recorded spread where errors are not classical; that of a case adds s². Everything is elementwise, in one
order, so that the result does not depend on how rows are cut into blocks.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import stdtrit

from beforehand.fit.columns import FloatArray
from beforehand.fit.ladder import BOX_COX, IDENTITY, undo
from beforehand.lock.prediction import Prediction, residual_groups

# Rows of one block: a few arrays of this length stay in a core's cache.
BLOCK = 8192


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Predicted:
    """Predictions in units of the outcome, each of shape (n,); NaN where there is none.

    Attributes
    ----------
    prediction, mean_low, mean_high, case_low, case_high : FloatArray
        The mean of such cases, the interval for it, and the interval for a single case.
    leverage : FloatArray
    """

    prediction: FloatArray
    mean_low: FloatArray
    mean_high: FloatArray
    case_low: FloatArray
    case_high: FloatArray
    leverage: FloatArray


def predicted(
    prediction: Prediction, design: FloatArray, *, rung: str = IDENTITY, exponent: float = 1.0
) -> Predicted:
    """The equation on new cases.

    Parameters
    ----------
    prediction : Prediction
        Of the lock.
    design : FloatArray, shape (n, k)
        Values of the columns of ``prediction.columns``; NaN in a row that cannot be predicted.
    rung, exponent : str, float
        Under which the outcome was fitted.

    Returns
    -------
    Predicted
        Under a transform the prediction is Duan's (1983) smearing estimate of the mean, while the
        ends of the intervals are taken back through the rung, so that each holds the quantile that it
        held before; the reciprocal falls, and there the ends change places. An end below the values
        that a rung can give (a square root below 0) stands at the outcome's edge, 0. Where the way
        back passes a pole there is no number.
    """
    n = len(design)
    out = np.full((6, n), np.nan)
    reach = float(stdtrit(prediction.df, 0.5 + prediction.level / 2.0))
    for start in range(0, n, BLOCK):
        block = design[start : start + BLOCK]
        place = slice(start, start + len(block))
        with np.errstate(over="ignore", invalid="ignore"):
            fitted, leverage, variance = _moments(prediction, block)
            mean = reach * np.sqrt(variance)
            case = reach * np.sqrt(variance + prediction.residual_variance)
            ends = [fitted - mean, fitted + mean, fitted - case, fitted + case]
            if rung == IDENTITY:
                out[:5, place] = [fitted, *ends]
            else:
                out[0, place] = _smeared(prediction, fitted, rung, exponent)
                out[1:3, place] = _ends(ends[0], ends[1], rung, exponent)
                out[3:5, place] = _ends(ends[2], ends[3], rung, exponent)
        out[5, place] = leverage
    out[:5] = np.where(np.isfinite(out[:5]), out[:5], np.nan)
    return Predicted(
        prediction=out[0], mean_low=out[1], mean_high=out[2], case_low=out[3], case_high=out[4],
        leverage=out[5],
    )  # fmt: skip


def _moments(prediction: Prediction, block: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Fitted value, leverage and variance of the mean of each row, on the fitted scale."""
    rows = len(block)
    about = [block[:, place] - column.centre for place, column in enumerate(prediction.columns)]
    fitted = np.full(rows, prediction.at_centres)
    for column, values in zip(prediction.columns, about, strict=True):
        fitted += column.coefficient * values
    forms: list[FloatArray] = []
    for form, own in enumerate(prediction.columns):
        total = np.full(rows, own.offset)
        for column, values in zip(prediction.columns[form:], about[form:], strict=True):
            total += column.inverse_root[form] * values
        forms.append(total)
    first = 1.0 / prediction.rows if prediction.intercept else 0.0
    leverage = np.full(rows, first)
    for values in forms:
        leverage += values * values
    if not any(column.spread is not None for column in prediction.columns):
        return fitted, leverage, leverage * prediction.residual_variance
    if prediction.intercept:
        forms.insert(0, np.full(rows, 1.0 / np.sqrt(float(prediction.rows))))
    return fitted, leverage, _quadratic(prediction, forms)


def _quadratic(prediction: Prediction, forms: list[FloatArray]) -> FloatArray:
    """The form of the recorded spread, row by row."""
    triangle = [column.spread or () for column in prediction.columns]
    if prediction.level_spread is not None:
        triangle.insert(0, (prediction.level_spread,))
    total = np.zeros(len(forms[0]))
    for one, line in enumerate(triangle):
        for other, entry in enumerate(line):
            twice = 1.0 if one == other else 2.0
            total += twice * entry * forms[one] * forms[other]
    # A spread of few clusters is singular, and rounding may take such a form below nothing.
    return np.maximum(total, 0.0)


def _smeared(prediction: Prediction, fitted: FloatArray, rung: str, exponent: float) -> FloatArray:
    """Mean of the undone sums of fitted value and residual (Duan 1983, eq. 2.4).

    Beyond 201 rows the residuals are means of groups of neighbours: within a group the way back is
    taken as straight.
    """
    residuals = np.array(prediction.residuals)
    sizes = np.diff(residual_groups(prediction.rows), prepend=0)
    total = np.zeros(len(fitted))
    for residual, size in zip(residuals.tolist(), sizes.tolist(), strict=True):
        total += size * _back(fitted + residual, rung, exponent)
    mean = total / prediction.rows
    if rung == "reciprocal":
        mean = np.where(_on_one_side(fitted + residuals[0], fitted + residuals[-1]), mean, np.nan)
    return np.asarray(mean)


def _ends(low: FloatArray, high: FloatArray, rung: str, exponent: float) -> tuple[FloatArray, FloatArray]:
    """Both ends of an interval on the outcome's scale."""
    one, other = _back(low, rung, exponent), _back(high, rung, exponent)
    if rung != "reciprocal":
        return one, other
    whole = _on_one_side(low, high)
    return np.where(whole, other, np.nan), np.where(whole, one, np.nan)


def _on_one_side(low: FloatArray, high: FloatArray) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
    """Whether the way from low to high does not pass 0, where a reciprocal has its pole."""
    return np.asarray((low > 0.0) | (high < 0.0))


def _back(values: FloatArray, rung: str, exponent: float) -> FloatArray:
    """Values on the outcome's scale; what lies below a rung's lowest value comes to the outcome's edge."""
    found = undo(rung, values, exponent)
    if rung in ("square", "square_root"):
        return np.where(values < 0.0, 0.0, found)
    if rung == BOX_COX and exponent > 0.0 and exponent != 1.0:
        return np.where(1.0 + exponent * values <= 0.0, 0.0, found)
    return found
