"""What is counted where no predictor has an effect."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from beforehand.rehearsing.observed import Observed
from beforehand.rehearsing.summaries import noise_figures
from beforehand.rehearsing.trials import Subjects


def test_counts_by_hand(made, subjects: Subjects) -> None:
    """Four replicates: two finds in the first, one in the second, the mean, and none that could be run."""
    trials = made(
        4,
        status=[0, 0, 1, 4],
        adopted=[[1, 1, 1, 0], [0, 1, 1, 0], [0, 0, 0, 0], [0, 0, 0, 0]],
        r_squared=[0.4, 0.2, 0.0, np.nan],
        adjusted_r_squared=[0.3, 0.1, 0.0, np.nan],
        model_p=[0.01, 0.05, np.nan, np.nan],
        full_p=[0.02, 0.5, 0.9, np.nan],
    )
    got = noise_figures(trials, subjects, 0.05)
    assert got.any_adopted.value == 0.5
    assert {name: one.value for name, one in got.adopted.items()} == {"sun": 0.25, "wind": 0.5, "glass": 0.0}
    assert got.held == ("shade",)
    assert got.predictors_adopted.mean.value == 0.75
    assert got.r_squared is not None
    assert got.r_squared.mean.value == pytest.approx(0.2)
    assert got.r_squared.q50.value == 0.2
    # A p of the mean, or of nothing, is 1; alpha itself counts as at or below.
    assert got.model_p.at_or_below_alpha.value == 0.5
    assert got.model_p.q95.value == 1.0
    assert got.full_p is not None
    assert got.full_p.at_or_below_alpha.value == pytest.approx(1 / 3)
    assert [getattr(got.statuses, name).value for name in type(got.statuses).model_fields] == [
        0.5, 0.25, 0.0, 0.0, 0.25,
    ]  # fmt: skip
    assert got.calibrated is None


def test_a_real_answer_is_counted_as_one_of_its_replicates(
    made, subjects: Subjects, observed: Observed
) -> None:
    """(x + 1)/(B + 1), ties as extreme, replicates without a fit as not extreme."""
    trials = made(4, r_squared=[0.8, 0.76 - 1e-12, 0.1, np.nan], model_p=[1e-12, 1e-9, 0.5, np.nan])
    real = noise_figures(trials, subjects, 0.05, observed).calibrated
    assert real is not None
    assert real.p_of_r_squared.value == 3 / 5
    assert real.p_of_model_p is not None
    assert real.p_of_model_p.value == 3 / 5


def test_a_real_answer_without_a_test_has_no_p_of_it(made, subjects: Subjects, observed: Observed) -> None:
    """The mean has an R² of 0, which every replicate reaches, and no p; no R² at all has nothing."""
    trials = made(3, r_squared=[0.1, 0.0, 0.2])
    mean_only = replace(observed, r_squared=0.0, model_p=float("nan"))
    real = noise_figures(trials, subjects, 0.05, mean_only).calibrated
    assert real is not None
    assert (real.p_of_r_squared.value, real.model_p, real.p_of_model_p) == (1.0, None, None)
    stopped = replace(observed, r_squared=float("nan"))
    assert noise_figures(trials, subjects, 0.05, stopped).calibrated is None


def test_replicates_that_all_stopped_are_counted(made, subjects: Subjects) -> None:
    """Nothing is adopted, nothing has an R², and every one stands among the statuses."""
    got = noise_figures(made(50, status=[3] * 50), subjects, 0.05)
    assert (got.any_adopted.value, got.r_squared, got.full_p) == (0.0, None, None)
    assert got.statuses.stopped.value == 1.0


def test_no_replicates_have_no_figures(made, subjects: Subjects) -> None:
    """Nothing rehearsed is a fault of the caller."""
    with pytest.raises(ValueError, match="without replicates"):
        noise_figures(made(0), subjects, 0.05)
