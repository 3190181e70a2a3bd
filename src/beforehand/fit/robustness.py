"""How strong a cause that nobody measured would have to be to undo an estimate.

From t and its degrees of freedom alone (Cinelli & Hazlett 2020, Journal of the Royal Statistical
Society B 82:39-67).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy.special import stdtrit


@dataclass(frozen=True, slots=True, kw_only=True)
class Robustness:
    """What an unseen cause would need.

    Attributes
    ----------
    partial_r_squared : float
        Share of the outcome's rest, given the other predictors, that goes with the predictor.
    value : float
        Share of the rest of both the predictor and the outcome that the cause would have to explain,
        from 0 to 1, to bring the estimate to 0.
    value_at_alpha : float
        The same to take its significance at ``alpha``; 0 where it has none.
    """

    partial_r_squared: float
    value: float
    value_at_alpha: float


def robustness_of(t: float, df: int, *, alpha: float = 0.05) -> Robustness:
    """Robustness values of one coefficient.

    Parameters
    ----------
    t : float
        Coefficient over its classical standard error.
    df : int
        Residual degrees of freedom, at least 1.
    alpha : float
        Two-sided level, between 0 and 1.

    Returns
    -------
    Robustness
        ``value`` for the whole estimate (their q = 1); ``value_at_alpha`` on one degree of freedom
        less, since the cause takes one up. With one degree of freedom nothing is significant
        beside such a cause, and it is 0.

    Raises
    ------
    ValueError
        ``df`` is below 1, or ``alpha`` is not between 0 and 1.

    Examples
    --------
    >>> found = robustness_of(4.184, 783)
    >>> round(found.value, 3), round(found.value_at_alpha, 3), round(found.partial_r_squared, 3)
    (0.139, 0.076, 0.022)
    """
    if df < 1:
        raise ValueError(f"df is {df}; at least one is needed")
    if not 0.0 < alpha < 1.0:
        raise ValueError(f"alpha is {alpha}; it lies between 0 and 1")
    f = abs(t) / math.sqrt(df)
    value_at_alpha = 0.0
    if df > 1:
        limit = -float(stdtrit(df - 1, alpha / 2.0)) / math.sqrt(df - 1)
        value_at_alpha = _at_limit(f, limit)
    return Robustness(
        partial_r_squared=partial_r_squared(t, df), value=_value(f), value_at_alpha=value_at_alpha
    )


def partial_r_squared(t: float, df: int) -> float:
    """Partial R² of a predictor of one column with the outcome, ``t² / (t² + df)``."""
    # Divided through by the larger, so that no square overflows.
    if abs(t) > math.sqrt(df):
        return 1.0 / (1.0 + df / t / t)
    return t * t / (t * t + df)


def _value(f: float) -> float:
    """The share r with ``r² / (1 - r) = f²``, in a form that does not cancel for a large f."""
    return 2.0 / (1.0 + math.sqrt(1.0 + 4.0 / f / f)) if f > 0.0 else 0.0


def _at_limit(f: float, limit: float) -> float:
    """The share that brings f down to the limit of significance."""
    if f <= limit:
        return 0.0
    # A cause that explains all of the outcome's rest shrinks the error too; where the limit is far,
    # it is the predictor's part alone that decides.
    if f > 1.0 / limit:
        return (1.0 - (limit / f) ** 2) / (1.0 + 1.0 / f / f)
    return _value(f - limit)
