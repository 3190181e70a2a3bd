"""What every scenario counts: how replicates ended, who was adopted, how a figure is spread.

A replicate that stopped or had no fit adopted nothing; it stays in every denominator of a share.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from beforehand.rehearsing.figures import Estimate, mean, proportion, quantile
from beforehand.rehearsing.models import PSpread, Spread, Statuses
from beforehand.rehearsing.trials import STATUSES, Flags, FloatArray, Subjects, Trials


def statuses(trials: Trials) -> Statuses:
    """The share of replicates that ended in each way, all of the ways."""
    made = {name: sure(proportion(trials.status == place)) for place, name in enumerate(STATUSES)}
    return Statuses(**made)


def sure(estimate: Estimate | None) -> Estimate:
    """An estimate that rests on at least one replicate.

    Raises
    ------
    ValueError
        There is no replicate at all.
    """
    if estimate is None:
        raise ValueError("there are no figures of a rehearsal without replicates")
    return estimate


def shares(flags: Flags, names: Sequence[str], places: Sequence[int]) -> dict[str, Estimate]:
    """The share of True in some columns of ``flags``, shape (B, k), by their names."""
    return {names[place]: sure(proportion(flags[:, place])) for place in places}


def spread(values: FloatArray) -> Spread | None:
    """Mean and quantiles of the finite values; None where there is none."""
    middle = mean(values)
    if middle is None:
        return None
    return Spread(
        mean=middle,
        q05=sure(quantile(values, 0.05)),
        q50=sure(quantile(values, 0.5)),
        q95=sure(quantile(values, 0.95)),
    )


def p_spread(values: FloatArray, alpha: float) -> PSpread:
    """Quantiles of p-values, all finite, and the share at or below alpha."""
    return PSpread(
        q05=sure(quantile(values, 0.05)),
        q50=sure(quantile(values, 0.5)),
        q95=sure(quantile(values, 0.95)),
        at_or_below_alpha=sure(proportion(values <= alpha)),
    )


def anyone(flags: Flags) -> Flags:
    """Whether any is True in each row; shapes (B, k) and (B,)."""
    found: Flags = np.any(flags, axis=1)
    return found


def held_places(subjects: Subjects) -> tuple[list[int], list[int]]:
    """Places of the predictors that a plan may choose, and of those that it holds always."""
    free = [place for place, held in enumerate(subjects.held) if not held]
    return free, [place for place, held in enumerate(subjects.held) if held]


def standing(trials: Trials, column: int) -> Flags:
    """Replicates in whose answer a column stands as it was read; shape (B,)."""
    found: Flags = np.isfinite(trials.estimates[:, column])
    return found
