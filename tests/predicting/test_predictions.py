"""Predictions from a lock alone, held against statsmodels on the whole table."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy import stats

import beforehand
from beforehand.fit.ladder import RUNGS, smeared, undo
from beforehand.lock import Lock, lock_from_text, lock_text
from beforehand.lock.prediction import residual_groups
from beforehand.record.prediction import groups_of

# The lock holds ten digits.
CLOSE = {"rtol": 2e-8, "atol": 0.0}


def written(data: Mapping[str, Any]) -> dict[str, Any]:
    """A plan of invented kilns with some parts replaced."""
    plan: dict[str, Any] = {
        "language": 1, "title": "Kilns (invented)", "question": "What goes with the glow?",
        "data": {"file": "kilns.csv", "row_label": "kiln"},
        "outcome": {"column": "glow", "unit": "lx"},
        "predictors": [
            {"column": "heat", "unit": "°C"},
            {"column": "draught"},
            {"column": "clay", "kind": "category", "levels": ["red", "grey", "white"]},
        ],
        "steps": [],
    }  # fmt: skip
    return plan | dict(data)


def kilns(n: int = 120, seed: int = 7, *, positive: bool = False) -> pd.DataFrame:
    """Kilns with a large mean of heat, a skewed draught, three clays and uneven spread."""
    draw = np.random.default_rng(seed)
    heat = 2400.0 + 30.0 * draw.standard_normal(n)
    draught = np.exp(0.5 * draw.standard_normal(n))
    clay = draw.choice(["red", "grey", "white"], n)
    effect = np.select([clay == "red", clay == "grey"], [0.0, 4.0], -3.0)
    glow = 0.2 * (heat - 2400.0) + 3.0 * draught + effect + draught * draw.standard_normal(n)
    glow = np.exp(glow / 12.0) if positive else glow
    return pd.DataFrame(
        {
            "kiln": [f"k{place:05d}" for place in range(n)], "heat": heat, "draught": draught, "clay": clay,
            "shift": np.arange(n) % 9, "glow": glow,
        }
    )  # fmt: skip


def locked(plan: Mapping[str, Any], table: pd.DataFrame) -> Lock:
    """The lock of a run, by way of its text: what a file would give back."""
    lock = beforehand.run(beforehand.plan_from_mapping(written(plan)), table).lock
    return lock_from_text(lock_text(lock), "kilns.lock.yaml")


def design(table: pd.DataFrame) -> pd.DataFrame:
    """The columns of the full model for a library."""
    return pd.DataFrame(
        {
            "const": 1.0, "heat": table["heat"], "draught": table["draught"],
            "grey": (table["clay"] == "grey") * 1.0, "white": (table["clay"] == "white") * 1.0,
        }
    )  # fmt: skip


def numbers(found: beforehand.Predictions) -> np.ndarray[Any, Any]:
    """Prediction and ends of intervals, shape (n, 5)."""
    return np.array(
        [[c.prediction, c.mean_low, c.mean_high, c.case_low, c.case_high] for c in found.cases], dtype=float
    )


def judged(table: pd.DataFrame, new: pd.DataFrame, alpha: float = 0.05, **fit: Any) -> np.ndarray[Any, Any]:
    """The same by statsmodels."""
    model = sm.OLS(table["glow"], design(table)).fit(**fit)
    frame = model.get_prediction(design(new)).summary_frame(alpha=alpha)
    names = ["mean", "mean_ci_lower", "mean_ci_upper", "obs_ci_lower", "obs_ci_upper"]
    return frame[names].to_numpy()


@pytest.mark.parametrize("alpha", [0.05, 0.1])
def test_classical_intervals_are_those_of_statsmodels(alpha: float) -> None:
    """Mean and case intervals at the plan's level, at a large mean of a predictor."""
    table, new = kilns(), kilns(40, 8)
    found = beforehand.predict(locked({"alpha": alpha}, table), new)
    np.testing.assert_allclose(numbers(found), judged(table, new, alpha), **CLOSE)
    assert (found.label, found.outcome, found.unit, found.status) == ("kiln", "glow", "lx", "adopted")
    assert found.level == pytest.approx(1.0 - alpha)
    assert [case.label for case in found.cases] == new["kiln"].tolist()


