"""Invented plans, tables and bounds that the checks against something outside share."""

from __future__ import annotations

from collections.abc import Sequence
from math import sqrt
from typing import Any

import numpy as np
import pandas as pd

from beforehand.plan import Plan, plan_from_mapping
from beforehand.rehearsing.expected import ExpectedWorld, expected_world
from beforehand.rehearsing.stage import Stage
from beforehand.table import table_from_frame

# A figure further than so many of its Monte Carlo standard errors from what it should be is off; by
# chance alone that is one check in 16,000.
ERRORS = 4.0

# The rule that a predictor stays while its p is at or below 0.05 prevents nothing where alpha is 0.05 or
# more. But a plan that has a rule goes on where the F test of the whole model is not significant.
NO_GATE: dict[str, Any] = {"weak_model": {"with_theory": "try_selection"}}


def without_gate(name: str) -> dict[str, Any]:
    """What makes a plan select whatever the F test of the whole model says."""
    rule = {"predictor": name, "rule": {"unless_p_above": 0.05}, "because": "it prevents nothing"}
    return {"keep": [rule], **NO_GATE}


def a_plan(predictors: Sequence[str | dict[str, Any]], **changes: Any) -> Plan:
    """A plan of some predictors, by their names where they are numbers."""
    columns = [{"column": one} if isinstance(one, str) else one for one in predictors]
    return plan_from_mapping(
        {
            "language": 1, "title": "Invented", "question": "What goes with it?",
            "data": {"file": "invented.csv"}, "outcome": {"column": "y"},
            "predictors": columns, **changes,
        }
    )  # fmt: skip


def a_stage(plan: Plan, frame: pd.DataFrame) -> Stage:
    """A stage of a plan on a frame."""
    return Stage.of(plan, table_from_frame(plan, frame))


def an_expected_world(plan: Plan, frame: pd.DataFrame, seed: int) -> ExpectedWorld:
    """The expected world of a plan on a frame."""
    table = table_from_frame(plan, frame)
    return expected_world(plan, table, Stage.of(plan, table), seed)


def numbers(rng: np.random.Generator, rows: int, count: int) -> pd.DataFrame:
    """Independent normal predictors ``a1``, ``a2``, … and a normal outcome ``y``."""
    frame = pd.DataFrame(rng.normal(size=(rows, count)), columns=names(count))
    frame["y"] = rng.normal(size=rows)
    return frame


def names(count: int) -> list[str]:
    """Names of so many predictors."""
    return [f"a{place}" for place in range(1, count + 1)]


def near(value: float, truth: float, error: float) -> None:
    """Hold a figure to ``ERRORS`` of its Monte Carlo standard errors."""
    assert abs(value - truth) <= ERRORS * error, (value, truth, error)


def near_share(flags: np.ndarray, truth: float) -> None:
    """Hold a share of independent replicates to its binomial bound."""
    near(float(flags.mean()), truth, sqrt(truth * (1.0 - truth) / len(flags)))


def near_mean(values: np.ndarray, truth: float) -> None:
    """Hold a mean of independent replicates to its bound."""
    near(float(values.mean()), truth, float(values.std(ddof=1)) / sqrt(len(values)))
