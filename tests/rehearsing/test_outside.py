"""Rehearsals against what is known from elsewhere: nominal levels, noncentral distributions, papers.

Every bound is four Monte Carlo standard errors (`invented.ERRORS`) where nothing else is said.
"""

from __future__ import annotations

from dataclasses import replace
from math import sqrt

import numpy as np
import pandas as pd
import pytest
from scipy import stats
from tests.rehearsing.invented import (
    NO_GATE,
    a_plan,
    a_stage,
    an_expected_world,
    names,
    near,
    near_mean,
    near_share,
    numbers,
    without_gate,
)

from beforehand.rehearsing.expected import drawn_worlds, true_slopes
from beforehand.rehearsing.noise import noise_world
from beforehand.rehearsing.stage import setting_on
from beforehand.rehearsing.summaries import expected_figures, noise_figures
from beforehand.rehearsing.trial import run_trial

# -- Freedman (1983) ------------------------------------------------------------------------------


def test_screening_noise_as_freedman_did():
    """Two passes over 100 rows of 50 noise predictors, as in his note, with our draws and fits.

    Freedman (1983), A Note on Screening Regression Equations, American Statistician 37:152-155. The
    means are of our own re-simulation of it with numpy and statsmodels alone, 4,000 runs, standard
    errors beside them; R² and counts of the first pass are exact. His one published run lies inside.
    """
    runs, slots = 800, names(50)
    plan = a_plan(
        slots,
        steps=[],
        expects={"residual_sd": 1.0, "predictors": {name: {"mean": 0.0, "sd": 1.0} for name in slots}},
    )
    (world,) = drawn_worlds(plan, None, (100,), None, 19830501)
    figures = np.empty((runs, 9))
    for run in range(runs):
        setting = setting_on(plan, world.table(run))
        outcome = setting.source.raw("y")
        first = run_trial(setting, outcome)
        tests = first.final.fit.tests
        kept = tuple(name for name in slots if tests[name].p < 0.25)
        second = run_trial(replace(setting, state=replace(setting.state, working=kept)), outcome)
        assert first.quick
        assert second.quick
        assert second.final.model.names == kept
        p = np.array([test.p for test in tests.values()])
        again = np.array([test.p for test in second.final.fit.tests.values()])
        one, two = first.final.fit, second.final.fit
        figures[run] = (
            one.r_squared, one.f_p, len(kept), (p < 0.05).sum(),
            two.r_squared, two.f_p, (again < 0.25).sum(), (again < 0.05).sum(), two.f,
        )  # fmt: skip
    # In a run that keeps nothing there is no second F.
    error = np.nanstd(figures, axis=0, ddof=1) / sqrt(runs)
    means = np.nanmean(figures, axis=0)
    near(means[0], 50 / 99, error[0])
    near(means[1], 0.5, error[1])
    near(means[2], 12.5, error[2])
    near(means[3], 2.5, error[3])
    # The re-simulation has errors of its own: .0017, .07, .05, .015 and .0034.
    near(means[4], 0.3135, np.hypot(error[4], 0.0017))
    near(means[6], 10.94, np.hypot(error[6], 0.07))
    near(means[7], 5.68, np.hypot(error[7], 0.05))
    near(means[8], 3.326, np.hypot(error[8], 0.015))
    near(float((figures[:, 5] < 0.05).mean()), 0.9505, np.hypot(0.0034, sqrt(0.95 * 0.05 / runs)))
    # R² .50, P .53, 15 kept, 1 at 5 %; then R² .36, P 5e-4, 14 at 25 %, 6 at 5 %.
    published = np.array([0.50, 0.53, 15, 1, 0.36, 5e-4, 14, 6])
    low, high = np.nanquantile(figures[:, :8], [0.025, 0.975], axis=0)
    assert ((low <= published) & (published <= high)).all()


def test_noise_explains_as_much_as_shuffling_makes_it():
    """Over all orders of an outcome the mean of R² is exactly k/(n - 1), whatever the predictors are.

    The mean of y'Hy over permutations is the trace of H, k, times the variance of y (Freedman & Lane
    1983). The predictors here are skewed, heavy in the tails and correlated.
    """
    rng = np.random.default_rng(1)
    frame = numbers(rng, 60, 12)
    frame[names(12)] = np.exp(frame[names(12)]) + 2.0 * rng.standard_t(3, size=(60, 1))
    frame["y"] = rng.exponential(size=60)
    trials = noise_world(a_stage(a_plan(names(12), steps=[]), frame), 2).trials(0, 4000)
    near_mean(trials.r_squared, 12 / 59)