def test_hc3_intervals_are_those_of_statsmodels() -> None:
    """Mean intervals by the sandwich; the case's adds the residual variance, as there."""
    table, new = kilns(), kilns(40, 8)
    found = beforehand.predict(locked({"errors": "hc3"}, table), new)
    np.testing.assert_allclose(
        numbers(found), judged(table, new, cov_type="HC3", use_t=True), rtol=2e-8, atol=5e-9
    )
    assert any("equal spread" in said for said in found.cautions)


def test_clustered_intervals_are_those_of_statsmodels() -> None:
    """On clusters less one degrees of freedom, with the usual factor."""
    table, new = kilns(), kilns(40, 8)
    found = beforehand.predict(locked({"errors": {"cluster_by": "shift"}}, table), new)
    keywords = {"groups": table["shift"].to_numpy(), "df_correction": True}
    model = sm.OLS(table["glow"], design(table)).fit(cov_type="cluster", cov_kwds=keywords, use_t=True)
    frame = model.get_prediction(design(new)).summary_frame()
    # Its own intervals take the residual degrees of freedom; ours those of the tests, 9 clusters less 1.
    half = stats.t.ppf(0.975, 8) * frame["mean_se"]
    np.testing.assert_allclose(numbers(found)[:, 1], frame["mean"] - half, rtol=2e-8, atol=5e-9)
    np.testing.assert_allclose(numbers(found)[:, 2], frame["mean"] + half, rtol=2e-8, atol=5e-9)


def test_without_an_intercept_nothing_is_centred() -> None:
    """Through the origin, one number."""
    draw = np.random.default_rng(3)
    heat = draw.uniform(5.0, 9.0, 30)
    table = pd.DataFrame({"heat": heat, "glow": 2.0 * heat + draw.standard_normal(30)})
    plan = {"data": {"file": "k.csv"}, "predictors": [{"column": "heat"}], "intercept": False}
    new = pd.DataFrame({"heat": [5.5, 8.0]})
    found = beforehand.predict(locked(plan, table), new)
    frame = sm.OLS(table["glow"], table[["heat"]]).fit().get_prediction(new).summary_frame()
    np.testing.assert_allclose(numbers(found), frame.drop(columns="mean_se").to_numpy(), **CLOSE)
    assert (found.label, [case.label for case in found.cases]) == ("row", ["1", "2"])


def test_products_and_rungs_are_evaluated() -> None:
    """A product of a number and a category, with what statsmodels makes of the same columns."""
    table, new = kilns(), kilns(25, 9)
    found = beforehand.predict(locked({"products": [["heat", "clay"]]}, table), new)

    def columns(frame: pd.DataFrame) -> pd.DataFrame:
        plain = design(frame)
        return plain.assign(hg=plain["heat"] * plain["grey"], hw=plain["heat"] * plain["white"])

    model = sm.OLS(table["glow"], columns(table)).fit()
    frame = model.get_prediction(columns(new)).summary_frame()
    # The judge is the less exact here: its columns are large and nearly dependent.
    np.testing.assert_allclose(numbers(found), frame.drop(columns="mean_se").to_numpy(), rtol=1e-6)


def logged(n: int, seed: int = 5) -> tuple[pd.DataFrame, Lock]:
    """A table whose outcome is fitted under its logarithm, and the lock."""
    draw = np.random.default_rng(seed + 1)
    table = kilns(n, seed)
    table["glow"] = np.exp(0.02 * (table["heat"] - 2400.0) + 0.5 * draw.standard_normal(n))
    check = {"alpha": 0.0001}
    plan = {
        "outcome": {"column": "glow", "transforms": ["log"]},
        "predictors": [{"column": "heat"}],
        "steps": ["transforms"],
        "transforms": {"try": []},
        "assumptions": {
            "curvature": "skip",
            "equal_spread": check | {"test": "breusch_pagan"},
            "normal_residuals": check | {"test": "jarque_bera"},
        },
    }
    lock = locked(plan, table)
    assert lock.answer is not None
    assert lock.answer.outcome.transform == "log"
    return table, lock


