"""Stability, bias and optimism from replicates on other samples of the same rows."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import scipy.stats

from beforehand.rehearsing.observed import Observed
from beforehand.rehearsing.summaries import resample_figures
from beforehand.rehearsing.summaries.intervals import interval
from beforehand.rehearsing.trials import Subjects, Trials

NAN = float("nan")


@pytest.fixture
def half(made) -> Trials:
    """Five halves: sun and shade twice, all but glass once, shade alone, and one that stopped."""
    return made(
        5,
        status=[0, 0, 0, 0, 3],
        adopted=[[1, 0, 1, 0], [1, 0, 1, 0], [1, 1, 1, 0], [0, 0, 1, 0], [0, 0, 0, 0]],
        estimates=[
            [1, NAN, 1, NAN, NAN],
            [2, NAN, 1, NAN, NAN],
            [-1, 3, 1, NAN, NAN],
            [NAN, NAN, 1, NAN, NAN],
            [NAN] * 5,
        ],
        rows=[50, 50, 49, 50, 0],
    )


def test_choices_on_halves_by_hand(half: Trials, drawn, subjects: Subjects) -> None:
    """Inclusion, models, pairs and signs of five halves; the one that stopped adopted nothing."""
    got = resample_figures(half, drawn(10), subjects, None, 0.05).half_samples
    assert got.rows == 50
    assert {name: one.value for name, one in got.inclusion.items()} == {
        "sun": 0.6,
        "wind": 0.2,
        "shade": 0.8,
        "glass": 0.0,
    }
    assert [(one.predictors, one.share.value) for one in got.models] == [
        (("sun", "shade"), 0.4),
        (("sun", "wind", "shade"), 0.2),
        (("shade",), 0.2),
        ((), 0.2),
    ]
    assert got.different_models == 4
    assert [(one.predictors, one.both.value, one.if_unrelated) for one in got.pairs] == [
        (("sun", "wind"), 0.2, pytest.approx(0.12)),
        (("sun", "glass"), 0.0, 0.0),
        (("wind", "glass"), 0.0, 0.0),
    ]
    signs = {name: one and one.value for name, one in got.sign_stability.items()}
    assert signs == {
        "sun": pytest.approx(2 / 3), "wind": 1.0, "shade": 1.0, "glass[thick]": None, "glass[old]": None,
    }  # fmt: skip
    assert got.statuses.stopped.value == 0.2
    assert resample_figures(half, half, subjects, None, 0.05, half_rows=52).half_samples.rows == 52


def test_many_predictors_have_their_most_telling_pairs_only() -> None:
    """Of 30 predictors the 50 most frequent pairs are told, and the 50 least expected."""
    names = tuple(f"x{n:02d}" for n in range(30))
    subjects = Subjects(names=names, held=(False,) * 30, columns=names, owners=tuple(range(30)))
    random = np.random.default_rng(12)
    adopted = random.random((400, 30)) < np.linspace(0.9, 0.05, 30)
    # Two rare ones never stand together, though each alone is no rarer than its neighbours.
    adopted[:, 29] = ~adopted[:, 28] & (random.random(400) < 0.6)
    from beforehand.rehearsing.trials import empty

    half = replace(empty(400, subjects), adopted=adopted, present=adopted)
    pairs = resample_figures(half, half, subjects, None, 0.05).half_samples.pairs
    assert 50 <= len(pairs) <= 100
    assert list(pairs) == sorted(pairs, key=lambda pair: -pair.both.value)
    together = adopted.T.astype(int) @ adopted
    best = np.max(together[np.triu_indices(30, 1)]) / 400
    assert pairs[0].both.value == best
    models = resample_figures(half, half, subjects, None, 0.05).half_samples
    assert len(models.models) == 10
    assert models.different_models == len(np.unique(adopted, axis=0))


def test_bias_and_spread_beside_the_full_model_by_hand(
    made, subjects: Subjects, observed: Observed, half: Trials
) -> None:
    """Sun is chosen in three of four replicates; where it is not, it counts as 0 in the spread only."""
    estimates = np.full((4, 5), NAN)
    estimates[:, 0] = [7.0, 8.0, 9.0, NAN]
    boot = made(4, rulings=2, adopted=[[1, 0, 1, 0]] * 3 + [[0, 0, 1, 0]], estimates=estimates)
    got = resample_figures(half, boot, subjects, observed, 0.05).bootstrap
    bias = got.relative_conditional_bias["sun"]
    assert bias is not None
    assert bias.value == pytest.approx(8.0 / 6.3 - 1)
    ratio = got.rmsd_ratio["sun"]
    assert ratio is not None
    assert ratio.value == pytest.approx(np.sqrt(np.mean([0.7**2, 1.7**2, 2.7**2, 6.3**2])) / 0.6)
    # Never chosen: no conditional bias, and the spread is the estimate itself.
    assert got.relative_conditional_bias["wind"] is None
    wind = got.rmsd_ratio["wind"]
    assert wind is not None
    assert wind.value == pytest.approx(0.1 / 0.2)
    # Not comparable in the full model.
    assert got.rmsd_ratio["glass[old]"] is None


def test_a_transformed_replicate_is_no_estimate_of_the_slope(
    made, subjects: Subjects, observed: Observed, half: Trials
) -> None:
    """Under a rung a coefficient is left out, not counted as 0."""
    estimates = np.full((3, 5), NAN)
    estimates[:2, 0] = 6.3
    boot = made(
        3,
        rulings=2,
        adopted=[[1, 0, 1, 0]] * 3,
        transformed=[[0] * 4] * 2 + [[1, 0, 0, 0]],
        estimates=estimates,
    )
    got = resample_figures(half, boot, subjects, observed, 0.05).bootstrap
    ratio = got.rmsd_ratio["sun"]
    assert ratio is not None
    assert ratio.value == 0.0
    assert got.intervals["sun"].percentile == (6.3, 6.3)


def test_optimism_is_the_mean_excess(made, subjects: Subjects, observed: Observed, half: Trials) -> None:
    """Differences 0.1, 0.2 and 0.3 over three replicates; one without a fit says nothing."""
    boot = made(
        4,
        rulings=2,
        r_squared=[0.8, 0.8, 0.8, NAN],
        elsewhere=[0.7, 0.6, 0.5, NAN],
        slope=[0.9, 1.0, 0.8, NAN],
    )
    got = resample_figures(half, boot, subjects, observed, 0.05).bootstrap
    assert got.r_squared.apparent == 0.76
    assert got.r_squared.optimism is not None
    assert got.r_squared.optimism.value == pytest.approx(0.2)
    assert got.r_squared.corrected is not None
    assert got.r_squared.corrected.value == pytest.approx(0.56)
    assert (
        got.r_squared.corrected.mc_error
        == got.r_squared.optimism.mc_error
        == pytest.approx(scipy.stats.sem([0.1, 0.2, 0.3]))
    )
    assert got.calibration_slope is not None
    assert got.calibration_slope.value == pytest.approx(0.9)
    alone = resample_figures(half, boot, subjects, None, 0.05).bootstrap
    assert (alone.r_squared.apparent, alone.r_squared.corrected, alone.rulings) == (None, None, ())


def test_rulings_that_fall_again_are_counted(drawn, subjects: Subjects, observed: Observed) -> None:
    """One line a ruling of the real run, in its order."""
    boot = drawn(500, rulings=2)
    got = resample_figures(boot, boot, subjects, observed, 0.05).bootstrap.rulings
    assert [(one.ruling, one.subject, one.ground) for one in got] == [
        ("R004", "wind", "p"),
        ("R005", "glass", "p"),
    ]
    assert got[0].same.value == boot.same_rulings[:, 0].mean()


# Symmetric about 0, so that the acceleration of the mean is 0 and scipy's BCa interval is the BC one.
SYMMETRIC = np.array([-4.0, -2.5, -1.0, -0.5, 0.5, 1.0, 2.5, 4.0])


def test_intervals_are_those_of_scipy() -> None:
    """Percentile and bias-corrected intervals of the very replicates that scipy drew."""
    for method in ("percentile", "BCa"):
        theirs = scipy.stats.bootstrap(
            (SYMMETRIC,), np.mean, n_resamples=1999, confidence_level=0.9, method=method, rng=13
        )
        ours = interval(theirs.bootstrap_distribution, float(SYMMETRIC.mean()), 0.10)
        ends = ours.percentile if method == "percentile" else ours.bias_corrected
        assert ends == pytest.approx(tuple(theirs.confidence_interval), rel=1e-9)


def test_a_biased_answer_moves_the_corrected_interval_only() -> None:
    """An answer at the 70th hundredth of its replicates: levels by Efron's formula, from scipy's normal."""
    values = np.random.default_rng(14).normal(size=4000)
    answered = float(np.quantile(values, 0.7))
    got = interval(values, answered, 0.05)
    below = (values < answered).mean()
    start = scipy.stats.norm.ppf(below)
    levels = scipy.stats.norm.cdf(2 * start + scipy.stats.norm.ppf([0.025, 0.975]))
    assert got.bias_corrected == pytest.approx(tuple(np.quantile(values, levels)), rel=1e-9)
    assert got.percentile == pytest.approx(tuple(np.quantile(values, [0.025, 0.975])), rel=1e-9)


def test_the_errors_of_corrected_ends_are_how_far_they_stray() -> None:
    """Over 1,000 sets of 1,000 replicates, within a quarter: share and quantile are taken as unrelated."""
    random = np.random.default_rng(15)
    made = [interval(random.normal(size=1000), 0.3, 0.10) for _ in range(1000)]
    ends = np.array([one.bias_corrected for one in made])
    told = np.array([one.bias_corrected_mc_error for one in made])
    assert np.sqrt((told**2).mean(axis=0)) == pytest.approx(ends.std(axis=0), rel=0.25)


def test_an_answer_outside_all_replicates_has_no_correction() -> None:
    """A share of 0 or 1 below the answer has no normal quantile."""
    values = np.array([1.0, 2.0, 3.0])
    assert interval(values, 9.0, 0.05).bias_corrected is None
    assert interval(values, NAN, 0.05).bias_corrected is None
    nothing = interval(np.array([NAN]), 1.0, 0.05)
    assert (nothing.percentile, nothing.bias_corrected) == (None, None)


def test_unselected_zeros_count_half_to_each_side() -> None:
    """An answer of 0 among zeros and as many above as below keeps the plain interval."""
    values = np.concatenate([np.zeros(60), np.linspace(1, 2, 20), -np.linspace(1, 2, 20)])
    got = interval(values, 0.0, 0.10)
    assert got.bias_corrected == pytest.approx(got.percentile)
