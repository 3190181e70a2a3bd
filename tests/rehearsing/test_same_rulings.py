"""The rules that rehearse are the rules that run: quick, side by side or recorded, the same rulings."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, Phase, given, seed, settings
from hypothesis import strategies as st
from tests.test_random_plans import plans as plans_with_trouble
from tests.test_random_plans import tables as tables_with_trouble

from beforehand.faults import BeforehandError
from beforehand.fit.doubles import NotQuick
from beforehand.plan import plan_from_mapping
from beforehand.rehearsing.stage import Stage
from beforehand.rehearsing.trial import run_trial
from beforehand.rehearsing.trials import Trials
from beforehand.running import run_steps
from beforehand.table import table_from_frame

NAMES = ("a", "b", "c", "d", "e", "f")
RUNGS = ("square", "cube", "square_root", "cube_root", "log", "reciprocal", "box_cox")
STEPS = ("missing_data", "transforms", "collinearity", "influence", "selection", "final_checks")

SPREAD = ("breusch_pagan", "white")
NORMAL = ("jarque_bera", "shapiro_wilk")
METHODS = ("backward", "backward", "none", "backward_aic", "backward_bic", "best_subset")
ERRORS = (
    "classical", "classical", "hc3", "hc1", {"cluster_by": "site"}, {"autocorrelation_lags": 2},
)  # fmt: skip

CALM = settings(
    max_examples=300,
    deadline=None,
    database=None,
    # A plan that is ruled on otherwise is shown as drawn; making it smaller takes minutes.
    phases=[Phase.generate],
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large],
)


@st.composite
def tables(draw) -> pd.DataFrame:
    """A table as analysts have them: correlated, bent, with outliers, gaps and categories."""
    n = draw(st.integers(25, 160))
    rng = np.random.default_rng(draw(st.integers(0, 100_000)))
    shared = rng.normal(size=n)
    frame = pd.DataFrame(
        {name: rng.normal(size=n) + draw(st.sampled_from([0.0, 0.8, 3.0])) * shared for name in NAMES}
    )
    for name in NAMES:
        match draw(st.sampled_from(["plain", "plain", "positive", "round", "two", "shifted"])):
            case "positive":
                frame[name] = np.exp(frame[name] / 2)
            case "round":
                frame[name] = frame[name].round(0)
            case "two":
                frame[name] = (frame[name] > frame[name].median()).astype(float)
            case "shifted":
                frame[name] = frame[name] * 5 + 40
            case _:
                pass
    frame["g"] = rng.choice(["u", "v", "w"], size=n)
    frame["h"] = rng.choice(["p", "q"], size=n)
    frame["site"] = rng.choice(list("klmnop"), size=n)
    frame["t"] = np.arange(n)
    effect = draw(st.sampled_from([0.0, 0.2, 1.0]))
    y = effect * (frame["a"] - 0.5 * frame["b"] + (frame["g"] == "v")) + rng.normal(size=n)
    match draw(st.sampled_from(["plain", "bent", "fanning", "heavy", "positive"])):
        case "bent":
            y = y + 0.3 * frame["c"] ** 2
        case "fanning":
            y = y + rng.normal(size=n) * np.abs(frame["a"])
        case "heavy":
            y = y + rng.standard_t(2, size=n)
        case "positive":
            y = np.exp(y / 2)
        case _:
            pass
    frame["y"] = y
    for name in (*NAMES[:3], "g", "y"):
        if draw(st.integers(0, 4)) == 0:
            gone = rng.random(n) < draw(st.sampled_from([0.03, 0.2]))
            frame[name] = frame[name].astype(object).where(~gone, None)
    return frame


@st.composite
def plans(draw) -> dict:
    """A plan in which every rule of every step can be met."""
    names = draw(st.lists(st.sampled_from(NAMES), min_size=2, unique=True))
    predictors: list[dict] = [{"column": name} for name in names]
    for name, levels in (("g", ["u", "v", "w"]), ("h", ["p", "q"])):
        if draw(st.booleans()):
            predictors.append({"column": name, "kind": "category", "levels": levels})
    keep: list[dict] = []
    match draw(st.sampled_from(["none", "none", "always", "bound", "group"])):
        case "always":
            keep = [{"predictor": names[0], "rule": "always", "because": "known"}]
        case "bound":
            keep = [{"predictor": names[0], "rule": {"unless_p_above": 0.4}, "because": "known"}]
        case "group":
            keep = [{"at_least_one_of": names[:2], "because": "known"}]
        case _:
            pass
    products = [[names[0], names[1]]] if draw(st.integers(0, 3)) == 0 else []
    if products and draw(st.booleans()) and any(p["column"] == "g" for p in predictors):
        products = [[names[0], "g"]]
    steps = [step for step in STEPS if draw(st.integers(0, 4))]
    some = st.lists(st.sampled_from(RUNGS), max_size=3, unique=True)
    plan: dict = {
        "language": 1, "title": "Drawn", "question": "Does it stand?",
        "data": {"file": "drawn.csv"},
        "outcome": {"column": "y", "transforms": draw(some) if draw(st.integers(0, 3)) == 0 else []},
        "predictors": predictors, "products": products, "keep": keep, "steps": steps,
        "alpha": draw(st.sampled_from([0.01, 0.05, 0.157])),
        "missing_data": {"remove_predictor_above": draw(st.sampled_from(["10%", "60%"]))},
        "assumptions": {
            "curvature": {"alpha": draw(st.sampled_from([0.01, 0.2]))},
            "equal_spread": {"test": draw(st.sampled_from(SPREAD)), "alpha": 0.1},
            "normal_residuals": {"test": draw(st.sampled_from(NORMAL)), "alpha": 0.05},
            "independence": {"test": "breusch_godfrey", "lags": 2, "alpha": 0.1, "in_order_of": "t"},
        },
        "transforms": {
            "when": draw(st.sampled_from([["curvature"], ["spread"], ["curvature", "spread"]])),
            "try": draw(some) or ["square"],
            "if_none_works": draw(st.sampled_from(["remove_predictor", "keep_as_is"])),
        },
        "collinearity": {
            "examine_when": {"vif_above": draw(st.sampled_from([1.5, 5])), "correlation_above": 0.6},
            "when_one_significant": draw(st.sampled_from(["remove_other", "leave_to_selection"])),
            "when_both_significant": draw(st.sampled_from(["compare", "keep_both", "remove_weaker"])),
        },
        "influence": {
            "remove_when": draw(
                st.sampled_from(
                    [
                        {"coefficient": 0.6},
                        {"coefficient": 1.0, "significance_changes": True},
                        {"r_squared": 0.03, "sign_changes": True},
                    ]
                )
            ),
            "at_most": draw(st.sampled_from(["0%", "4%"])),
        },
        "selection": {
            "method": draw(st.sampled_from(METHODS))
        },
        "weak_model": {"with_theory": draw(st.sampled_from(["report", "try_selection"]))},
        "errors": draw(st.sampled_from(ERRORS)),
    }  # fmt: skip
    if draw(st.booleans()):
        plan["missing_data"]["fill"] = {names[0]: draw(st.sampled_from(["mean", "median", "regression"]))}
    return plan


def told(rulings) -> list[tuple[str, str, str, str]]:
    """What was ruled, of whom, on which ground, in order."""
    return [(ruling.step, ruling.clause, ruling.subject, ruling.ground) for ruling in rulings]


def numbers_agree(one, other) -> bool:
    """The evidence of two rulings to the digits that doubles have."""
    for name, value in one.evidence.items():
        if name in ("significance_changes", "sign_changes") and name not in other.evidence:
            # Not taken where the plan does not rule by it.
            continue
        again = other.evidence.get(name)
        if isinstance(value, float) and not isinstance(value, bool):
            if again is None or abs(value - again) > 1e-6 * abs(value) + 1e-7:
                return False
        elif value != again:
            return False
    return True


def compared(mapping: dict, frame: pd.DataFrame, count: Counter) -> None:
    """One plan on one table, on the recording bench and on the quick one."""
    try:
        plan = plan_from_mapping(mapping)
        table = table_from_frame(plan, frame)
    except BeforehandError:
        count["no plan or table"] += 1
        return
    stage = Stage.of(plan, table)
    outcome = stage.setting.source.raw("y")
    try:
        recorded = run_steps(plan, table)
    except BeforehandError as error:
        with pytest.raises(type(error)):
            run_trial(stage.setting, outcome)
        count["fault in both"] += 1
        return
    ended = run_trial(stage.setting, outcome)
    count["quick" if ended.quick else "handed on"] += 1
    rulings = (*stage.setting.made, *ended.rulings)
    assert told(rulings) == told(recorded.rulings)
    assert ended.status == recorded.status
    if ended.final is not None and recorded.final is not None:
        assert ended.final.model.names == recorded.final.model.names
        assert ended.final.fit.r_squared == pytest.approx(recorded.final.fit.r_squared, abs=1e-8)
    for one, other in zip(recorded.rulings, rulings, strict=True):
        assert numbers_agree(one, other), (one, other)


def test_the_quick_bench_rules_as_the_recording_bench_on_random_plans():
    """Over 300 plans on tables as analysts have them; few need the exact moments."""
    count: Counter = Counter()

    @CALM
    @seed(20261201)
    @given(plans(), tables())
    def held(mapping, frame):
        compared(mapping, frame, count)

    held()
    assert count["quick"] >= 250, count


def test_the_quick_bench_rules_as_the_recording_bench_on_tables_full_of_trouble():
    """Over 320 plans on copies, constants, exact fits and numbers of any size."""
    count: Counter = Counter()

    @settings(CALM, max_examples=320)
    @seed(20261202)
    @given(plans_with_trouble(), tables_with_trouble())
    def held(mapping, frame):
        compared(mapping, frame, count)

    held()
    assert count["quick"] >= 50, count


@st.composite
def selections(draw) -> dict:
    """A plan that selects and does nothing else."""
    plan = draw(plans())
    plan["steps"] = draw(st.sampled_from([["missing_data", "selection"], ["selection"]]))
    plan["errors"] = "classical"
    plan["selection"]["method"] = draw(st.sampled_from(["backward", "none", "backward_aic", "backward_bic"]))
    plan["outcome"]["transforms"] = []
    return plan


def equal(one: Trials, other: Trials) -> None:
    """Two sets of trials, to the digits that doubles have."""
    for name in ("status", "adopted", "significant", "transformed", "rows"):
        np.testing.assert_array_equal(getattr(one, name), getattr(other, name), err_msg=name)
    for name in ("estimates", "errors", "intercept", "df", "r_squared", "adjusted_r_squared", "full_p"):
        np.testing.assert_allclose(
            getattr(one, name), getattr(other, name), rtol=1e-6, atol=1e-8, err_msg=name
        )


def test_replicates_side_by_side_end_as_one_by_one():
    """Over 150 plans with 12 shuffled outcomes each: keep rules, blocks, products, every criterion."""
    side_by_side = 0

    @settings(CALM, max_examples=150)
    @seed(20261203)
    @given(selections(), tables(), st.integers(0, 1000))
    def held(mapping, frame, number):
        nonlocal side_by_side
        try:
            plan = plan_from_mapping(mapping)
            table = table_from_frame(plan, frame)
        except BeforehandError:
            return
        from beforehand.rehearsing.batch import Batch

        stage = Stage.of(plan, table)
        if Batch.of(stage.setting, stage.subjects) is None:
            return
        side_by_side += 1
        rng = np.random.default_rng(number)
        outcome = stage.setting.source.raw("y")
        outcomes = np.array([rng.permutation(outcome) if at % 2 else outcome * 1.0 for at in range(12)])
        equal(stage.trials(outcomes), stage.one_by_one(outcomes))

    held()
    assert side_by_side >= 100


def test_doubles_say_so_where_they_do_not_carry_an_answer():
    """A near copy of a column is not ruled on by rounding."""
    rng = np.random.default_rng(3)
    frame = pd.DataFrame({"a": rng.normal(size=40), "y": rng.normal(size=40)})
    frame["b"] = frame["a"] + 1e-7 * rng.normal(size=40)
    plan = plan_from_mapping(
        {
            "language": 1, "title": "Near", "question": "Which?", "data": {"file": "near.csv"},
            "outcome": {"column": "y"}, "predictors": [{"column": "a"}, {"column": "b"}],
        }
    )  # fmt: skip
    table = table_from_frame(plan, frame)
    stage = Stage.of(plan, table)
    ground = stage.setting.ground
    assert ground is not None
    with pytest.raises(NotQuick):
        ground.columns.design(ground.model(stage.setting.state).keys, ())
    ended = run_trial(stage.setting, stage.setting.source.raw("y"))
    assert not ended.quick
    assert told((*stage.setting.made, *ended.rulings)) == told(run_steps(plan, table).rulings)