@pytest.mark.parametrize(("n", "tolerance"), [(150, 1e-9), (3000, 2e-5)])
def test_a_logged_outcome_is_predicted_by_smearing(n: int, tolerance: float) -> None:
    """Up to 201 rows the exact mean of the undone sums; beyond, within 2e-5 of it."""
    table, lock = logged(n)
    new = table.iloc[:20]
    found = numbers(beforehand.predict(lock, new))
    model = sm.OLS(np.log(table["glow"]), sm.add_constant(table[["heat"]])).fit()
    frame = model.get_prediction(sm.add_constant(new[["heat"]], has_constant="add")).summary_frame()
    factor = np.exp(model.resid).mean()
    np.testing.assert_allclose(found[:, 0], np.exp(frame["mean"]) * factor, rtol=max(tolerance, 1e-8))
    ends = np.exp(frame[["mean_ci_lower", "mean_ci_upper", "obs_ci_lower", "obs_ci_upper"]].to_numpy())
    np.testing.assert_allclose(found[:, 1:], ends, rtol=1e-7)


@pytest.mark.parametrize("rung", ["square", "cube", "square_root", "cube_root", "log", "box_cox"])
def test_groups_of_residuals_stand_for_all_of_them(rung: str) -> None:
    """Within 1e-4 of the exact smearing mean for 50,000 residuals with heavy tails."""
    exponent = 0.4 if rung == "box_cox" else 1.0
    residuals = np.random.default_rng(2).standard_t(5, 50_000) * 0.2
    at = float(RUNGS[rung].forward(np.array([30.0]), exponent)[0])
    groups = np.array(groups_of(residuals))
    assert len(groups) == 201
    sizes = np.diff(residual_groups(len(residuals)), prepend=0)
    assert sizes.sum() == len(residuals)
    exact = smeared(rung, at, residuals, exponent).mean
    approximate = float(sizes @ undo(rung, at + groups, exponent)) / len(residuals)
    assert exact is not None
    assert math.isclose(approximate, exact, rel_tol=1e-4)


def test_a_case_outside_carries_every_reason() -> None:
    """Beyond the range, an unseen level, a missing cell, and too far out altogether."""
    table = kilns()
    plan = {"eligibility": [{"column": "shift", "at_most": 7, "because": "The ninth shift is a trial."}]}
    new = pd.DataFrame(
        {
            "kiln": ["a", "b", "c", "d", "e"], "heat": [2400.0, 9000.0, 2400.0, None, 2400.0],
            "draught": [1.0, 1.0, 1.0, 1.0, 1.0], "clay": ["red", "grey", "whit", "red", "red"],
            "shift": [1, 1, 1, 1, 8],
        }
    )  # fmt: skip
    found = beforehand.predict(locked(plan, table), new)
    highest = table.loc[table["shift"] <= 7, "heat"].max()
    near, far, unknown, missing, other = found.cases
    assert near.outside == ()
    assert far.outside[0] == f"heat 9000 is above the largest seen, {highest:.4g}"
    assert far.outside[1].startswith("leverage ")
    assert " is above the largest in the fit, 0.1" in far.outside[1]
    assert far.prediction is not None
    assert unknown.outside == ("clay 'whit' was not seen in the fit (nearest: 'white')",)
    assert missing.outside == ("heat is missing",)
    assert other.outside == ("not in the population: it does not meet 'shift at most 7'",)
    assert (unknown.prediction, missing.case_high) == (None, None)
    assert other.prediction is not None
    assert (found.outside, found.unpredicted) == (4, 2)


def test_rows_of_the_fit_are_never_outside() -> None:
    """The ends of what was seen, and the largest leverage, belong to it."""
    table = kilns(60)
    found = beforehand.predict(locked({}, table), table)
    assert found.outside == 0


def test_missing_cells_are_filled_as_the_run_filled_them() -> None:
    """By the learned median and the declared level; a filled case says which."""
    table = kilns()
    table.loc[[3, 9], "heat"] = np.nan
    plan = {
        "steps": ["missing_data"],
        "missing_data": {"fill": {"heat": "median", "clay": {"value": "grey"}}},
    }
    new = pd.DataFrame({"kiln": ["a"], "heat": [None], "draught": [1.0], "clay": ["NA"]})
    case = beforehand.predict(locked(plan, table), new).cases[0]
    same = new.assign(heat=[table["heat"].median()], clay=["grey"])
    assert case.filled == ("heat", "clay")
    assert case.outside == ()
    assert case.prediction == pytest.approx(
        beforehand.predict(locked(plan, table), same).cases[0].prediction, rel=1e-7
    )


