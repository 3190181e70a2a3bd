"""What a plan does where the expected effects hold and every other predictor has none."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from beforehand.rehearsing.figures import Estimate, mean, proportion
from beforehand.rehearsing.models import (
    AtRows,
    ExpectedColumn,
    ExpectedFigures,
    ExpectedPredictorFigures,
    RestsOn,
)
from beforehand.rehearsing.summaries.counting import anyone, shares, spread, standing, statuses, sure
from beforehand.rehearsing.trials import Flags, Subjects, Trials

# Cohen (1992): the chance to find an effect for which a study is commonly sized.
ENOUGH_POWER = 0.80


def expected_figures(
    by_rows: Sequence[tuple[int, Trials]],
    subjects: Subjects,
    truth: Mapping[str, float],
    alpha: float,
) -> ExpectedFigures:
    """Summarize replicates with the effects that the plan expects.

    Parameters
    ----------
    by_rows : sequence of (int, Trials)
        Replicates by number of rows. The figures stand for the first; `by_rows` of the result holds
        all, in the order given.
    subjects : Subjects
    truth : mapping
        Design column to the slope that was put in; 0 for columns not named.
    alpha : float
        The plan's; intervals are at 1 - alpha.

    Raises
    ------
    ValueError
        There is no replicate.
    """
    if not by_rows:
        raise ValueError("there are no figures of a rehearsal without replicates")
    rows, trials = by_rows[0]
    real = _with_effect(subjects, truth)
    without = [
        place for place, held in enumerate(subjects.held) if not held and subjects.names[place] not in real
    ]
    table = tuple(
        AtRows(
            rows=number,
            any_without_effect_adopted=_any(part.adopted, without),
            power=shares(part.significant, subjects.names, [subjects.names.index(name) for name in real]),
        )
        for number, part in by_rows
    )
    return ExpectedFigures(
        any_without_effect_adopted=_any(trials.adopted, without),
        rows=rows,
        predictors={
            name: _predictor(trials, subjects, subjects.names.index(name), columns, alpha)
            for name, columns in real.items()
        },
        without_effect=shares(trials.adopted, subjects.names, without),
        statuses=statuses(trials),
        r_squared=spread(trials.r_squared),
        by_rows=table,
        rows_needed={name: _rows_needed(table, name) for name in real} if len(table) > 1 else None,
        held=tuple(name for name, held in zip(subjects.names, subjects.held, strict=True) if held),
    )


def _with_effect(subjects: Subjects, truth: Mapping[str, float]) -> dict[str, dict[int, float]]:
    """Predictors with an effect, in plan order, with the places and slopes of all their columns."""
    real: dict[str, dict[int, float]] = {}
    for place, name in enumerate(subjects.names):
        columns = {
            column: float(truth.get(subjects.columns[column], 0.0))
            for column, owner in enumerate(subjects.owners)
            if owner == place
        }
        if any(columns.values()):
            real[name] = columns
    return real


def _any(adopted: Flags, places: Sequence[int]) -> Estimate | None:
    """The chance that at least one of some predictors is adopted; None where there is none of them."""
    return proportion(anyone(adopted[:, list(places)])) if places else None


def _predictor(
    trials: Trials, subjects: Subjects, place: int, columns: Mapping[int, float], alpha: float
) -> ExpectedPredictorFigures:
    """How well one predictor with an effect is found."""
    single = len(columns) == 1
    made = {
        column: _column(trials, place, column, slope, alpha) for column, slope in columns.items() if slope
    }
    only = next(iter(made.values())) if single else None
    return ExpectedPredictorFigures(
        true=None if only is None else only.true,
        power=sure(proportion(trials.significant[:, place])),
        adopted=sure(proportion(trials.adopted[:, place])),
        exaggeration=None if only is None else only.exaggeration,
        wrong_sign=None if only is None else only.wrong_sign,
        coverage=None if only is None else only.coverage,
        transformed=sure(proportion(trials.transformed[:, place])),
        rests_on=None if only is None else only.rests_on,
        columns=None if single else {subjects.columns[column]: one for column, one in made.items()},
    )


def _column(trials: Trials, place: int, column: int, true: float, alpha: float) -> ExpectedColumn:
    """Exaggeration and wrong signs among the significant (Gelman & Carlin 2014), coverage in all answers."""
    from scipy.special import stdtrit

    estimates = trials.estimates[:, column]
    stands = standing(trials, column)
    significant = trials.significant[:, place] & ~trials.transformed[:, place] & stands
    ratios = estimates[significant] / true
    reported = stands & np.isfinite(trials.errors[:, column]) & np.isfinite(trials.df)
    half = stdtrit(trials.df[reported], 1 - alpha / 2) * trials.errors[reported, column]
    holds: Flags = np.abs(estimates[reported] - true) <= half
    return ExpectedColumn(
        true=true,
        exaggeration=mean(np.abs(ratios)),
        wrong_sign=proportion(ratios < 0),
        coverage=proportion(holds),
        rests_on=RestsOn(exaggeration=len(ratios), coverage=len(holds)),
    )


def _rows_needed(table: Sequence[AtRows], name: str) -> int | None:
    """The fewest rows at which an effect is found often enough."""
    return min((at.rows for at in table if at.power[name].value >= ENOUGH_POWER), default=None)
