"""Errors of prediction on rows that the plan had not seen."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from beforehand.rehearsing.observed import HeldOut
from beforehand.rehearsing.summaries import hold_out_figures


def test_errors_by_hand(held_out: HeldOut) -> None:
    """200 and 800 of squared error over 49 rows; the fold without a fit is counted."""
    got = hold_out_figures(held_out)
    assert got.rmse is not None
    assert got.rmse.value == pytest.approx((200 / 49) ** 0.5)
    assert got.rmse_mean_model is not None
    assert got.rmse_mean_model.value == pytest.approx((800 / 49) ** 0.5)
    assert got.r_squared is not None
    assert got.r_squared.value == pytest.approx(0.75)
    assert (got.folds, got.repeats, got.groups) == (3, 2, None)
    assert (got.predicted, got.not_predicted, got.no_fit) == (49, 1, 1)
    # Of two repeats, half the distance of one from the other.
    first, second = (120 / 29) ** 0.5, (80 / 20) ** 0.5
    assert got.rmse.mc_error == pytest.approx(abs(first - second) / 2)


def test_groups_are_not_drawn(held_out: HeldOut) -> None:
    """Leaving out each group once has no Monte Carlo error."""
    one = {
        name: getattr(held_out, name)[:1]
        for name in ("squared", "squared_mean_model", "rows", "not_predicted", "no_fit")
    }
    got = hold_out_figures(replace(held_out, groups=("north", "south", "west"), **one))
    assert got.groups == ("north", "south", "west")
    assert got.rmse is not None
    assert got.rmse.mc_error == 0.0
    single = hold_out_figures(replace(held_out, **one))
    assert single.rmse is not None
    assert single.rmse.mc_error is None


def test_nothing_predicted_has_no_error(held_out: HeldOut) -> None:
    """Null, and not a division by nothing."""
    nothing = {name: np.zeros((2, 3)) for name in ("squared", "squared_mean_model")}
    got = hold_out_figures(replace(held_out, rows=np.zeros((2, 3), dtype=np.int64), **nothing))
    assert (got.rmse, got.rmse_mean_model, got.r_squared) == (None, None, None)
