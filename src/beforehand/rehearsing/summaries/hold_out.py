"""Errors of prediction of the whole procedure on rows that it had not seen."""

from __future__ import annotations

from collections.abc import Callable
from math import fsum, sqrt

import numpy as np

from beforehand.rehearsing.figures import Estimate, jackknifed
from beforehand.rehearsing.models import HoldOutFigures
from beforehand.rehearsing.observed import HeldOut
from beforehand.rehearsing.trials import Flags


def hold_out_figures(held: HeldOut) -> HoldOutFigures:
    """Summarize predictions of rows that were left out.

    Parameters
    ----------
    held : HeldOut

    Returns
    -------
    HoldOutFigures
        Monte Carlo errors are those of the draw of folds, from leaving out one repeat at a time; 0
        where nothing was drawn, as groups were left out, and null from a single repeat. Figures are
        null where no row could be predicted, and R² where the mean model errs nowhere.
    """

    def rmse(repeats: Flags) -> float:
        return _root(_sum(held.squared[repeats]), _sum(held.rows[repeats]))

    def rmse_mean_model(repeats: Flags) -> float:
        return _root(_sum(held.squared_mean_model[repeats]), _sum(held.rows[repeats]))

    def r_squared(repeats: Flags) -> float:
        total = _sum(held.squared_mean_model[repeats])
        return 1 - _sum(held.squared[repeats]) / total if total > 0 else float("nan")

    def estimate(statistic: Callable[[Flags], float]) -> Estimate | None:
        made = jackknifed(statistic, len(held.squared))
        return made if made is None or not held.groups else Estimate(value=made.value, mc_error=0.0)

    return HoldOutFigures(
        folds=held.folds,
        repeats=len(held.squared),
        groups=held.groups or None,
        rmse=estimate(rmse),
        rmse_mean_model=estimate(rmse_mean_model),
        r_squared=estimate(r_squared),
        predicted=int(held.rows.sum()),
        not_predicted=int(held.not_predicted.sum()),
        no_fit=int(np.count_nonzero(held.no_fit)),
    )


def _sum(values: np.ndarray) -> float:
    """The exactly rounded sum; NaN of folds without a fit counts as nothing."""
    return fsum(np.nan_to_num(np.asarray(values, dtype=float)).ravel())


def _root(squared: float, rows: float) -> float:
    """The root of a mean square; NaN without rows."""
    return sqrt(squared / rows) if rows else float("nan")
