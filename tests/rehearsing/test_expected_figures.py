"""What is counted where the expected effects hold."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import scipy.stats

from beforehand.rehearsing.models import ExpectedFigures
from beforehand.rehearsing.summaries import expected_figures
from beforehand.rehearsing.trials import Subjects


def test_counts_by_hand(made, subjects: Subjects) -> None:
    """Sun has a slope of 2: found too large, with the wrong sign, under a rung, and not at all."""
    nan = np.nan
    trials = made(
        4,
        status=[0, 0, 0, 1],
        adopted=[[1, 1, 1, 0], [1, 0, 1, 1], [1, 0, 1, 0], [0, 0, 0, 0]],
        significant=[[1, 1, 1, 0], [1, 0, 0, 1], [1, 0, 1, 0], [0, 0, 0, 0]],
        transformed=[[0, 0, 0, 0], [0, 0, 0, 0], [1, 0, 0, 0], [0, 0, 0, 0]],
        estimates=[[3, 1, 1, nan, nan], [-2, nan, 1, 1, 1], [nan, nan, 1, nan, nan], [nan] * 5],
        errors=[[1, 1, 1, nan, nan], [1, nan, 1, 1, 1], [nan, nan, 1, nan, nan], [nan] * 5],
        df=[20, 20, 20, nan],
    )
    got = expected_figures([(30, trials)], subjects, {"sun": 2.0}, 0.05)
    # Wind once and glass once; shade is always kept and is no find.
    assert got.any_without_effect_adopted is not None
    assert got.any_without_effect_adopted.value == 0.5
    assert list(got.without_effect) == ["wind", "glass"]
    assert got.held == ("shade",)
    assert list(got.predictors) == ["sun"]
    sun = got.predictors["sun"]
    assert (sun.true, sun.power.value, sun.adopted.value, sun.transformed.value) == (2.0, 0.75, 0.75, 0.25)
    assert sun.exaggeration is not None
    assert sun.exaggeration.value == 1.25
    assert sun.wrong_sign is not None
    assert sun.wrong_sign.value == 0.5
    # 3 ± 2.086 holds 2, -2 ± 2.086 does not.
    assert sun.coverage is not None
    assert sun.coverage.value == 0.5
    assert sun.rests_on is not None
    assert (sun.rests_on.exaggeration, sun.rests_on.coverage) == (2, 2)
    assert sun.columns is None
    assert got.rows_needed is None
    assert [(at.rows, at.power["sun"].value) for at in got.by_rows] == [(30, 0.75)]


def test_the_chance_of_a_false_find_stands_first() -> None:
    """It is the first figure of the scenario in the file."""
    assert next(iter(ExpectedFigures.model_fields)) == "any_without_effect_adopted"


def test_a_category_has_its_figures_by_level(drawn, subjects: Subjects) -> None:
    """Power is of the whole block; levels without an effect have no figures of their own."""
    trials = drawn(2000)
    got = expected_figures([(100, trials)], subjects, {"glass[thick]": 2.0}, 0.05).predictors["glass"]
    assert (got.true, got.exaggeration, got.coverage, got.rests_on) == (None, None, None, None)
    assert got.power.value == pytest.approx(0.09, abs=0.02)
    assert got.columns is not None
    assert list(got.columns) == ["glass[thick]"]
    assert got.columns["glass[thick]"].true == 2.0


def test_an_effect_that_is_never_found_has_no_exaggeration(made, subjects: Subjects) -> None:
    """Conditional figures of nothing are null, and power is 0 with an error."""
    got = expected_figures([(10, made(30))], subjects, {"sun": 1.0, "wind": 1.0}, 0.05)
    sun = got.predictors["sun"]
    assert (sun.exaggeration, sun.wrong_sign, sun.coverage) == (None, None, None)
    assert sun.power.value == 0.0
    assert (sun.power.mc_error or 0) > 0


def test_where_all_have_an_effect_nothing_is_found_falsely(made, subjects: Subjects) -> None:
    """The headline is null, and so is it for every number of rows."""
    everything = {"sun": 1.0, "wind": 1.0, "glass[old]": 1.0}
    got = expected_figures([(10, made(30))], subjects, everything, 0.05)
    assert got.any_without_effect_adopted is None
    assert got.by_rows[0].any_without_effect_adopted is None
    assert got.without_effect == {}


def test_coverage_of_an_honest_interval_is_its_level(made, subjects: Subjects) -> None:
    """Intervals by t of estimates that scatter as t do: 90 % of 20,000 within four errors of 0.2 %."""
    df, count = 7, 20_000
    estimates = np.full((count, 5), np.nan)
    estimates[:, 0] = 1.5 + 0.3 * scipy.stats.t.rvs(df, size=count, random_state=11)
    trials = made(
        count, adopted=np.ones((count, 4)), estimates=estimates, errors=np.full((count, 5), 0.3),
        df=np.full(count, float(df)),
    )  # fmt: skip
    coverage = expected_figures([(10, trials)], subjects, {"sun": 1.5}, 0.10).predictors["sun"].coverage
    assert coverage is not None
    assert coverage.value == pytest.approx(0.90, abs=0.0085)


def test_rows_needed_is_the_fewest_with_enough_power(drawn, subjects: Subjects) -> None:
    """Power of 0.80 itself is enough; an effect that no number of rows finds needs null."""
    trials = drawn(10)

    def with_power(found: int) -> np.ndarray:
        flags = np.zeros((10, 4), dtype=bool)
        flags[:found, 0] = True
        return flags

    grid = [(rows, replace(trials, significant=with_power(n))) for rows, n in ((400, 9), (200, 8), (100, 7))]
    got = expected_figures(grid, subjects, {"sun": 1.0, "wind": 1.0}, 0.05)
    assert got.rows_needed == {"sun": 200, "wind": None}
    assert [at.rows for at in got.by_rows] == [400, 200, 100]
    assert got.rows == 400


def test_no_numbers_of_rows_have_no_figures(subjects: Subjects) -> None:
    """Nothing rehearsed is a fault of the caller."""
    with pytest.raises(ValueError, match="without replicates"):
        expected_figures([], subjects, {}, 0.05)
