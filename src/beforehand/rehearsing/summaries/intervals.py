"""Intervals of a coefficient from replicates of the whole plan, selection included."""

from __future__ import annotations

from math import isfinite, sqrt
from statistics import NormalDist

import numpy as np

from beforehand.rehearsing.figures import known, quantile
from beforehand.rehearsing.models import Ends, Interval
from beforehand.rehearsing.trials import FloatArray

_NORMAL = NormalDist()


def interval(values: FloatArray, answered: float, alpha: float) -> Interval:
    """Percentile and bias-corrected intervals of one coefficient.

    Parameters
    ----------
    values : FloatArray, shape (B,)
        The coefficient in each replicate; NaN where it cannot be compared.
    answered : float
        The same in the real answer; NaN where there is none.
    alpha : float
        Both intervals are at 1 - alpha.

    Returns
    -------
    Interval
        The bias-corrected one is that of Efron (1981), Nonparametric standard errors and confidence
        intervals; equal values count half to each side, as coefficients that were not selected are all
        0. It is null where every replicate lies on one side of the answer.
    """
    plain = _ends(values, (alpha / 2, 1 - alpha / 2), (0.0, 0.0))
    corrected = None
    array = known(values)
    if isfinite(answered) and len(array):
        below = (np.count_nonzero(array < answered) + np.count_nonzero(array <= answered)) / (2 * len(array))
        if 0 < below < 1:
            start = _NORMAL.inv_cdf(below)
            spread = sqrt(below * (1 - below) / len(array))
            shifted = [2 * start + _NORMAL.inv_cdf(level) for level in (alpha / 2, 1 - alpha / 2)]
            levels = (_NORMAL.cdf(shifted[0]), _NORMAL.cdf(shifted[1]))
            # How the level moves with the share below, which replicates only estimate.
            steepness = 2 / _NORMAL.pdf(start)
            errors = (
                steepness * _NORMAL.pdf(shifted[0]) * spread,
                steepness * _NORMAL.pdf(shifted[1]) * spread,
            )
            corrected = _ends(values, levels, errors)
    return Interval(
        percentile=None if plain is None else plain[0],
        percentile_mc_error=None if plain is None else plain[1],
        bias_corrected=None if corrected is None else corrected[0],
        bias_corrected_mc_error=None if corrected is None else corrected[1],
    )


def _ends(
    values: FloatArray, levels: tuple[float, float], level_errors: tuple[float, float]
) -> tuple[Ends, Ends | None] | None:
    """Two quantiles and their errors; the errors None where a single replicate shows none."""
    low, high = (quantile(values, *one) for one in zip(levels, level_errors, strict=True))
    if low is None or high is None:
        return None
    if low.mc_error is None or high.mc_error is None:
        return (low.value, high.value), None
    return (low.value, high.value), (low.mc_error, high.mc_error)
