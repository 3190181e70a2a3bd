"""Normality checks against statsmodels, scipy and exact fractions."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from statsmodels.stats.stattools import jarque_bera as judged_jarque_bera

from beforehand.fit.normality import jarque_bera, shapiro_wilk

TINY = np.array([10, 34, -47, 12, -69, 60]) / 35.0


def test_jarque_bera_of_the_tiny_table() -> None:
    """Residuals of y = 1 3 2 5 4 9 on 0…5: exactly 159932731996/323277530625."""
    found = jarque_bera(TINY)
    assert found.statistic == pytest.approx(159932731996 / 323277530625, rel=1e-13)
    assert found.df == (2,)


def test_jarque_bera_as_statsmodels() -> None:
    """Random residuals, with a mean of their own as well, agree with statsmodels."""
    random = np.random.default_rng(61)
    for size in (3, 8, 50, 3000):
        for residual in (random.normal(size=size), random.gamma(1.0, size=size) + 5):
            statistic, p, _, _ = judged_jarque_bera(residual)
            found = jarque_bera(residual * 1e-170)
            assert found.statistic == pytest.approx(statistic, rel=1e-9)
            assert found.p == pytest.approx(p, rel=1e-9)


def test_shapiro_wilk_as_scipy() -> None:
    """W and p are those of scipy.stats, and a shuffle changes no bit of them."""
    random = np.random.default_rng(62)
    for size in (3, 8, 50, 5000):
        residual = random.gamma(4.0, size=size)
        judged = stats.shapiro(residual)
        found = shapiro_wilk(residual)
        assert found.statistic == pytest.approx(judged.statistic, rel=1e-9)
        assert found.p == pytest.approx(judged.pvalue, rel=1e-6)
        assert shapiro_wilk(random.permutation(residual)) == found


def test_jarque_bera_has_no_order() -> None:
    """A shuffle changes no bit of the statistic."""
    random = np.random.default_rng(63)
    residual = random.normal(size=40_000)
    assert jarque_bera(random.permutation(residual)) == jarque_bera(residual)


@pytest.mark.parametrize(
    ("residual", "exact", "jarque_bera_says", "shapiro_wilk_says"),
    [
        (TINY, True, "the fit is exact: its residuals are rounding only", None),
        (np.zeros(9), False, "the residuals are all equal", None),
        (np.array([1.0]), False, "the residuals are all equal", None),
        (np.array([1.0, -1.0]), False, "", "it needs at least 3 rows"),
        (np.arange(5001.0), False, "", "its p is known up to 5000 rows, and there are 5001"),
    ],
)
def test_not_applicable(
    residual: np.ndarray, exact: bool, jarque_bera_says: str, shapiro_wilk_says: str | None
) -> None:
    """Where a check has no meaning it gives the reason and no numbers."""
    first, second = jarque_bera(residual, exact=exact), shapiro_wilk(residual, exact=exact)
    assert first.not_applicable == jarque_bera_says
    assert second.not_applicable == (jarque_bera_says if shapiro_wilk_says is None else shapiro_wilk_says)
    assert (second.statistic, second.p, second.df) == (None, None, ())
