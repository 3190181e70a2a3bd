"""What a plan does where no predictor has an effect."""

from __future__ import annotations

import numpy as np

from beforehand.rehearsing.figures import mean, proportion, tail_share
from beforehand.rehearsing.models import Calibrated, HowMany, NoiseFigures
from beforehand.rehearsing.observed import Observed
from beforehand.rehearsing.summaries.counting import (
    anyone,
    held_places,
    p_spread,
    shares,
    spread,
    statuses,
    sure,
)
from beforehand.rehearsing.trials import FloatArray, Subjects, Trials

# The real run is computed to the last digit and replicates in doubles: what differs by less is the same.
_SAME = 1e-9

_NOTE = (
    "Shares of noise replicates that are at least as extreme as the real answer, which counts as one "
    "of them: (x + 1) / (replicates + 1). Selection is in them, as every replicate selects anew."
)


def noise_figures(
    trials: Trials, subjects: Subjects, alpha: float, observed: Observed | None = None
) -> NoiseFigures:
    """Summarize replicates without effects.

    Parameters
    ----------
    trials : Trials
    subjects : Subjects
    alpha : float
        The plan's.
    observed : Observed, optional
        The real run, for calibrated p-values.

    Raises
    ------
    ValueError
        There is no replicate.
    """
    free, held = held_places(subjects)
    found = trials.adopted[:, free]
    # A replicate that comes to no model claims nothing: its p is 1.
    model_p = np.where(np.isfinite(trials.model_p), trials.model_p, 1.0)
    tested = trials.full_p[np.isfinite(trials.full_p)]
    return NoiseFigures(
        any_adopted=sure(proportion(anyone(found))),
        adopted=shares(trials.adopted, subjects.names, free),
        r_squared=spread(trials.r_squared),
        adjusted_r_squared=spread(trials.adjusted_r_squared),
        model_p=p_spread(model_p, alpha),
        full_p=p_spread(tested, alpha) if len(tested) else None,
        predictors_adopted=HowMany(mean=sure(mean(found.sum(axis=1)))),
        statuses=statuses(trials),
        calibrated=None if observed is None else _calibrated(trials, model_p, observed),
        held=tuple(subjects.names[place] for place in held),
    )


def _calibrated(trials: Trials, model_p: FloatArray, observed: Observed) -> Calibrated | None:
    """The real answer beside the replicates; None where it has no R²."""
    if not np.isfinite(observed.r_squared):
        return None
    # NaN compares as not extreme: a replicate without a fit shows nothing.
    as_high = int(np.count_nonzero(trials.r_squared >= observed.r_squared - _SAME))
    tested = bool(np.isfinite(observed.model_p))
    as_low = int(np.count_nonzero(model_p <= observed.model_p * (1 + _SAME))) if tested else 0
    return Calibrated(
        r_squared=observed.r_squared,
        p_of_r_squared=tail_share(as_high, trials.count),
        model_p=observed.model_p if tested else None,
        p_of_model_p=tail_share(as_low, trials.count) if tested else None,
        note=_NOTE,
    )
