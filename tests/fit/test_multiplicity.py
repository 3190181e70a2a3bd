"""Adjusted p values against the trade's library and worked examples."""

from __future__ import annotations

import numpy as np
import pytest
from statsmodels.stats.multitest import multipletests

from beforehand.fit.multiplicity import benjamini_hochberg, holm


@pytest.mark.parametrize(("ours", "theirs"), [(holm, "holm"), (benjamini_hochberg, "fdr_bh")])
def test_as_statsmodels(ours: object, theirs: str) -> None:
    """Random families, ties and ends included, agree with statsmodels."""
    random = np.random.default_rng(21)
    for size in range(1, 40):
        p = random.choice([random.uniform(size=size), np.round(random.beta(0.3, 2, size), 2)])
        found = ours(p.tolist())  # type: ignore[operator]
        assert found == pytest.approx(multipletests(p, method=theirs)[1], rel=1e-14, abs=0)


def test_fifteen_tests() -> None:
    """Benjamini & Hochberg (1995), section 4: at .05 four of 15 are found, by Holm's three."""
    found = [0.0001, 0.0004, 0.0019, 0.0095, 0.0201, 0.0278, 0.0298, 0.0344, 0.0459]
    p = [*found, 0.3240, 0.4262, 0.5719, 0.6528, 0.7590, 1.0]
    assert sum(adjusted <= 0.05 for adjusted in benjamini_hochberg(p)) == 4
    assert sum(adjusted <= 0.05 for adjusted in holm(p)) == 3


def test_order_given_is_kept() -> None:
    """The adjusted values stand where their p stood."""
    assert holm([0.04, 0.01, 0.03]) == (0.06, 0.03, 0.06)
    assert benjamini_hochberg([0.04, 0.01, 0.03]) == (0.04, 0.03, 0.04)


def test_no_tests() -> None:
    """An empty family has no adjusted values."""
    assert holm([]) == () == benjamini_hochberg([])


@pytest.mark.parametrize("adjust", [holm, benjamini_hochberg])
def test_not_a_p_value(adjust: object) -> None:
    """What is no p value is refused, NaN included."""
    for wrong in (-0.1, 1.1, float("nan")):
        with pytest.raises(ValueError, match=r"^every p value must lie between 0 and 1$"):
            adjust([0.5, wrong])  # type: ignore[operator]
