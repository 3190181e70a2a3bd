"""Power of the F test of a predictor or of a whole model, by the noncentral F distribution.

Throughout, ``partial_f2`` is Cohen's effect size (R²_full - R²_without) / (1 - R²_full), the
noncentrality is ``partial_f2 * n``, and the test has ``df`` and ``n - p`` degrees of freedom, where p
counts all coefficients of the model, the intercept included (Cohen 1988, Statistical Power Analysis
for the Behavioral Sciences, ch. 9). For the test of R² itself, ``df`` is p - 1.
"""

from __future__ import annotations

import math

from scipy.special import chdtri, chndtr, fdtri, ncfdtr

# A sample beyond this is no advice: the effect is 0 for every practical purpose.
MOST_ROWS = 10**9

# From here on the F distribution equals the chi-square over its degrees of freedom to 7 digits or
# more, and the noncentral F routine slows and loses digits.
_CHI_SQUARE_FROM = 10**7

# With a noncentrality this large the power is 1 to the last digit unless almost no residual degrees
# of freedom are left; the noncentral F series is not trusted beyond it.
_LARGEST_NONCENTRALITY = 1e6

# Relative width at which the search for a detectable effect ends: far below what is ever printed.
_EFFECT_PRECISION = 1e-13


def power_of(*, partial_f2: float, n: int, p: int, df: int = 1, alpha: float = 0.05) -> float | None:
    """Probability that the F test at ``alpha`` finds an effect of this size.

    Parameters
    ----------
    partial_f2 : float
        Effect size, 0 or more.
    n, p : int
        Rows, and coefficients with the intercept.
    df : int
        Coefficients tested.
    alpha : float
        Level of the test, above 0 and below 1.

    Returns
    -------
    float or None
        None when no residual degree of freedom is left.

    Examples
    --------
    >>> round(power_of(partial_f2=0.15, n=68, p=3, df=2), 2)
    0.8
    """
    _require(df, alpha)
    if partial_f2 < 0.0:
        raise ValueError("an effect size cannot be negative")
    residual = n - p
    if residual < 1:
        return None
    if partial_f2 == 0.0:
        return alpha
    noncentrality = min(partial_f2 * n, _LARGEST_NONCENTRALITY)
    if residual >= _CHI_SQUARE_FROM:
        missed = float(chndtr(float(chdtri(df, alpha)), df, noncentrality))
    else:
        # The upper alpha point of F(df, residual) is the reciprocal of the lower one of
        # F(residual, df), which does not lose digits for a small alpha.
        critical = 1.0 / float(fdtri(residual, df, alpha))
        missed = float(ncfdtr(df, residual, noncentrality, critical))
    if not 0.0 <= missed <= 1.0:
        missed = 0.0 if missed < 0.0 or math.isnan(missed) else 1.0
    return 1.0 - missed


def needed_n(
    *, partial_f2: float, p: int, df: int = 1, alpha: float = 0.05, power: float = 0.80
) -> int | None:
    """Smallest number of rows with which the F test has at least this power.

    Parameters
    ----------
    partial_f2 : float
        Effect size.
    p : int
        Coefficients of the model with the intercept, those tested included.
    df : int
        Coefficients tested.

    Returns
    -------
    int or None
        None for no effect, or where more than ``MOST_ROWS`` rows would be needed.

    Examples
    --------
    >>> needed_n(partial_f2=0.15, p=3, df=2)
    68
    """
    _require(df, alpha)
    if not 0.0 < power < 1.0:
        raise ValueError("power must lie between 0 and 1")
    if not partial_f2 > 0.0:
        return None

    def enough(n: int) -> bool:
        reached = power_of(partial_f2=partial_f2, n=n, p=p, df=df, alpha=alpha)
        return reached is not None and reached >= power

    # Power grows with n: double until enough, then halve the bracket to the first n that is.
    short, long = p, p + 1
    while not enough(long):
        if long >= MOST_ROWS:
            return None
        short, long = long, min(2 * long, MOST_ROWS)
    while long - short > 1:
        middle = (short + long) // 2
        if enough(middle):
            long = middle
        else:
            short = middle
    return long


def detectable_f2(*, n: int, p: int, df: int = 1, alpha: float = 0.05, power: float = 0.80) -> float | None:
    """Smallest effect size that ``n`` rows find with this power.

    Parameters
    ----------
    n, p : int
        Rows, and coefficients with the intercept.
    df : int
        Coefficients tested.

    Returns
    -------
    float or None
        None when no residual degree of freedom is left, or when nothing up to the largest
        noncentrality is found with that power.
    """
    _require(df, alpha)
    if not alpha < power < 1.0:
        raise ValueError("power must lie between alpha and 1")
    if n - p < 1:
        return None

    def reached(effect: float) -> float:
        return power_of(partial_f2=effect, n=n, p=p, df=df, alpha=alpha) or 0.0

    high = 1.0 / n
    while reached(high) < power:
        high *= 2.0
        if high * n > _LARGEST_NONCENTRALITY:
            return None
    low = high / 2.0 if high > 1.0 / n else 0.0
    while high - low > _EFFECT_PRECISION * high:
        middle = 0.5 * (low + high)
        if middle in (low, high):
            break
        if reached(middle) < power:
            low = middle
        else:
            high = middle
    return high


def _require(df: int, alpha: float) -> None:
    """Refuse a test that does not exist."""
    if df < 1:
        raise ValueError("a test needs at least one coefficient")
    if not 0.0 < alpha < 1.0:
        raise ValueError("alpha must lie between 0 and 1")