def test_derived_columns_are_computed_and_ranges_kept() -> None:
    """A new case has the columns of the formula; an impossible value gives no prediction."""
    table = kilns()
    plan = {
        "derive": [{"column": "warm", "from": "heat - 273"}],
        "predictors": [{"column": "warm"}, {"column": "draught", "range": [0, 100]}],
    }
    new = pd.DataFrame({"kiln": ["a", "b"], "heat": [2400.0, 2400.0], "draught": [1.0, -4.0]})
    near, impossible = beforehand.predict(locked(plan, table), new).cases
    model = sm.OLS(table["glow"], sm.add_constant(table[["heat", "draught"]])).fit()
    expected = model.predict(sm.add_constant(new[["heat", "draught"]], has_constant="add"))
    assert near.prediction == pytest.approx(expected[0], rel=1e-8)
    assert impossible.outside == ("draught -4 is outside its declared range [0, 100]",)
    assert impossible.prediction is None


def test_levels_that_never_met_are_told() -> None:
    """A product of two categories has no column for a pair that no row has."""
    table = kilns(200)
    table["glaze"] = np.where(np.arange(200) % 2, "matt", "gloss")
    table.loc[table["clay"] == "white", "glaze"] = "gloss"
    plan = {
        "predictors": [
            {"column": "clay", "kind": "category", "levels": ["red", "grey", "white"]},
            {"column": "glaze", "kind": "category", "levels": ["gloss", "matt"]},
        ],
        "products": [["clay", "glaze"]],
    }
    new = pd.DataFrame({"kiln": ["a", "b"], "clay": ["white", "grey"], "glaze": ["matt", "matt"]})
    unmet, met = beforehand.predict(locked(plan, table), new).cases
    assert unmet.outside == ("clay 'white' with glaze 'matt' was not seen in the fit",)
    assert met.outside == ()
    assert met.prediction == pytest.approx(
        table.loc[(table["clay"] == "grey") & (table["glaze"] == "matt"), "glow"].mean(), rel=1e-8
    )


def test_a_case_without_a_logarithm_has_no_prediction() -> None:
    """What a rung cannot take is told, and the others stand."""
    table = kilns(200)
    table["glow"] = 5.0 * np.log(table["draught"]) + np.random.default_rng(1).standard_normal(200) * 0.1
    plan = {
        "predictors": [{"column": "draught"}], "steps": ["transforms"], "transforms": {"try": ["log"]},
        "assumptions": {"curvature": {"alpha": 0.01}},
    }  # fmt: skip
    lock = locked(plan, table)
    assert lock.predictors["draught"].transform == "log"
    found = beforehand.predict(lock, pd.DataFrame({"kiln": ["a", "b"], "draught": [0.0, 1.0]}))
    assert "draught 0 has no logarithm" in found.cases[0].outside
    assert found.cases[0].prediction is None
    assert found.cases[1].prediction == pytest.approx(0.0, abs=0.1)


def noise(n: int = 40, seed: int = 11) -> pd.DataFrame:
    """An outcome that goes with nothing."""
    draw = np.random.default_rng(seed)
    return pd.DataFrame({"heat": draw.standard_normal(n), "glow": draw.standard_normal(n) + 10.0})


@pytest.mark.parametrize("status", ["mean_only", "inconclusive"])
def test_where_no_equation_is_adopted_the_mean_is_predicted(status: str) -> None:
    """With its intervals, whatever the predictors; nothing but labels and eligibility is read."""
    table = noise()
    plan = {"data": {"file": "k.csv"}, "predictors": [{"column": "heat"}], "steps": ["selection"]}
    if status == "inconclusive":
        plan |= {
            "keep": [{"predictor": "heat", "rule": "always", "because": "Theory."}],
            "weak_model": {"with_theory": "report"},
        }
    lock = locked(plan, table)
    assert lock.status == status
    found = beforehand.predict(lock, pd.DataFrame({"anything": [1, 2]}))
    frame = sm.OLS(table["glow"], np.ones(40)).fit().get_prediction(np.ones((2, 1))).summary_frame()
    np.testing.assert_allclose(numbers(found), frame.drop(columns="mean_se").to_numpy(), **CLOSE)
    assert found.equation is None
    assert "the mean is predicted for every case" in found.cautions[0]


def test_the_record_does_not_hang_on_the_order_of_rows() -> None:
    """Shuffled rows give the same part of the lock, with errors that need the rows too."""
    table = kilns(90, positive=True)
    plan = {"errors": "hc3", "products": [["heat", "clay"]]}
    shuffled = table.sample(frac=1.0, random_state=4)
    one, other = locked(plan, table), locked(plan, shuffled)
    assert one.prediction is not None
    assert one.prediction == other.prediction
