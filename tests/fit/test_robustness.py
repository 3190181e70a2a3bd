"""Robustness values: the published example, the formula's own meaning, and its ends."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from beforehand.fit.robustness import partial_r_squared, robustness_of


def test_the_published_example_comes_out() -> None:
    """Cinelli & Hazlett (2020), table 1: t 4.18 on 783 df; 13.9 %, 7.6 % and 2.2 % (from memory)."""
    found = robustness_of(4.184, 783)
    assert (round(found.value, 3), round(found.value_at_alpha, 3)) == (0.139, 0.076)
    assert round(found.partial_r_squared, 3) == 0.022


@given(t=st.floats(-50, 50), df=st.integers(2, 10_000))
def test_a_cause_of_that_strength_takes_the_whole_estimate(t: float, df: int) -> None:
    """The bias of a cause with share r on both sides is r / √(1 - r) · se · √df (their eq. of the bias)."""
    r = robustness_of(t, df).value
    assert 0.0 <= r <= 1.0
    if r < 1.0:
        assert math.isclose(r / math.sqrt(1.0 - r) * math.sqrt(df), abs(t), rel_tol=1e-6, abs_tol=1e-12)


@given(t=st.floats(0, 20), df=st.integers(3, 2000), alpha=st.floats(0.001, 0.3))
def test_a_cause_at_the_limit_leaves_the_estimate_just_significant(t: float, df: int, alpha: float) -> None:
    """The t after the cause, on one degree of freedom less, is the critical t of scipy."""
    r = robustness_of(t, df, alpha=alpha).value_at_alpha
    critical = stats.t.ppf(1.0 - alpha / 2.0, df - 1)
    if r == 0.0:
        assert t * math.sqrt((df - 1) / df) <= critical * (1.0 + 1e-9)
        return
    # With share r on both sides: the estimate falls by the bias, the error by √(1 - r) / √(1 - r).
    after = (abs(t) / math.sqrt(df) - r / math.sqrt(1.0 - r)) * math.sqrt(df - 1)
    if abs(t) / math.sqrt(df) <= math.sqrt(df - 1) / critical:
        assert math.isclose(after, critical, rel_tol=1e-6)


def test_the_ends() -> None:
    """No estimate needs no cause; an exact one needs one that explains everything."""
    assert robustness_of(0.0, 5).value == 0.0
    assert robustness_of(1e300, 5).value == 1.0
    assert 0.999 < robustness_of(1e300, 5).value_at_alpha <= 1.0
    assert robustness_of(9.0, 1).value_at_alpha == 0.0
    assert partial_r_squared(1e-300, 5) == 0.0
    assert partial_r_squared(-2.0, 4) == 0.5


@pytest.mark.parametrize(("df", "alpha"), [(0, 0.05), (5, 0.0), (5, 1.0)])
def test_what_has_no_meaning_is_refused(df: int, alpha: float) -> None:
    """No degrees of freedom, no level."""
    with pytest.raises(ValueError, match="is"):
        robustness_of(2.0, df, alpha=alpha)
