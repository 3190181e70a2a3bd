"""How stable the choices of a plan are, and how optimistic its answer is."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from itertools import combinations

import numpy as np

from beforehand.rehearsing.figures import (
    Estimate,
    mean,
    proportion,
    relative_bias,
    root_mean_square,
    share,
    shifted,
)
from beforehand.rehearsing.models import (
    Bootstrap,
    HalfSamples,
    ModelShare,
    Optimism,
    PairShare,
    ResampleFigures,
    RulingShare,
)
from beforehand.rehearsing.observed import Observed
from beforehand.rehearsing.summaries.counting import held_places, shares, standing, statuses, sure
from beforehand.rehearsing.summaries.intervals import interval
from beforehand.rehearsing.trials import Flags, FloatArray, Subjects, Trials

MOST_MODELS = 10
# Beyond so many predictors a list of all pairs helps nobody.
ALL_PAIRS_UP_TO = 20
MOST_PAIRS = 50


def resample_figures(
    half: Trials,
    boot: Trials,
    subjects: Subjects,
    observed: Observed | None,
    alpha: float,
    *,
    half_rows: int | None = None,
) -> ResampleFigures:
    """Summarize replicates on halves of the rows and on rows drawn with replacement.

    Parameters
    ----------
    half, boot : Trials
        Replicates on half-samples without replacement, and on as many rows as there are with it.
    subjects : Subjects
    observed : Observed or None
        The real run, beside which bias, R² and rulings are read.
    alpha : float
        The plan's; intervals are at 1 - alpha.
    half_rows : int, optional
        Rows of each half; the most that a fit on one had where not given.

    Raises
    ------
    ValueError
        There is no replicate.
    """
    rows = int(half.rows.max(initial=0)) if half_rows is None else half_rows
    return ResampleFigures(
        half_samples=_half_samples(half, subjects, rows),
        bootstrap=_bootstrap(boot, subjects, observed, alpha),
    )


def _half_samples(half: Trials, subjects: Subjects, rows: int) -> HalfSamples:
    """Which choices are made again on halves."""
    models = _models(half.present, subjects.names)
    return HalfSamples(
        rows=rows,
        inclusion=shares(half.present, subjects.names, range(len(subjects.names))),
        pairs=_pairs(half.present, subjects),
        models=tuple(
            ModelShare(predictors=names, share=sure(share(count, half.count)))
            for names, count in models[:MOST_MODELS]
        ),
        different_models=len(models),
        sign_stability={
            name: _same_sign(half.estimates[half.present[:, owner] & standing(half, column), column])
            for column, (name, owner) in enumerate(zip(subjects.columns, subjects.owners, strict=True))
        },
        statuses=statuses(half),
    )


def _models(adopted: Flags, names: Sequence[str]) -> list[tuple[tuple[str, ...], int]]:
    """Every set that was adopted with its count, the most frequent first, then in plan order."""
    counts = Counter(row.tobytes() for row in np.ascontiguousarray(adopted))
    # False sorts before True: of two sets, the one with the earlier predictors comes first.
    found = [(np.frombuffer(row, dtype=bool), count) for row, count in counts.items()]
    found.sort(key=lambda one: (-one[1], tuple(~one[0])))
    return [
        (tuple(name for name, there in zip(names, row, strict=True) if there), count) for row, count in found
    ]


def _pairs(adopted: Flags, subjects: Subjects) -> tuple[PairShare, ...]:
    """Pairs that a plan may choose: all of few predictors, else the most frequent and the least expected."""
    free, _ = held_places(subjects)
    count = len(adopted)
    chosen = adopted[:, free].astype(float)
    # Counts below 2^53 are exact in doubles, in whatever order they are summed.
    together = chosen.T @ chosen
    alone = np.diag(together) / max(count, 1)
    pairs = list(combinations(range(len(free)), 2))
    frequent = sorted(pairs, key=lambda pair: (-together[pair], pair))
    if len(free) > ALL_PAIRS_UP_TO:
        surprising = sorted(
            pairs, key=lambda pair: (-abs(together[pair] / count - alone[pair[0]] * alone[pair[1]]), pair)
        )
        told = {*frequent[:MOST_PAIRS], *surprising[:MOST_PAIRS]}
        frequent = [pair for pair in frequent if pair in told]
    return tuple(
        PairShare(
            predictors=(subjects.names[free[one]], subjects.names[free[other]]),
            both=sure(share(int(together[one, other]), count)),
            if_unrelated=float(alone[one] * alone[other]),
        )
        for one, other in frequent
    )


def _same_sign(estimates: FloatArray) -> Estimate | None:
    """The share of coefficients that have the more frequent sign; None of none."""
    positive = int(np.count_nonzero(estimates > 0))
    return share(max(positive, len(estimates) - positive), len(estimates))


def _bootstrap(boot: Trials, subjects: Subjects, observed: Observed | None, alpha: float) -> Bootstrap:
    """How far estimates are off and how optimistic R² is."""
    nothing = np.full(len(subjects.columns), np.nan)
    full = nothing if observed is None else observed.full_estimates
    errors = nothing if observed is None else observed.full_errors
    columns = range(len(subjects.columns))
    return Bootstrap(
        inclusion=shares(boot.present, subjects.names, range(len(subjects.names))),
        relative_conditional_bias={
            subjects.columns[c]: relative_bias(boot.estimates[:, c], full[c])
            if _comparable(subjects, c, observed)
            else None
            for c in columns
        },
        rmsd_ratio={
            subjects.columns[c]: root_mean_square(_with_zeros(boot, subjects, c) - full[c], errors[c])
            if _comparable(subjects, c, observed)
            else None
            for c in columns
        },
        r_squared=_optimism(boot, observed),
        calibration_slope=mean(boot.slope),
        intervals={
            subjects.columns[c]: interval(
                _with_zeros(boot, subjects, c), _answered(subjects, c, observed), alpha
            )
            for c in columns
            if _comparable(subjects, c, observed)
        },
        rulings=()
        if observed is None
        else tuple(
            RulingShare(
                ruling=ruling.id,
                subject=ruling.subject,
                ground=ruling.ground,
                same=sure(proportion(boot.same_rulings[:, place])),
            )
            for place, ruling in enumerate(observed.rulings)
        ),
        statuses=statuses(boot),
    )


def _comparable(subjects: Subjects, column: int, observed: Observed | None) -> bool:
    """Whether the real answer has the column as it was read; under a rung its size is another's."""
    return observed is None or not observed.transformed[subjects.owners[column]]


