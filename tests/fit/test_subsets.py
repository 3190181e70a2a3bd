"""Best subset: against every subset fitted one by one, and the cement data's published table."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
import statsmodels.api as sm

from beforehand.fit.subsets import MOST_PREDICTORS, best_subsets

# Woods, Steinour & Starke (1932); Draper & Smith, Applied Regression Analysis, appendix B.
X1 = [7, 1, 11, 11, 7, 11, 3, 1, 2, 21, 1, 11, 10]
X2 = [26, 29, 56, 31, 52, 55, 71, 31, 54, 47, 40, 66, 68]
X3 = [6, 15, 8, 8, 6, 9, 17, 22, 18, 4, 23, 9, 8]
X4 = [60, 52, 20, 47, 33, 22, 6, 44, 22, 26, 34, 12, 12]
Y = [78.5, 74.3, 104.3, 87.6, 95.9, 109.2, 102.7, 72.5, 93.1, 115.9, 83.8, 113.3, 109.4]


def cross_of(columns: np.ndarray, outcome: np.ndarray) -> np.ndarray:
    """Cross-products about the means."""
    joined = np.column_stack([columns, outcome])
    centred = joined - joined.mean(axis=0)
    return centred.T @ centred


def literal(columns, outcome, blocks, alpha, held=lambda place: False):
    """Every subset fitted by a general library."""
    best = None
    for size in range(1, len(blocks) + 1):
        for places in itertools.combinations(range(len(blocks)), size):
            chosen = [c for place in places for c in blocks[place]]
            fit = sm.OLS(outcome, sm.add_constant(columns[:, chosen])).fit()
            at, p = 1, []
            for place in places:
                restriction = np.eye(len(chosen) + 1)[at : at + len(blocks[place])]
                p.append(float(fit.f_test(restriction).pvalue))
                at += len(blocks[place])
            if any(value > alpha and not held(place) for place, value in zip(places, p, strict=True)):
                continue
            if best is None or fit.rsquared_adj > best[1]:
                best = (places, fit.rsquared_adj)
    return best


def test_cement_data_prefers_two_predictors_when_all_must_be_significant():
    """Of the cement data's subsets with p <= 0.05 throughout, {x1, x2} has the largest adjusted R²."""
    columns = np.column_stack([X1, X2, X3, X4]).astype(float)
    found = best_subsets(
        cross_of(columns, np.array(Y)), [(0,), (1,), (2,), (3,)], n=13, constant=1, alpha=0.05,
        lawful=lambda places: True, held=lambda place: False,
    )  # fmt: skip
    assert found[0].places == (0, 1)
    assert found[0].adjusted_r_squared == pytest.approx(0.97441405, abs=5e-9)


def test_cement_data_prefers_three_predictors_without_a_level():
    """With no level, {x1, x2, x4} has the largest adjusted R² of the published table (.97644727)."""
    columns = np.column_stack([X1, X2, X3, X4]).astype(float)
    found = best_subsets(
        cross_of(columns, np.array(Y)), [(0,), (1,), (2,), (3,)], n=13, constant=1, alpha=1.0,
        lawful=lambda places: True, held=lambda place: False,
    )  # fmt: skip
    assert found[0].places == (0, 1, 3)
    assert found[0].adjusted_r_squared == pytest.approx(0.97644727, abs=5e-9)


@pytest.mark.parametrize("seed", range(12))
def test_search_agrees_with_every_subset_fitted_one_by_one(seed):
    """Branch and bound cuts nothing that matters, blocks and held predictors included."""
    rng = np.random.default_rng(seed)
    columns = rng.normal(size=(60, 7)) + rng.normal(size=(60, 1)) * 0.7
    outcome = columns @ rng.choice([0.0, 0.0, 0.4, 0.8], size=7) + rng.normal(size=60)
    blocks = [(0,), (1, 2), (3,), (4,), (5,), (6,)]
    held = (lambda place: place == 3) if seed % 2 else (lambda place: False)
    found = best_subsets(
        cross_of(columns, outcome), blocks, n=60, constant=1, alpha=0.10,
        lawful=lambda places: not (seed % 2) or 3 in places, held=held,
    )  # fmt: skip
    expected = literal(columns, outcome, blocks, 0.10, held)
    if seed % 2:
        expected = None if expected is None or 3 not in expected[0] else expected
        if expected is None:
            return
    if expected is None:
        assert found == ()
    else:
        assert found[0].places == expected[0]
        assert found[0].adjusted_r_squared == pytest.approx(expected[1], rel=1e-9)


def test_too_many_predictors_are_refused():
    """The search states its bound instead of running for hours."""
    size = MOST_PREDICTORS + 1
    with pytest.raises(ValueError, match=f"{size} predictors are more than {MOST_PREDICTORS}"):
        best_subsets(
            np.eye(size + 1), [(i,) for i in range(size)], n=100, constant=1, alpha=0.05,
            lawful=lambda places: True, held=lambda place: False,
        )  # fmt: skip
