"""Power and sample size against exact figures and other routes to the noncentral F."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from beforehand.fit.power import MOST_ROWS, detectable_f2, needed_n, power_of

# Exact smallest n (all noncentral F) for power .80; Cohen (1992), Psychological Bulletin 112:155-159,
# table 2, printed interpolated figures up to 4 off: the second of each pair.
COHEN = {
    0.05: {
        0.02: [(485, 481), (550, 547), (602, 599), (647, 645), (688, 686), (725, 726), (759, 757)],
        0.15: [(68, 67), (77, 76), (85, 84), (92, 91), (98, 97), (103, 102), (109, 107)],
        0.35: [(31, 30), (36, 34), (40, 38), (43, 42), (46, 45), (49, 48), (52, 50)],
    },
    0.01: {
        0.02: [(699, 698), (779, 780), (845, 841), (902, 901), (953, 953), (999, 998), (1042, 1039)],
        0.15: [(98, 97), (109, 108), (119, 118), (127, 126), (135, 134), (142, 141), (148, 147)],
        0.35: [(45, 45), (51, 50), (55, 55), (59, 59), (63, 63), (67, 66), (70, 69)],
    },
}


@pytest.mark.parametrize(
    ("alpha", "effect", "k", "exact", "printed"),
    [
        (alpha, effect, k, exact, printed)
        for alpha, by_effect in COHEN.items()
        for effect, cells in by_effect.items()
        for k, (exact, printed) in enumerate(cells, start=2)
    ],
)
def test_cohen_table(alpha: float, effect: float, k: int, exact: int, printed: int) -> None:
    """The needed n for R² is exact, and within 4 of the printed table of Cohen (1992)."""
    found = needed_n(partial_f2=effect, p=k + 1, df=k, alpha=alpha)
    assert found == exact
    assert abs(exact - printed) <= 4


def test_power_at_a_printed_size() -> None:
    """At Cohen's printed 34 rows for three predictors and a large effect the power is 0.7808."""
    assert power_of(partial_f2=0.35, n=34, p=4, df=3) == pytest.approx(0.7808, abs=5e-5)


def test_needed_n_is_the_smallest() -> None:
    """One row fewer than the needed n has less than the asked power, for many random cases."""
    random = np.random.default_rng(11)
    for _ in range(300):
        effect = float(10 ** random.uniform(-5, 1))
        df = int(random.integers(1, 10))
        p = df + int(random.integers(1, 20))
        alpha = float(random.choice([0.1, 0.05, 0.01, 1e-6]))
        power = float(random.uniform(0.5, 0.99))
        found = needed_n(partial_f2=effect, p=p, df=df, alpha=alpha, power=power)
        assert found is not None
        reached = power_of(partial_f2=effect, n=found, p=p, df=df, alpha=alpha)
        before = power_of(partial_f2=effect, n=found - 1, p=p, df=df, alpha=alpha)
        assert reached is not None
        assert reached >= power
        assert before is None or before < power


def test_power_by_the_other_routine() -> None:
    """Power agrees with scipy.stats' noncentral F to ten digits over many random cases."""
    random = np.random.default_rng(12)
    for _ in range(300):
        df, residual = int(random.integers(1, 12)), int(random.integers(1, 5000))
        p = df + int(random.integers(0, 9))
        n, alpha = p + residual, float(random.choice([0.2, 0.05, 0.01, 0.001]))
        effect = float(random.uniform(0, 40) / n)
        judged = stats.ncf.sf(stats.f.isf(alpha, df, residual), df, residual, effect * n)
        assert power_of(partial_f2=effect, n=n, p=p, df=df, alpha=alpha) == pytest.approx(judged, rel=1e-9)


def test_power_by_a_sum_of_beta_functions() -> None:
    """Power agrees with the Poisson mixture of central distributions (its definition)."""
    for df, residual, noncentrality in [(1, 7, 3.0), (3, 40, 11.0), (8, 300, 0.5), (2, 2, 25.0)]:
        critical = stats.f.isf(0.05, df, residual)
        share = df * critical / (df * critical + residual)
        count = np.arange(200)
        weights = stats.poisson.pmf(count, noncentrality / 2)
        missed = float(np.sum(weights * stats.beta.cdf(share, df / 2 + count, residual / 2)))
        n = residual + df + 1
        found = power_of(partial_f2=noncentrality / n, n=n, p=df + 1, df=df)
        assert found == pytest.approx(1 - missed, rel=1e-10)


def test_detectable_effect_is_the_inverse_of_power() -> None:
    """The detectable effect has exactly the asked power."""
    random = np.random.default_rng(13)
    for _ in range(100):
        df, n = int(random.integers(1, 8)), int(random.integers(20, 100_000))
        effect = detectable_f2(n=n, p=df + 3, df=df, alpha=0.05, power=0.8)
        assert effect is not None
        assert power_of(partial_f2=effect, n=n, p=df + 3, df=df) == pytest.approx(0.8, abs=1e-10)


def test_smooth_where_the_routine_changes() -> None:
    """Power of tiny effects in huge samples joins that of the noncentral F without a step."""
    below = power_of(partial_f2=8 / (10**7 - 1), n=10**7 - 1, p=4)
    above = power_of(partial_f2=8 / (10**7 + 5), n=10**7 + 5, p=4)
    assert above == pytest.approx(below, rel=1e-6)


def test_effects_that_no_sample_finds() -> None:
    """No effect, and one that needs more rows than anyone has, give no sample size."""
    assert needed_n(partial_f2=0.0, p=3) is None
    assert needed_n(partial_f2=1e-12, p=3) is None
    largest = needed_n(partial_f2=8e-9, p=3)
    assert largest is not None
    assert largest < MOST_ROWS


def test_huge_effects_need_one_residual_degree_of_freedom_or_so() -> None:
    """An almost exact relation is found with the smallest table that has a test at all."""
    assert needed_n(partial_f2=1e9, p=5) == 6
    assert power_of(partial_f2=1e9, n=6, p=5) == pytest.approx(1.0)


def test_no_residual_degree_of_freedom() -> None:
    """Without residual degrees of freedom there is neither power nor a detectable effect."""
    assert power_of(partial_f2=1.0, n=3, p=3) is None
    assert detectable_f2(n=3, p=3) is None


def test_no_effect_is_found_at_the_level() -> None:
    """The power against no effect is alpha."""
    assert power_of(partial_f2=0.0, n=50, p=3, alpha=0.07) == 0.07


@pytest.mark.parametrize(
    ("call", "says"),
    [
        (lambda: power_of(partial_f2=0.1, n=9, p=2, df=0), "a test needs at least one coefficient"),
        (lambda: power_of(partial_f2=-0.1, n=9, p=2), "an effect size cannot be negative"),
        (lambda: needed_n(partial_f2=0.1, p=2, alpha=1.0), "alpha must lie between 0 and 1"),
        (lambda: needed_n(partial_f2=0.1, p=2, power=1.0), "power must lie between 0 and 1"),
        (lambda: detectable_f2(n=9, p=2, power=0.01), "power must lie between alpha and 1"),
    ],
)
def test_questions_without_meaning(call: object, says: str) -> None:
    """What is no test, no level or no power is refused."""
    with pytest.raises(ValueError, match=f"^{says}$"):
        call()  # type: ignore[operator]
