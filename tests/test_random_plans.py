"""Random plans on random tables: an answer or a fault, never a crash; and the laws that must hold."""

from __future__ import annotations

import numpy as np
import pandas as pd
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from beforehand.api import Run, lock_text, plan_from_mapping, run
from beforehand.faults import BeforehandError
from beforehand.lock import lock_from_text

STEPS = ("missing_data", "transforms", "collinearity", "influence", "selection", "final_checks")
RUNGS = ("square", "cube", "square_root", "cube_root", "log", "reciprocal", "box_cox")
NAMES = ("a", "b", "c", "d", "e")

SLOW = settings(
    max_examples=120, deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large]
)


@st.composite
def tables(draw) -> pd.DataFrame:
    """A small table with every kind of trouble: ties, constants, copies, gaps, outliers, tiny n."""
    n = draw(st.integers(3, 60))
    rng = np.random.default_rng(draw(st.integers(0, 10_000)))
    frame = pd.DataFrame({name: rng.normal(size=n) for name in NAMES})
    for name in NAMES:
        match draw(
            st.sampled_from(
                ["plain", "plain", "round", "two", "constant", "positive", "huge", "copy", "near"]
            )
        ):
            case "round":
                frame[name] = frame[name].round(0)
            case "two":
                frame[name] = (frame[name] > 0).astype(float)
            case "constant":
                frame[name] = 4.0
            case "positive":
                frame[name] = np.exp(frame[name])
            case "huge":
                frame[name] = frame[name] * 1e150 + 1e152
            case "copy":
                frame[name] = frame["a"] * 2.0 + 1.0
            case "near":
                frame[name] = frame["a"] + frame[name] * 1e-9
            case _:
                pass
    frame["g"] = rng.choice(["u", "v", "w"][: draw(st.integers(1, 3))], size=n)
    frame["h"] = rng.choice(["p", "q"], size=n)
    effect = draw(st.sampled_from([0.0, 0.5, 3.0]))
    frame["y"] = effect * rng.normal(size=n) + frame[list("abc")].clip(-1e6, 1e6).sum(axis=1) * effect
    frame["y"] += rng.normal(size=n) * draw(st.sampled_from([0.0, 1e-9, 1.0]))
    if draw(st.booleans()):
        frame.loc[rng.integers(n), "y"] += 1e4
    for name in (*NAMES, "g", "y"):
        if draw(st.integers(0, 3)) == 0:
            gone = rng.random(n) < draw(st.sampled_from([0.05, 0.3, 0.9]))
            frame[name] = frame[name].astype(object).where(~gone, None)
    frame["t"] = [f"2026-01-{1 + place % 28:02d}" for place in range(n)]
    return frame


@st.composite
def plans(draw) -> dict:
    """A plan with every block drawn."""
    predictors: list[dict] = [
        {"column": name} for name in draw(st.lists(st.sampled_from(NAMES), min_size=1, unique=True))
    ]
    names = [p["column"] for p in predictors]
    for name in draw(st.lists(st.sampled_from(["g", "h"]), unique=True)):
        levels = ["u", "v", "w"] if name == "g" else ["p", "q"]
        predictors.append({"column": name, "kind": "category", "levels": levels})
        names.append(name)
    steps = [step for step in STEPS if draw(st.integers(0, 5))]
    plan: dict = {
        "language": 1,
        "title": "Drawn",
        "question": "Does it stand?",
        "data": {"file": "drawn.csv"},
        "outcome": {"column": "y"},
        "predictors": predictors,
        "steps": steps,
        "alpha": draw(st.sampled_from([0.01, 0.05, 0.3])),
        "intercept": draw(st.sampled_from([True, True, True, False])),
        "missing_data": {
            "remove_predictor_above": draw(st.sampled_from([0.0, 0.4, 1.0])),
            "fill": {
                name: draw(
                    st.sampled_from(
                        ["most_common"]
                        if name in "gh"
                        else ["mean", "median", "most_common", "regression", {"value": 1}]
                    )
                )
                for name in draw(st.lists(st.sampled_from(names), unique=True, max_size=2))
            },
        },
        "assumptions": {
            "equal_spread": draw(st.sampled_from(["skip", {"test": "white"}, {"test": "breusch_pagan"}])),
            "normal_residuals": draw(
                st.sampled_from(["skip", {"test": "shapiro_wilk"}, {"test": "jarque_bera"}])
            ),
            "independence": draw(
                st.sampled_from(
                    [
                        {},
                        {"in_order_of": "t"},
                        {"in_order_of": "t", "test": "durbin_watson", "between": [1.5, 2.5]},
                    ]
                )
            ),
        },
        "transforms": {
            "when": draw(st.sampled_from([["curvature"], ["spread"], ["curvature", "spread"]])),
            "try": draw(st.lists(st.sampled_from(RUNGS), min_size=1, max_size=3, unique=True)),
            "if_none_works": draw(st.sampled_from(["keep_as_is", "remove_predictor"])),
        },
        "collinearity": {
            "examine_when": draw(st.sampled_from([{}, {"vif_above": 1.5}, {"correlation_above": 0.1}])),
            "when_one_significant": draw(st.sampled_from(["remove_other", "leave_to_selection"])),
            "when_both_significant": draw(st.sampled_from(["compare", "keep_both", "remove_weaker"])),
            "if_large": draw(st.sampled_from(["remove_weaker", "keep_both"])),
        },
        "influence": {
            "flag_when": draw(
                st.sampled_from(
                    [{}, {"dffits": "2*sqrt(p/n)", "dfbetas": "2/sqrt(n)", "covariance_ratio": "3*p/n"}]
                )
            ),
            "remove_when": draw(
                st.sampled_from(
                    [
                        {},
                        {"coefficient": 0.2},
                        {"r_squared": 0.01, "significance_changes": True, "sign_changes": True},
                    ]
                )
            ),
            "at_most": draw(st.sampled_from([0.0, 0.05, 0.5])),
        },
        "selection": {
            "method": draw(
                st.sampled_from(["backward", "none", "backward_aic", "backward_bic", "best_subset"])
            )
        },
        "weak_model": {"with_theory": draw(st.sampled_from(["report", "try_selection"]))},
        "errors": draw(st.sampled_from(["classical", "classical", "hc0", "hc3", {"cluster_by": "t"}])),
    }
    if len(names) > 1 and draw(st.booleans()):
        plan["products"] = [names[:2]]
    if draw(st.booleans()):
        rule = draw(st.sampled_from(["always", {"unless_p_above": 0.4}]))
        plan["keep"] = (
            [{"predictor": names[0], "rule": rule, "because": "Theory.", "expected_sign": "positive"}]
            if names[0] not in "gh"
            else [{"predictor": names[0], "rule": rule, "because": "Theory."}]
        )
    if len(names) > 2 and draw(st.booleans()):
        plan.setdefault("keep", []).append({"at_least_one_of": names[1:3], "because": "One of them."})
    if draw(st.integers(0, 4)) == 0:
        plan["outcome"]["transforms"] = draw(
            st.lists(st.sampled_from(RUNGS), min_size=1, max_size=2, unique=True)
        )
    return plan


