"""Samples of the rows and rows held out, against large fresh samples, libraries, papers and sums by hand.

Every bound is four Monte Carlo standard errors (`invented.ERRORS`) where nothing else is said. Where a
figure is a mean over tables, its error is that of the tables, which is the larger one.
"""

from __future__ import annotations

from math import sqrt

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from tests.rehearsing.invented import a_plan, a_stage, names, near, near_mean, numbers, without_gate

from beforehand.rehearsing.hold_out import held_out_of, hold_out_world
from beforehand.rehearsing.resample import BOOTSTRAP, HALF_SAMPLES, SampleWorld
from beforehand.rehearsing.summaries import hold_out_figures, resample_figures
from beforehand.table import table_from_frame

# Woods, Steinour & Starke (1932); Hald (1952) p. 647: heat of setting cement by its compounds.
HALD = pd.DataFrame(
    {
        "a1": [7, 1, 11, 11, 7, 11, 3, 1, 2, 21, 1, 11, 10],
        "a2": [26, 29, 56, 31, 52, 55, 71, 31, 54, 47, 40, 66, 68],
        "a3": [6, 15, 8, 8, 6, 9, 17, 22, 18, 4, 23, 9, 8],
        "a4": [60, 52, 20, 47, 33, 22, 6, 44, 22, 26, 34, 12, 12],
        "y": [78.5, 74.3, 104.3, 87.6, 95.9, 109.2, 102.7, 72.5, 93.1, 115.9, 83.8, 113.3, 109.4],
    }
)


def samples(stage, kind, seed, count):
    """Replicates on samples of the rows."""
    return SampleWorld(name=kind, stage=stage, seen=(), seed=seed).trials(0, count)


# -- samples of the rows --------------------------------------------------------------------------


def test_how_often_the_hald_predictors_are_included():
    """Backward elimination at alpha .10 on 4,000 samples with replacement: .849 .803 .552 .416.

    The frequencies are of a re-simulation with numpy and statsmodels alone, 20,000 samples, error .004.
    The F test of the whole model, with which our rule begins, keeps nothing back: it is significant in
    every sample, or without a p in the few that hold five different rows only and are fitted exactly.
    """
    plan = a_plan(names(4), steps=["selection"], alpha=0.10)
    stage = a_stage(plan, HALD)
    trials = samples(stage, BOOTSTRAP, 31, 4000)
    assert np.nanmax(trials.full_p) < 0.10
    assert (trials.r_squared[np.isnan(trials.full_p)] == 1.0).all()
    assert np.isnan(trials.full_p).mean() < 0.01
    for place, published in enumerate((0.849, 0.803, 0.552, 0.416)):
        share = trials.adopted[:, place].mean()
        near(share, published, np.hypot(sqrt(share * (1 - share) / 4000), 0.004))
    figures = resample_figures(trials, trials, stage.subjects, None, 0.10)
    shares = {model.predictors: model.share.value for model in figures.half_samples.models}
    for model, published in ((("a1", "a2"), 0.35), (("a1", "a2", "a3"), 0.23), (("a2", "a3", "a4"), 0.14)):
        # Published to two digits.
        assert abs(shares[model] - published) <= 4 * sqrt(0.25 / 4000) + 0.005


@pytest.mark.parametrize(("alpha", "half", "with_replacement"), [(0.05, 0.05, 0.166), (0.157, 0.157, 0.317)])
def test_halves_find_noise_as_often_as_alpha_and_samples_with_replacement_more_often(
    alpha, half, with_replacement
):
    """A noise predictor is kept by a share alpha of halves, and by 17 % and 32 % of the others.

    In a sample with replacement a slope varies about one that varies as much itself: P(|Z| √2 > z) is
    .166 at alpha .05 and .317 at .157. Both are for large tables, and a test of one predictor alone; at
    400 rows, beside a real effect and another noise predictor, they move by less than .01.
    """
    rng = np.random.default_rng(32)
    plan = a_plan(names(3), steps=["selection"], alpha=alpha, **without_gate("a1"))
    found = np.empty((100, 2))
    for table in range(len(found)):
        frame = numbers(rng, 400, 3)
        frame["y"] += 0.5 * frame["a1"]
        stage = a_stage(plan, frame)
        halves = samples(stage, HALF_SAMPLES, table, 100)
        again = samples(stage, BOOTSTRAP, table, 100)
        assert halves.rows.max() == 200
        found[table] = halves.adopted[:, 1:].mean(), again.adopted[:, 1:].mean()
    error = found.std(axis=0, ddof=1) / sqrt(len(found))
    assert abs(found[:, 0].mean() - half) <= 4 * error[0] + 0.01
    assert abs(found[:, 1].mean() - with_replacement) <= 4 * error[1] + 0.01
    assert found[:, 1].mean() > found[:, 0].mean() + 0.08


