"""Invented tables and their locks, from which pictures are made."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest

from beforehand import plan_from_mapping, run
from beforehand.lock import Lock


def a_table(n: int = 150, *, seed: int = 5) -> pd.DataFrame:
    """Three numbers and a category; one number says nothing, one row is far out."""
    rng = np.random.default_rng(seed)
    table = pd.DataFrame(
        {
            "heat": rng.normal(20.0, 4.0, n).round(3),
            "load": rng.gamma(2.0, 10.0, n).round(3),
            "idle": rng.normal(0.0, 1.0, n).round(3),
            "kind": rng.choice(["old", "new"], n),
        }
    )
    noise = rng.normal(0.0, 3.0, n)
    table["use"] = (
        5.0 + 1.5 * table["heat"] + 0.2 * table["load"] + 4.0 * (table["kind"] == "new") + noise
    ).round(4)
    return table


def a_lock(table: pd.DataFrame, outcome: str = "use", leave_out: tuple[str, ...] = (), **blocks: Any) -> Lock:
    """The lock of a plan with all other columns as predictors."""
    predictors = [
        {"column": name, "kind": "category", "levels": sorted(set(table[name]))}
        if table[name].dtype == object or str(table[name].dtype).startswith("str")
        else {"column": name}
        for name in table.columns
        if name != outcome and name not in leave_out
    ]
    plan = plan_from_mapping(
        {
            "language": 1, "title": "Invented", "question": "What drives it?",
            "data": {"file": "invented.csv"}, "outcome": {"column": outcome}, "predictors": predictors,
            **blocks,
        }
    )  # fmt: skip
    return run(plan, table).lock


@pytest.fixture(scope="session")
def table() -> pd.DataFrame:
    """The invented table."""
    return a_table()


@pytest.fixture(scope="session")
def lock(table: pd.DataFrame) -> Lock:
    """Its lock."""
    return a_lock(table)


@pytest.fixture(scope="session")
def make_table() -> Callable[..., pd.DataFrame]:
    """What makes such tables."""
    return a_table


@pytest.fixture(scope="session")
def make_lock() -> Callable[..., Lock]:
    """What makes their locks."""
    return a_lock