# -- nominal levels -------------------------------------------------------------------------------


@pytest.mark.parametrize("alpha", [0.01, 0.05, 0.157])
def test_a_plan_without_selection_errs_as_often_as_alpha(alpha):
    """In noise each predictor of a fixed model is significant with chance alpha."""
    frame = numbers(np.random.default_rng(11), 300, 5)
    stage = a_stage(a_plan(names(5), steps=[], alpha=alpha), frame)
    trials = noise_world(stage, 12).trials(0, 4000)
    for place in range(5):
        near_share(trials.significant[:, place], alpha)
    figures = noise_figures(trials, stage.subjects, alpha)
    near(figures.predictors_adopted.mean.value, 5 * alpha, figures.predictors_adopted.mean.mc_error)


def test_selection_none_errs_as_often_as_alpha():
    """The same through the selection step with method none, 12,000 replicates side by side.

    All five t tests of an orthogonal design are nearly independent: the chance of any is close to
    1 - 0.95^5; the shared error variance moves it by less than 0.001 at 294 degrees of freedom.
    """
    frame = numbers(np.random.default_rng(13), 300, 5)
    plan = a_plan(names(5), steps=["selection"], selection={"method": "none"}, **without_gate("a1"))
    orthogonal, _ = np.linalg.qr(np.column_stack([np.ones(300), frame[names(5)]]))
    frame[names(5)] = orthogonal[:, 1:]
    trials = noise_world(a_stage(plan, frame), 14).trials(0, 12_000)
    for place in range(5):
        near_share(trials.significant[:, place], 0.05)
    any_of_them = trials.significant.any(axis=1)
    truth = 1 - 0.95**5
    assert abs(any_of_them.mean() - truth) <= 4 * sqrt(truth * (1 - truth) / 12_000) + 0.001


@pytest.mark.parametrize("alpha", [0.01, 0.05])
def test_the_f_test_of_the_whole_model_errs_as_often_as_alpha(alpha):
    """Its p is uniform in noise, so that the gate lets a share alpha of noise through."""
    frame = numbers(np.random.default_rng(15), 300, 8)
    stage = a_stage(a_plan(names(8), steps=["selection"], alpha=alpha), frame)
    trials = noise_world(stage, 16).trials(0, 12_000)
    near_share(trials.full_p <= alpha, alpha)
    # Behind the gate a significant whole may yet lose every part: adopted is a little rarer than alpha.
    figures = noise_figures(trials, stage.subjects, alpha)
    assert figures.any_adopted.value <= alpha + 4 * sqrt(alpha * (1 - alpha) / 12_000)
    assert stats.kstest(trials.full_p, "uniform").pvalue > 1e-4


def test_an_effect_that_is_kept_leaves_the_others_their_level():
    """With a real predictor always kept, others that go with it err as often as alpha says.

    Freedman & Lane (1983), J. Business & Economic Statistics 1:292-298: residuals of the kept-only
    model are shuffled. The kept one keeps its effect: it is found as the noncentral t says.
    """
    rng = np.random.default_rng(17)
    frame = numbers(rng, 200, 4)
    for name in names(4)[1:]:
        frame[name] = 0.7 * frame["a1"] + 0.7 * frame[name]
    frame["y"] = 0.25 * frame["a1"] + rng.normal(size=200)
    plan = a_plan(
        names(4), steps=["selection"], selection={"method": "none"},
        keep=[{"predictor": "a1", "rule": "always", "because": "known"}], **NO_GATE,
    )  # fmt: skip
    stage = a_stage(plan, frame)
    world = noise_world(stage, 18)
    trials = world.trials(0, 12_000)
    for place in range(1, 4):
        near_share(trials.significant[:, place], 0.05)
    assert noise_figures(trials, stage.subjects, 0.05).held == ("a1",)
    # Replicates centre on the effect that the table shows, with the spread of its residuals.
    design = np.column_stack([np.ones(200), stage.setting.source.raw("a1")])
    slope = np.linalg.lstsq(design, stage.setting.source.raw("y"), rcond=None)[0][1]
    near_mean(trials.estimates[:, 0], slope)
    others = np.column_stack([np.ones(200), *(stage.setting.source.raw(name) for name in names(4)[1:])])
    about = design[:, 1] - others @ np.linalg.lstsq(others, design[:, 1], rcond=None)[0]
    delta = slope * np.linalg.norm(about) / np.std(world.shuffled)
    # Shuffled residuals are normal but nearly; at 195 degrees of freedom that moves power below 0.01.
    assert abs(trials.significant[:, 0].mean() - _power_of_t(delta, 195, 0.05)) <= 0.01 + 4 * sqrt(
        0.25 / 12_000
    )