def attempted(plan: dict, frame: pd.DataFrame) -> Run | None:
    """The run, or None for a fault; anything else is raised."""
    try:
        return run(plan_from_mapping(plan), frame)
    except BeforehandError as error:
        said = str(error)
    assert said
    return None


@SLOW
@given(plans(), tables())
def test_an_answer_or_a_fault(plan, frame):
    """Whatever the plan and the table: a lock that reads back, or faults; and kept is kept."""
    done = attempted(plan, frame)
    if done is None:
        return
    text = lock_text(done.lock)
    assert lock_text(lock_from_text(text, "drawn")) == text
    assert done.status in ("adopted", "mean_only", "inconclusive", "stopped")
    for rule in plan.get("keep", ()):
        if rule.get("rule") == "always":
            fate = done.lock.predictors[rule["predictor"]]
            assert fate.verdict != "removed"
    if done.lock.answer is not None:
        explained, unexplained = done.lock.answer.share_explained, done.lock.answer.share_unexplained
        assert abs(explained + unexplained - 1.0) < 1e-9
    cited = {ruling.id for ruling in done.lock.rulings}
    assert all(row.ruling in cited for row in done.lock.rows_removed)
    assert all(fit in {f.id for f in done.lock.fits} for ruling in done.lock.rulings for fit in ruling.fits)


@SLOW
@given(plans(), tables(), st.randoms(use_true_random=False))
def test_order_and_unused_columns_do_not_matter(plan, frame, random):
    """Rows and columns in another order, and a column more, give the same bytes."""
    done = attempted(plan, frame)
    places = list(range(len(frame)))
    random.shuffle(places)
    columns = list(frame.columns)
    random.shuffle(columns)
    again = attempted(plan, frame.iloc[places][columns].assign(unused=1.0))
    assert (done is None) == (again is None)
    if done is not None and again is not None:
        assert lock_text(done.lock) == lock_text(again.lock)


@settings(max_examples=40, deadline=None)
@given(st.integers(0, 10_000), st.sampled_from([2.0, 1000.0, 0.001]))
def test_units_scale_a_coefficient_and_move_no_ruling(seed, factor):
    """A predictor in another unit: its coefficient over the factor, every verdict as before."""
    rng = np.random.default_rng(seed)
    frame = pd.DataFrame({name: np.exp(rng.normal(size=50) * 0.4) for name in NAMES})
    frame["y"] = 2 * frame["a"] + frame["b"] ** 2 + rng.normal(size=50)
    plan = {
        "language": 1,
        "title": "Units",
        "question": "Do units matter?",
        "data": {"file": "units.csv"},
        "outcome": {"column": "y"},
        "predictors": [{"column": name} for name in NAMES],
    }
    before = run(plan_from_mapping(plan), frame).lock
    after = run(plan_from_mapping(plan), frame.assign(a=frame["a"] * factor)).lock
    assert [(r.subject, r.ground) for r in before.rulings] == [(r.subject, r.ground) for r in after.rulings]
    old = {term.term: term for term in before.answer.terms}
    for term in after.answer.terms:
        if term.term == "a" and term.transform is None:
            np.testing.assert_allclose(term.coefficient * factor, old["a"].coefficient, rtol=1e-8)
        if term.t is not None:
            np.testing.assert_allclose(term.t, old[term.term].t, rtol=1e-6)