@pytest.mark.parametrize("spread", ["even", "uneven"])
def test_spread_of_slopes_over_samples_is_that_of_standard_errors(spread):
    """Without selection and in a large table: HC0 to HC3 where the spread is uneven, else classical too.

    Rows drawn with replacement keep the spread of each row, which classical errors do not know
    (Efron & Tibshirani 1993, ch. 9; MacKinnon & White 1985). The error of a standard deviation of B
    values is 1/√(2 (B - 1)) of it; one part in a hundred is left for what a table of 1,500 rows is short
    of a large one.
    """
    rng, count = np.random.default_rng(33), 2000
    frame = numbers(rng, 1500, 3)
    if spread == "uneven":
        frame["y"] *= np.exp(0.6 * frame["a1"])
    frame["y"] += frame["a1"] - 0.5 * frame["a2"]
    plan = a_plan(names(3), steps=["selection"], selection={"method": "none"})
    trials = samples(a_stage(plan, frame), BOOTSTRAP, 34, count)
    found = trials.estimates.std(axis=0, ddof=1)
    fit = sm.OLS(frame["y"].to_numpy(), sm.add_constant(frame[names(3)].to_numpy())).fit()
    bound = 4 / sqrt(2 * (count - 1)) + 0.01
    for errors in (fit.HC0_se, fit.HC3_se):
        np.testing.assert_allclose(found, errors[1:], rtol=bound)
    away = np.abs(found / fit.bse[1:] - 1)
    if spread == "even":
        # The table's own squares are not quite even: HC0 and classical differ by chance as well.
        assert away.max() <= bound + np.abs(fit.HC0_se[1:] / fit.bse[1:] - 1).max()
    else:
        assert away[0] > 2 * bound


@pytest.mark.parametrize("selects", [False, True], ids=["fixed model", "backward elimination"])
def test_r_squared_less_its_optimism_is_that_of_a_large_fresh_sample(selects):
    """Over 60 tables, apparent R² less optimism against R² of the same answer on 200,000 fresh rows.

    Harrell, Lee & Mark (1996), Statistics in Medicine 15:361-387; Efron & Gong (1983). What the true
    model happens to explain in a table beyond its share is the same in both and taken out, which leaves a
    quarter of the error. Beside it a share (p + 1)/n of the optimism is allowed for, as the residuals
    that are sampled are that much smaller than the errors; with selection the other way a share 0.2, as
    samples with replacement choose noise more often than a table does.
    """
    rng, slopes = np.random.default_rng(35), np.array([0.5, 0.3, 0.2, *[0.0] * 7])
    changes = {"selection": {"method": "backward" if selects else "none"}}
    plan = a_plan(names(10), steps=["selection"], **changes, **without_gate("a1"))
    fresh = rng.normal(size=(200_000, 10))
    fresh_outcome = fresh @ slopes + rng.normal(size=200_000)
    apparent, optimism, true, luck = np.empty((4, 60))
    for table in range(60):
        frame = numbers(rng, 200, 10)
        errors = frame["y"].to_numpy().copy()
        frame["y"] += frame[names(10)] @ slopes
        stage = a_stage(plan, frame)
        real = stage.trials(stage.setting.source.raw("y")[None])
        figures = resample_figures(real, samples(stage, BOOTSTRAP, table, 100), stage.subjects, None, 0.05)
        apparent[table] = real.r_squared[0]
        optimism[table] = figures.bootstrap.r_squared.optimism.value
        level = frame["y"].mean() if np.isnan(real.intercept[0]) else real.intercept[0]
        predicted = level + fresh @ np.nan_to_num(real.estimates[0])
        true[table] = 1 - np.mean((fresh_outcome - predicted) ** 2) / fresh_outcome.var()
        luck[table] = 1 - errors.var() / frame["y"].var() - slopes @ slopes / (1 + slopes @ slopes)
    really = apparent - true - luck
    error = float((optimism - really).std(ddof=1)) / sqrt(60)
    left = (0.2 if selects else 11 / 200) * really.mean()
    assert abs(optimism.mean() - really.mean()) <= 4 * error + left
    assert really.mean() > 6 * error


# -- rows held out --------------------------------------------------------------------------------