# -- power ----------------------------------------------------------------------------------------


def _power_of_t(delta: float, df: int, alpha: float) -> float:
    """Power of a two-sided t test (Cohen 1988)."""
    limit = stats.t.isf(alpha / 2, df)
    return float(stats.nct.sf(limit, df, delta) + stats.nct.cdf(-limit, df, delta))


def _power_of_f(noncentrality: float, k: int, df: int, alpha: float) -> float:
    """Power of an F test (Cohen 1988)."""
    return float(stats.ncf.sf(stats.f.isf(alpha, k, df), k, df, noncentrality))


@pytest.mark.parametrize(
    ("slope", "rows", "alpha"), [(0.2, 40, 0.05), (0.5, 40, 0.05), (-0.9, 25, 0.01), (0.5, 40, 0.157)]
)
def test_power_of_one_predictor_is_that_of_the_noncentral_t(slope, rows, alpha):
    """On fixed rows: noncentrality slope × root of the sum of squares / residual sd."""
    frame = numbers(np.random.default_rng(21), rows, 1)
    expects = {"residual_sd": 1.3, "slopes": {"a1": slope}}
    plan = a_plan(["a1"], steps=["selection"], alpha=alpha, expects=expects)
    world = an_expected_world(plan, frame, 22)
    trials = world.trials(0, 12_000)
    x = frame["a1"].to_numpy()
    power = _power_of_t(slope * np.linalg.norm(x - x.mean()) / 1.3, rows - 2, alpha)
    figures = expected_figures([(rows, trials)], world.stage.subjects, true_slopes(plan), alpha)
    near_share(trials.significant[:, 0], power)
    near(figures.predictors["a1"].power.value, power, figures.predictors["a1"].power.mc_error)


def test_power_of_a_block_and_of_the_model_are_those_of_the_noncentral_f():
    """A category of four levels beside a number: each F test by its own noncentrality."""
    rng = np.random.default_rng(23)
    levels = ["low", "mid", "high", "top"]
    frame = numbers(rng, 90, 1)
    frame["room"] = rng.choice(levels, size=90)
    frame["a1"] += frame["room"] == "top"
    effects = {"mid": 0.5, "high": -0.4, "top": 0.3}
    room = {"column": "room", "kind": "category", "levels": levels}
    plan = a_plan(
        ["a1", room], steps=["selection"], selection={"method": "none"}, **without_gate("a1"),
        expects={"residual_sd": 1.0, "slopes": {"a1": 0.15, "room": effects}},
    )  # fmt: skip
    trials = an_expected_world(plan, frame, 24).trials(0, 12_000)
    block = np.column_stack([frame["room"] == level for level in levels[1:]]).astype(float)
    other = np.column_stack([np.ones(90), frame["a1"]])
    shift = block @ list(effects.values())
    alone = shift - other @ np.linalg.lstsq(other, shift, rcond=None)[0]
    near_share(trials.significant[:, 1], _power_of_f(alone @ alone, 3, 85, 0.05))
    mean = shift + 0.15 * frame["a1"].to_numpy()
    about = mean - mean.mean()
    near_share(trials.full_p <= 0.05, _power_of_f(about @ about, 4, 85, 0.05))


