"""Whether residuals look normal."""

from __future__ import annotations

import numpy as np
from scipy.special import chdtrc

from beforehand.fit.columns import FloatArray
from beforehand.fit.descriptives import shape_of
from beforehand.fit.results import Check

EXACT_FIT = "the fit is exact: its residuals are rounding only"

# Royston's approximation to the p of W was made for samples up to this size (Royston 1995, Applied
# Statistics 44:547-551, algorithm AS R94).
SHAPIRO_WILK_ROWS = 5000
_SHAPIRO_WILK_FEWEST = 3


def jarque_bera(residual: FloatArray, *, exact: bool = False) -> Check:
    """Skewness and kurtosis of the residuals against those of a normal sample.

    Parameters
    ----------
    residual : FloatArray
        Shape ``(n,)``.
    exact : bool
        The fit is exact, so that there is nothing to look at.

    Returns
    -------
    Check
        ``n/6 (S^2 + (K - 3)^2 / 4)``, moments about the mean with divisor n, referred to
        chi-square(2) (Jarque & Bera 1987, International Statistical Review 55:163-172).
    """
    if reason := _nothing_to_test(residual, exact):
        return Check(name="jarque_bera", statistic=None, p=None, not_applicable=reason)
    shape = shape_of(residual)
    statistic = shape.n / 6.0 * (shape.skewness**2 + (shape.kurtosis - 3.0) ** 2 / 4.0)
    return Check(name="jarque_bera", statistic=statistic, p=float(chdtrc(2.0, statistic)), df=(2,))


def shapiro_wilk(residual: FloatArray, *, exact: bool = False) -> Check:
    """Ordered residuals against the expected order statistics of a normal sample.

    Parameters
    ----------
    residual : FloatArray
        Shape ``(n,)``; not applicable above ``SHAPIRO_WILK_ROWS`` rows.
    exact : bool
        The fit is exact, so that there is nothing to look at.

    Returns
    -------
    Check
        W and its p (Shapiro & Wilk 1965, Biometrika 52:591-611; Royston 1995).
    """
    name = "shapiro_wilk"
    reason = _nothing_to_test(residual, exact)
    if not reason and len(residual) > SHAPIRO_WILK_ROWS:
        reason = f"its p is known up to {SHAPIRO_WILK_ROWS} rows, and there are {len(residual)}"
    if not reason and len(residual) < _SHAPIRO_WILK_FEWEST:
        reason = f"it needs at least {_SHAPIRO_WILK_FEWEST} rows"
    if reason:
        return Check(name=name, statistic=None, p=None, not_applicable=reason)
    from scipy.stats import shapiro

    # Sorted here: the routine subtracts one value first, and which one would depend on row order.
    found = shapiro(np.sort(residual))
    return Check(name=name, statistic=float(found.statistic), p=float(found.pvalue))


def _nothing_to_test(residual: FloatArray, exact: bool) -> str:
    """Why the residuals have no shape; empty when they have one."""
    if exact:
        return EXACT_FIT
    if len(residual) < 2 or residual.min() == residual.max():
        return "the residuals are all equal"
    return ""