def _with_zeros(boot: Trials, subjects: Subjects, column: int) -> FloatArray:
    """A coefficient in every replicate: 0 where it is not selected, NaN under a rung of the ladder."""
    values = boot.estimates[:, column]
    zero = ~np.isfinite(values) & ~boot.transformed[:, subjects.owners[column]]
    made: FloatArray = np.where(zero, 0.0, values)
    return made


def _answered(subjects: Subjects, column: int, observed: Observed | None) -> float:
    """The coefficient in the real answer: 0 where it was not selected, NaN where it is not comparable."""
    if observed is None or observed.transformed[subjects.owners[column]]:
        return float("nan")
    value = float(observed.estimates[column])
    return value if np.isfinite(value) else 0.0


def _optimism(boot: Trials, observed: Observed | None) -> Optimism:
    """R² less the mean of its excess (Harrell, Lee & Mark 1996; Efron & Gong 1983)."""
    optimism = mean(boot.here - boot.elsewhere)
    # A mean explains nothing, and has nothing that could be too good.
    known = observed is not None and observed.status == "adopted"
    apparent = observed.apparent if observed is not None and known else float("nan")
    return Optimism(
        apparent=apparent if np.isfinite(apparent) else None,
        optimism=optimism,
        corrected=shifted(optimism, apparent),
    )