@pytest.mark.parametrize(
    ("alpha", "k", "f2", "rows", "printed"), [(0.05, 2, 0.35, 31, 30), (0.05, 3, 0.35, 36, 34)]
)
def test_sample_sizes_of_cohen(alpha, k, f2, rows, printed):
    """The fewest rows for power .80, by the model's F test in 40,000 replicates at each number.

    Cohen (1992), A power primer, Psychological Bulletin 112:155-159, table 2, noncentrality f² N. His
    entries were interpolated and are one and two rows too few in these cells; the exact ones are those
    at which scipy's noncentral F first reaches .80.
    """
    plan = a_plan(
        names(k), steps=["selection"], alpha=alpha,
        expects={"residual_sd": 1.0, "slopes": {"a1": sqrt(f2)}},
    )  # fmt: skip
    power = {}
    for count in (printed, rows):
        # Columns at right angles, of sum of squares N, make the noncentrality f² N exactly.
        columns = np.random.default_rng(count).normal(size=(count, k))
        orthogonal, _ = np.linalg.qr(np.column_stack([np.ones(count), columns]))
        frame = pd.DataFrame(orthogonal[:, 1:] * sqrt(count), columns=names(k)).assign(y=columns[:, 0])
        found = an_expected_world(plan, frame, 25).trials(0, 40_000).full_p <= alpha
        near_share(found, _power_of_f(f2 * count, k, count - k - 1, alpha))
        power[count] = float(found.mean())
    error = 4 * sqrt(0.8 * 0.2 / 40_000)
    assert power[rows] >= 0.80 - error
    assert power[printed] < 0.80 - error


def test_a_weak_study_exaggerates_as_gelman_and_carlin_say():
    """A true effect of 2 with a standard error of 8.1: power .06, wrong sign .24, exaggeration 9.5.

    Gelman & Carlin (2014), Beyond Power Calculations, Perspectives on Psychological Science 9:641-651,
    their first example; digits by the closed form of Lu, Qiu & Deng (2019) for a normal estimate, which
    a t of 998 degrees of freedom is but for less than a hundredth of each figure.
    """
    rows, ratio, z = 1000, 2 / 8.1, stats.norm.isf(0.025)
    up, down = stats.norm.sf(z - ratio), stats.norm.cdf(-z - ratio)
    power, wrong = up + down, down / (up + down)
    density = stats.norm.pdf(z - ratio) + stats.norm.pdf(z + ratio)
    exaggeration = (density + ratio * (up - down)) / (ratio * power)
    assert (round(power, 2), round(wrong, 2)) == (0.06, 0.24)
    assert exaggeration == pytest.approx(9.5, abs=0.1)
    frame = numbers(np.random.default_rng(26), rows, 1)
    x = frame["a1"].to_numpy()
    spread = 8.1 * float(np.linalg.norm(x - x.mean()))
    expects = {"residual_sd": spread, "slopes": {"a1": 2.0}}
    plan = a_plan(["a1"], steps=["selection"], selection={"method": "none"}, expects=expects)
    world = an_expected_world(plan, frame, 27)
    trials = world.trials(0, 12_000)
    figures = expected_figures([(rows, trials)], world.stage.subjects, true_slopes(plan), 0.05)
    one = figures.predictors["a1"]
    for found, truth in ((one.power, power), (one.wrong_sign, wrong), (one.exaggeration, exaggeration)):
        assert abs(found.value - truth) <= 4 * found.mc_error + 0.01 * truth


def test_intervals_without_selection_hold_the_truth_as_often_as_they_say():
    """Coverage of 95 and 99 % intervals, true slopes 0 or not, 6,000 replicates on fixed rows."""
    frame = numbers(np.random.default_rng(28), 30, 4)
    frame["a2"] += frame["a1"]
    for alpha in (0.05, 0.01):
        plan = a_plan(
            names(4), steps=[], alpha=alpha,
            expects={"residual_sd": 2.0, "slopes": {"a1": 0.3, "a2": -1.0}},
        )  # fmt: skip
        world = an_expected_world(plan, frame, 29)
        trials = world.trials(0, 6000)
        truth = true_slopes(plan)
        figures = expected_figures([(30, trials)], world.stage.subjects, truth, alpha)
        for name in ("a1", "a2"):
            coverage = figures.predictors[name].coverage
            assert figures.predictors[name].rests_on.coverage == 6000
            near(coverage.value, 1 - alpha, sqrt(alpha * (1 - alpha) / 6000))
        half = stats.t.isf(alpha / 2, trials.df) * trials.errors[:, 2]
        near_share(np.abs(trials.estimates[:, 2]) <= half, 1 - alpha)
