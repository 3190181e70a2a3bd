"""Standard errors that do not lean on equal spread or independence, in plain doubles."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.doubles import NotQuick
from beforehand.fit.results import Fit
from beforehand.fit.robust import NotEstimable, fit_with


def robust_covariance(
    pulls: FloatArray,
    residual: FloatArray,
    leverage: FloatArray,
    *,
    errors: str,
    df: int,
    groups: FloatArray | None,
    order: FloatArray | None,
    lags: int | None,
) -> tuple[FloatArray, int]:
    """Covariance of the slopes, and its degrees of freedom; forms and factors as in `robust`.

    Parameters
    ----------
    pulls : FloatArray, shape (n, k)
        ``(X'X)⁻¹ x`` of each row, slopes only.
    residual, leverage : FloatArray, shape (n,)
    errors : str
    df : int
        Residual degrees of freedom.
    groups, order : FloatArray, shape (n,), or None
    lags : int or None
    """
    n = len(residual)
    if errors == "cluster":
        if groups is None:
            raise NotEstimable("no column names the clusters")
        _, codes = np.unique(groups, return_inverse=True)
        count = int(codes.max()) + 1
        if count < 2:
            raise NotEstimable("there is one cluster only")
        scores = np.zeros((count, pulls.shape[1]))
        np.add.at(scores, codes, pulls * residual[:, None])
        return scores.T @ scores * (count / (count - 1) * (n - 1) / df), count - 1
    if errors == "autocorrelation":
        if order is None or lags is None:
            raise NotEstimable("no column gives the order of the rows")
        scores = (pulls * residual[:, None])[np.argsort(order, kind="stable")]
        total = scores.T @ scores
        for lag in range(1, min(lags, n - 1) + 1):
            cross = scores[:-lag].T @ scores[lag:]
            total += (1.0 - lag / (lags + 1)) * (cross + cross.T)
        return total, df
    rest = 1.0 - leverage
    if errors in ("hc2", "hc3") and bool((rest <= 1e-6).any()):
        raise NotQuick("a row of leverage 1 leaves no residual to weigh")
    power = {"hc0": 0.0, "hc1": 0.0, "hc2": -0.5, "hc3": -1.0}[errors]
    scores = pulls * (residual * rest**power)[:, None]
    return scores.T @ scores * (n / df if errors == "hc1" else 1.0), df


def with_covariance(
    fit: Fit, covariance: FloatArray, blocks: Mapping[str, tuple[Key, ...]], df: int, errors: str
) -> Fit:
    """The fit with this covariance of its slopes; the intercept keeps none."""
    k = len(covariance)
    whole = np.zeros((k + 1, k + 1))
    whole[1:, 1:] = covariance
    return fit_with(fit, whole, blocks, df, errors)