def test_each_hald_row_held_out_alone_gives_the_published_press():
    """The sum of squared errors of prediction, 110.35 for all four and 93.88 for the first two.

    Montgomery, Peck & Vining, Introduction to Linear Regression Analysis, table of all subsets; digits by
    the closed form, the sum of (e/(1 - h))². That of the mean is TSS (n/(n - 1))², with TSS 2715.7631.
    """
    for used, press in ((names(4), 110.34656), (names(2), 93.88255)):
        stage = a_stage(a_plan(used, steps=[], rehearsal={"folds": 13}), HALD)
        world = hold_out_world(stage, 41)
        held = held_out_of(world, world.trials(0, 13))
        assert held.squared.sum() == pytest.approx(press, abs=6e-6)
        mean = 2715.7630769 * (13 / 12) ** 2
        figures = hold_out_figures(held)
        assert figures.rmse_mean_model.value == pytest.approx(sqrt(mean / 13), rel=1e-9)
        assert figures.r_squared.value == pytest.approx(1 - press / mean, abs=1e-8)


def test_groups_left_out_one_at_a_time_by_hand():
    """Two sites of three rows: each is predicted by the line through the other.

    North: y = x/2, which errs in the south by 1.5, 4 and 3.5 (squares 30.5; about its mean 0: 33). South:
    y = 3 + 1.5 x, which errs in the north by -2.5, -2 and -4.5 (30.5; about its mean 3: 29).
    """
    frame = pd.DataFrame(
        {
            "a1": [-1, 0, 1, -1, 0, 1], "y": [-1, 1, 0, 1, 4, 4],
            "site": ["north"] * 3 + ["south"] * 3,
        }
    )  # fmt: skip
    world = hold_out_world(a_stage(a_plan(["a1"], steps=[], rehearsal={"leave_out": "site"}), frame), 42)
    assert world.groups == ("north", "south")
    assert world.repeats(2000) == 1
    held = held_out_of(world, world.trials(0, 2))
    np.testing.assert_allclose(held.squared, [[30.5, 30.5]], rtol=1e-12)
    np.testing.assert_allclose(held.squared_mean_model, [[29.0, 33.0]], rtol=1e-12)
    figures = hold_out_figures(held)
    assert figures.rmse.value == pytest.approx(sqrt(61 / 6))
    assert figures.r_squared.value == pytest.approx(1 / 62)
    assert figures.r_squared.mc_error == 0.0
    assert (figures.predicted, figures.not_predicted, figures.no_fit) == (6, 0, 0)


def test_errors_on_rows_held_out_are_as_large_as_theory_says():
    """Over 100 tables: σ² (m + 1)(m - 2)/(m (m - p - 2)) for m normal rows and p slopes.

    Stein (1960); Narula (1974), the exact mean squared error of prediction where predictors are normal.
    Ten folds of 60 rows leave m = 54. The mean model errs by Var(y) (1 + 1/m).
    """
    rng, rows, m, p = np.random.default_rng(43), 60, 54, 6
    slopes = np.array([0.5, -0.5, 0.25, 0.0, 0.0, 0.0])
    plan = a_plan(names(p), steps=[])
    squared, mean_model = np.empty((2, 100))
    for table in range(100):
        frame = numbers(rng, rows, p)
        frame["y"] = frame[names(p)] @ slopes + 1.5 * frame["y"]
        world = hold_out_world(a_stage(plan, frame), table)
        figures = hold_out_figures(held_out_of(world, world.trials(0, 10)))
        squared[table] = figures.rmse.value**2
        mean_model[table] = figures.rmse_mean_model.value**2
        assert figures.r_squared.value == pytest.approx(1 - squared[table] / mean_model[table])
    error = 1.5**2 * (m + 1) * (m - 2) / (m * (m - p - 2))
    of_mean = (slopes @ slopes + 1.5**2) * (1 + 1 / m)
    near_mean(squared, error)
    near_mean(mean_model, of_mean)
    # The ratio of the means, by the delta method over tables.
    ratio = squared.mean() / mean_model.mean()
    residual = (squared - ratio * mean_model) / mean_model.mean()
    near(1 - ratio, 1 - error / of_mean, residual.std(ddof=1) / sqrt(100))


def test_repeats_of_folds_err_by_what_the_draw_of_folds_is_worth():
    """The Monte Carlo error of ten repeats is the spread of the figure over seeds, to a factor of two."""
    frame = numbers(np.random.default_rng(44), 40, 3)
    frame["y"] += frame["a1"]
    plan = a_plan(names(3), steps=[], rehearsal={"folds": 5})
    stage = a_stage(plan, frame)
    found, told = np.empty((2, 20))
    for seed in range(20):
        world = hold_out_world(stage, seed)
        figures = hold_out_figures(held_out_of(world, world.trials(0, 50)))
        found[seed], told[seed] = figures.r_squared.value, figures.r_squared.mc_error
    assert 0.5 < np.median(told) / found.std(ddof=1) < 2.0
    assert table_from_frame(plan, frame).n_rows == 40
