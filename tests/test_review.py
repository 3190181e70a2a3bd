"""The review of a plan, alone and with its table."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
import pytest
from scipy import stats

from beforehand.plan import Plan, plan_from_mapping, plan_from_text
from beforehand.review import Finding, Review, Screening, findings_of, review
from beforehand.table import table_from_frame

FULL: Mapping[str, Any] = {
    "language": 1,
    "title": "Electricity use of cold rooms",
    "question": "Which conditions go with a room's daily use?",
    "data": {"file": "rooms.csv", "row_label": "reading"},
    "eligibility": [{"column": "trial", "is": "no", "because": "rooms on trial are not in use"}],
    "outcome": {
        "column": "kwh",
        "unit": "kWh",
        "smallest_effect_that_matters": 10.0,
        "range": [0, None],
    },
    "predictors": [
        {"column": "outdoor", "unit": "°C", "range": [-30, 45], "role": "focal"},
        {"column": "load", "unit": "t", "range": [0, 90], "role": "adjustment"},
        {"column": "kind", "kind": "category", "levels": ["chilled", "frozen"], "baseline": "chilled"},
    ],
    "keep": [
        {"predictor": "outdoor", "rule": "always", "because": "heat gain", "source": "first law"},
        {"predictor": "load", "rule": "always", "because": "product mass", "source": "first law"},
    ],
    "missing_data": {"fill": {"load": "median", "outdoor": "median"}},
    "assumptions": {"independence": {"in_order_of": "date"}},
    "selection": {"method": "none"},
    "expects": {"residual_sd": 40.0, "slopes": {"outdoor": 6.5}},
    "alternatives": {"stricter": {"alpha": 0.01}},
}


def plan_with(changes: Mapping[str, Any] | None = None) -> Plan:
    """The full plan with some of its top-level keys replaced; None takes a key away."""
    whole = {**FULL, **(changes or {})}
    return plan_from_mapping({key: value for key, value in whole.items() if value is not None})


def predictors(**changes: Mapping[str, Any]) -> list[dict[str, Any]]:
    """The predictors of the full plan, some of them with changes."""
    return [
        {key: value for key, value in {**one, **changes.get(one["column"], {})}.items() if value is not None}
        for one in FULL["predictors"]
    ]


def found(part: tuple[Finding, ...], code: str) -> Finding:
    """The one finding of a kind."""
    (one,) = [finding for finding in part if finding.code == code]
    return one


def test_a_plan_that_leaves_nothing_open_has_no_forks() -> None:
    """With every decision written down nothing is left to remark but what no run comes to."""
    reviewed = review(plan_with())
    assert reviewed.forks == ()
    assert reviewed.dead_rules == ()
    assert reviewed.risks == ()
    assert [one.clause for one in reviewed.unreachable] == ["weak_model.without_theory"]
    assert reviewed.screening is None


FORKS = [
    ({"data": {"file": "rooms.csv"}}, "row-label-open", "data.row_label", "note"),
    ({"eligibility": None}, "eligibility-open", "eligibility", "note"),
    (
        {"outcome": {"column": "kwh", "unit": "kWh", "range": [0, None]}},
        "smallest-effect-open",
        "outcome.smallest_effect_that_matters",
        "note",
    ),
    (
        {"outcome": {**FULL["outcome"], "unit": None}},
        "outcome-unit-open",
        "outcome.unit",
        "note",
    ),
    (
        {"outcome": {**FULL["outcome"], "range": None}},
        "outcome-range-open",
        "outcome.range",
        "note",
    ),
    ({"predictors": predictors(load={"range": None})}, "range-open", "predictors", "note"),
    ({"predictors": predictors(load={"unit": None})}, "unit-open", "predictors", "note"),
    ({"predictors": predictors(outdoor={"role": None})}, "focal-open", "predictors", "caution"),
    ({"predictors": predictors(load={"role": None})}, "adjustment-open", "predictors", "note"),
    ({"keep": FULL["keep"][:1]}, "adjustment-removable", "keep", "caution"),
    ({"keep": None, "selection": None}, "theory-open", "keep", "note"),
    (
        {"keep": [{"predictor": "load", "rule": "always", "because": "product mass"}]},
        "keep-without-source",
        "keep[0].source",
        "note",
    ),
    ({"predictors": predictors(load={"role": "focal"})}, "multiplicity-open", "multiplicity", "caution"),
    ({"missing_data": None}, "fill-open", "missing_data.fill", "note"),
    ({"missing_data": {"fill": {"load": "mean"}}}, "kept-without-fill", "missing_data.fill", "note"),
    ({"assumptions": None}, "order-open", "assumptions.independence.in_order_of", "note"),
    ({"steps": ["missing_data", "influence"]}, "checks-open", "steps", "note"),
    ({"transforms": {"try": []}}, "ladder-empty", "transforms.try", "caution"),
    (
        {"influence": {"remove_when": {"coefficient": None}}},
        "flag-without-ground",
        "influence.remove_when",
        "caution",
    ),
    ({"expects": None}, "expects-open", "expects", "note"),
    ({"alternatives": None}, "alternatives-open", "alternatives", "note"),
]


@pytest.mark.parametrize(("changes", "code", "clause", "severity"), FORKS, ids=[case[1] for case in FORKS])
def test_each_open_decision_is_found(
    changes: Mapping[str, Any], code: str, clause: str, severity: str
) -> None:
    """A decision that is taken out of a full plan is found under its code and place."""
    one = found(review(plan_with(changes)).forks, code)
    assert (one.clause, one.severity) == (clause, severity)


DEAD = [
    (
        {"data": {"file": "rooms.csv", "labels_in_lock": "hashed"}},
        "hashed-labels-idle",
        "data.labels_in_lock",
    ),
    (
        {
            "keep": [{"predictor": "load", "rule": {"unless_p_above": 0.05}, "because": "mass"}],
            "selection": None,
        },
        "keep-bound-idle",
        "keep[0].rule",
    ),
    ({"steps": ["influence", "final_checks"], "missing_data": None}, "keep-idle", "keep"),
    ({"multiplicity": "holm"}, "multiplicity-idle", "multiplicity"),
    (
        {"steps": ["missing_data", "final_checks"], "influence": {"at_most": 0.02}},
        "step-not-run",
        "influence",
    ),
    ({"steps": ["influence", "final_checks"]}, "fill-idle", "missing_data.fill"),
    (
        {
            "steps": ["missing_data", "final_checks"],
            "selection": None,
            "outcome": {**FULL["outcome"], "range": [1, None], "transforms": ["log"]},
        },
        "step-not-run",
        "outcome.transforms",
    ),
    (
        {"steps": ["missing_data", "influence"], "selection": None, "assumptions": {"curvature": "skip"}},
        "step-not-run",
        "assumptions",
    ),
    (
        {
            "missing_data": {**FULL["missing_data"], "out_of_range": "missing"},
            "outcome": {"column": "kwh"},
            "predictors": predictors(outdoor={"range": None}, load={"range": None}),
        },
        "out-of-range-idle",
        "missing_data.out_of_range",
    ),
    ({"transforms": {"when": [], "try": ["square"]}}, "ladder-idle", "transforms.when"),
    (
        {"transforms": {"when": ["spread"]}, "assumptions": {"equal_spread": "skip"}},
        "ladder-idle",
        "transforms.when",
    ),
    (
        {"collinearity": {"examine_when": {"vif_above": None, "correlation_above": None}}},
        "nothing-examined",
        "collinearity.examine_when",
    ),
    (
        {"collinearity": {"when_both_significant": "keep_both", "if_large": "keep_both"}},
        "comparison-idle",
        "collinearity.when_both_significant",
    ),
    ({"collinearity": {"if_large": "keep_both"}}, "comparison-idle", "collinearity.large_change"),
    (
        {"collinearity": {"large_change": {"r_squared": 0.0}}},
        "comparison-idle",
        "collinearity.large_change",
    ),
    ({"influence": {"at_most": 0.0}}, "removal-idle", "influence.at_most"),
    (
        {
            "influence": {
                "flag_when": {"cooks_distance": None, "leverage": None, "studentized_residual": None}
            }
        },
        "flag-idle",
        "influence.flag_when",
    ),
    ({"weak_model": {"near": 0.05}}, "near-idle", "weak_model.near"),
    ({"weak_model": {"with_theory": "try_selection"}}, "try-selection-idle", "weak_model.with_theory"),
    (
        {"rehearsal": {"scenarios": ["expected"]}, "expects": None},
        "expected-world-idle",
        "rehearsal.scenarios",
    ),
]


@pytest.mark.parametrize(("changes", "code", "clause"), DEAD, ids=[f"{case[1]}-{case[2]}" for case in DEAD])
def test_each_dead_rule_is_found(changes: Mapping[str, Any], code: str, clause: str) -> None:
    """A rule that cannot act is found under its code and place."""
    assert (code, clause) in [(one.code, one.clause) for one in review(plan_with(changes)).dead_rules]


UNREACHABLE = [
    ({"keep": None}, "weak_model.with_theory", "note"),
    ({"keep": None, "weak_model": {"with_theory": "try_selection"}}, "weak_model.with_theory", "caution"),
    ({"keep": None, "weak_model": {"near": 0.3}}, "weak_model.near", "caution"),
    ({"collinearity": {"when_both_significant": "keep_both"}}, "collinearity.if_large", "note"),
    ({"collinearity": {"when_both_significant": "keep_both"}}, "collinearity.large_change", "note"),
    ({"steps": ["missing_data", "final_checks"]}, "collinearity", "note"),
    ({"errors": "hc3"}, "final_checks.if_spread_unequal", "note"),
    ({"assumptions": {"normal_residuals": "skip"}}, "final_checks.if_not_normal", "note"),
    (
        {"assumptions": {"normal_residuals": "skip"}, "final_checks": {"if_not_normal": "stop"}},
        "final_checks.if_not_normal",
        "caution",
    ),
    ({"assumptions": None}, "final_checks.if_dependent", "note"),
    ({"assumptions": {"curvature": "skip"}}, "transforms.if_none_works", "note"),
    ({"missing_data": {"remove_predictor_above": 1.0}}, "missing_data.remove_predictor_above", "note"),
    (
        {
            "outcome": {**FULL["outcome"], "range": [1, None], "transforms": ["log"]},
            "assumptions": {"equal_spread": "skip", "normal_residuals": "skip"},
        },
        "outcome.transforms",
        "caution",
    ),
    (
        {
            "steps": ["missing_data", "final_checks"],
            "alternatives": {"no_rows": {"influence": {"at_most": 0.0}}},
        },
        "alternatives.no_rows.influence",
        "caution",
    ),
]


@pytest.mark.parametrize(
    ("changes", "clause", "severity"), UNREACHABLE, ids=[f"{case[1]}-{case[2]}" for case in UNREACHABLE]
)
def test_each_unreachable_branch_is_found(changes: Mapping[str, Any], clause: str, severity: str) -> None:
    """A branch that no run comes to is found; it is a caution where somebody changed it."""
    places = [(one.clause, one.severity) for one in review(plan_with(changes)).unreachable]
    assert (clause, severity) in places


RISKS = [
    (
        {
            "transforms": {"try": ["square", "reciprocal"]},
            "keep": [{**FULL["keep"][1], "expected_sign": "positive"}],
            "predictors": predictors(load={"range": [1, 90]}),
        },
        "sign-may-turn",
    ),
    (
        {"products": [["outdoor", "load"]], "keep": [{**FULL["keep"][0], "expected_sign": "positive"}]},
        "sign-within-product",
    ),
    ({"influence": {"remove_when": {"significance_changes": True}}}, "removal-by-result"),
    ({"selection": None}, "selected-p"),
    ({"predictors": [*FULL["predictors"], *[{"column": f"x{k}"} for k in range(6)]]}, "many-checks"),
]


@pytest.mark.parametrize(("changes", "code"), RISKS, ids=[case[1] for case in RISKS])
def test_each_misleading_rule_is_found(changes: Mapping[str, Any], code: str) -> None:
    """A rule that acts and is known to mislead is found."""
    found(review(plan_with(changes)).risks, code)


def test_the_chance_of_a_needless_transform_is_told() -> None:
    """Eight predictors checked at 0.01 call a needless transform in 1 − 0.99^8 = 7.73 % of tables."""
    many = [*FULL["predictors"], *[{"column": f"x{k}"} for k in range(6)]]
    one = found(review(plan_with({"predictors": many})).risks, "many-checks")
    assert one.says == (
        "With 8 predictors checked at 0.01, about 7.73 % of tables without any curve call at least one "
        "needless transform."
    )


def test_a_baseline_nobody_chose_is_found_in_a_file() -> None:
    """Only the file tells a chosen baseline from the first level, which is filled in on reading."""
    text = (
        "language: 1\ntitle: t\nquestion: q\ndata: {file: a.csv}\noutcome: {column: y}\npredictors:\n"
        "  - {column: c, kind: category, levels: [low, high]%s}\n"
    )
    one = found(review(plan_from_text(text % "", "a.plan.yaml")).forks, "baseline-open")
    assert one.clause == "predictors[0].baseline"
    assert one.says == "No baseline is named for c, so its levels are compared with the first one (low)."
    chosen = review(plan_from_text(text % ", baseline: low", "a.plan.yaml"))
    assert "baseline-open" not in [finding.code for finding in chosen.forks]


def test_sentences_name_a_few_and_count_the_rest() -> None:
    """A list of many predictors is cut after five names."""
    many = [{"column": f"x{k}", "unit": "t"} for k in range(8)]
    one = found(
        review(plan_with({"predictors": many, "keep": None, "missing_data": None, "expects": None})).forks,
        "range-open",
    )
    assert one.says.startswith("No range is declared for x0, x1, x2, x3, x4 and 3 more: ")


def test_every_finding_is_one_plain_sentence() -> None:
    """Sentences start with a capital or a name, end with a full stop and stay on one line."""
    cases: list[Any] = [case[0] for case in (*FORKS, *DEAD, *UNREACHABLE, *RISKS)]
    for changes in cases:
        for one in findings_of(review(plan_with(changes))):
            assert one.says.endswith(".")
            assert "\n" not in one.says
            assert "!" not in one.says
            assert one.severity in ("note", "caution")
            assert one.clause


def test_a_review_is_frozen() -> None:
    """A review cannot be changed after it was made."""
    reviewed = review(plan_with())
    with pytest.raises(dataclasses.FrozenInstanceError):
        reviewed.forks = ()  # type: ignore[misc]


# -- with a table ------------------------------------------------------------------------------


def rooms(n: int = 60, seed: int = 7) -> pd.DataFrame:
    """An invented table of cold rooms; the numbers mean nothing."""
    draw = np.random.default_rng(seed)
    return pd.DataFrame(
        {
            "reading": [f"r{k:04d}" for k in range(n)],
            "trial": ["no"] * n,
            "kwh": draw.normal(300.0, 40.0, n),
            "outdoor": draw.normal(10.0, 8.0, n).clip(-29.0, 44.0),
            "load": draw.uniform(1.0, 89.0, n),
            "kind": np.where(draw.uniform(size=n) < 0.5, "chilled", "frozen"),
            "date": [f"2026-{1 + k // 28:02d}-{1 + k % 28:02d}" for k in range(n)],
        }
    )


def reviewed_with(frame: pd.DataFrame, changes: Mapping[str, Any] | None = None) -> tuple[Review, Screening]:
    """The review of the full plan, changed, with a table."""
    plan = plan_with(changes)
    made = review(plan, table_from_frame(plan, frame))
    assert made.screening is not None
    return made, made.screening


@pytest.mark.parametrize("label", ["reading", None], ids=["labelled", "unlabelled"])
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_the_values_of_the_outcome_change_nothing(seed: int, label: str | None) -> None:
    """Another outcome with the same missing cells gives the identical review, to the last digit.

    The table has gaps, fills of every kind, a copy, a near copy, a rare level and a product, so that
    every part of the review has something to say.
    """
    frame = rooms(200)
    draw = np.random.default_rng(seed)
    frame["wet"] = draw.normal(50.0, 9.0, 200)
    frame["fahrenheit"] = 32.0 + 1.8 * frame["outdoor"]
    frame["near"] = frame["load"] + draw.normal(0.0, 4.0, 200)
    frame.loc[[3, 50, 51], "load"] = np.nan
    frame.loc[[4, 60], "wet"] = np.nan
    frame.loc[[9, 17, 33], "kwh"] = np.nan
    frame.loc[8, "kind"] = "NA"
    changes = {
        "data": {"file": "rooms.csv", "row_label": label},
        "predictors": [*FULL["predictors"], *[{"column": c} for c in ("wet", "fahrenheit", "near")]],
        "products": [["outdoor", "kind"]],
        "missing_data": {"fill": {"load": "regression", "wet": "mean", "kind": "most_common"}},
    }
    first, _ = reviewed_with(frame, changes)
    scrambled = frame.copy()
    there = scrambled["kwh"].notna()
    scrambled.loc[there, "kwh"] = draw.permutation(scrambled.loc[there, "kwh"].to_numpy()) * 1e3 - 7.0
    scrambled["kwh"] = scrambled["kwh"].abs()
    constant = frame.copy()
    constant.loc[there, "kwh"] = 5.0
    copied = frame.copy()
    copied.loc[there, "kwh"] = copied.loc[there, "outdoor"].abs()
    assert len(findings_of(first)) > 10
    for other in (scrambled, constant, copied):
        assert reviewed_with(other, changes)[0] == first


def test_the_order_of_the_rows_changes_nothing() -> None:
    """Shuffled rows give the identical review."""
    frame = rooms(80)
    shuffled = frame.sample(frac=1.0, random_state=3)
    assert reviewed_with(frame)[0] == reviewed_with(shuffled)[0]


def test_rows_are_counted_at_each_stage() -> None:
    """Rows read, eligible, with an outcome and complete, after the plan's fills."""
    frame = rooms(60)
    frame.loc[0:9, "trial"] = "yes"
    frame.loc[[20, 21], "kwh"] = np.nan
    frame.loc[[30, 31, 32], "load"] = np.nan
    made, screening = reviewed_with(frame, {"missing_data": {"fill": {"outdoor": "mean"}}})
    counts = (screening.read, screening.eligible, screening.with_outcome, screening.complete)
    assert counts == (60, 50, 48, 45)
    assert (screening.ledger[0].name, screening.ledger[0].rows) == ("read", 60)
    says = [one.says for one in findings_of(made)]
    assert "2 of 50 eligible rows have no kwh and leave." in says
    assert "3 of 48 rows with an outcome (6.25 %) are incomplete and leave." in says
    assert "load: 6.25 % missing and no fill, so these rows leave." in says
    assert "outdoor has a fill and no cell is missing." in says


def test_missing_cells_and_the_plans_answer() -> None:
    """Each predictor with gaps is told with what the plan does about it."""
    frame = rooms(50)
    frame["wet"] = np.where(np.arange(50) < 30, np.nan, 1.0 * np.arange(50))
    frame.loc[[1, 2], "load"] = np.nan
    frame.loc[[40], "outdoor"] = np.nan
    changes = {
        "predictors": [*FULL["predictors"], {"column": "wet"}],
        "missing_data": {"fill": {"load": "median", "wet": "mean"}},
    }
    made, screening = reviewed_with(frame, changes)
    assert [(one.predictor, one.missing, one.answer) for one in screening.missing] == [
        ("outdoor", 1, "remove_rows"),
        ("load", 2, "fill"),
        ("wet", 30, "remove_predictor"),
    ]
    one = found(screening.findings, "missing-leaves")
    assert one.says == "wet: 60 % missing is above 40 %, so the predictor leaves. Its fill is never used."
    assert one.severity == "caution"
    assert "wet" not in [count.predictor for count in screening.coefficients]
    assert made.screening == screening


def test_a_kept_predictor_without_a_fill_would_stop_the_run() -> None:
    """Half of a kept predictor missing, no fill: the run would stop, and the review says so."""
    frame = rooms(50)
    frame.loc[0:29, "load"] = np.nan
    _, screening = reviewed_with(frame, {"missing_data": {"fill": {"outdoor": "mean"}}})
    one = found(screening.findings, "run-would-stop")
    assert one.says == (
        "The run would stop at missing_data: a predictor that a rule keeps is missing in more than 40 % of "
        "the rows and has no fill."
    )
    assert screening.missing[0].answer == "stop"


def test_columns_are_counted_per_category_and_product() -> None:
    """A category of L levels has L − 1 columns, its product with a number as many again."""
    frame = rooms(90)
    frame["kind"] = np.resize(["chilled", "frozen", "shock"], 90)
    kinds = predictors(kind={"levels": ["chilled", "frozen", "shock"]})
    _, screening = reviewed_with(frame, {"predictors": kinds, "products": [["outdoor", "kind"]]})
    assert [(one.predictor, one.columns) for one in screening.coefficients] == [
        ("outdoor", 1),
        ("load", 1),
        ("kind", 2),
        ("outdoor × kind", 2),
    ]
    assert screening.n_coefficients == 7
    assert screening.rows_per_coefficient == 90 / 7


@pytest.mark.parametrize(
    ("n", "code", "severity"),
    [
        (40, None, None),
        (39, "rows-per-coefficient", "note"),
        (8, "rows-per-coefficient", "note"),
        (7, "rows-per-coefficient", "caution"),
        (4, "too-few-rows", "caution"),
    ],
)
def test_few_rows_per_coefficient_are_graded(n: int, code: str | None, severity: str | None) -> None:
    """Below 10 rows for each of the 4 coefficients a note, below 2 a caution, at 1 no model at all."""
    frame = rooms(n)
    frame["kind"] = np.resize(["chilled", "frozen"], n)
    _, screening = reviewed_with(frame)
    graded = [one for one in screening.findings if one.code in ("rows-per-coefficient", "too-few-rows")]
    assert [(one.code, one.severity) for one in graded] == ([(code, severity)] if code else [])


def test_a_table_without_complete_rows_is_told_calmly() -> None:
    """No row with an outcome: nothing to screen, one caution, no error."""
    frame = rooms(12)
    frame["kwh"] = np.nan
    frame.loc[0, "kwh"] = 3.0
    frame.loc[0, "trial"] = "yes"
    _, screening = reviewed_with(frame)
    assert (screening.with_outcome, screening.complete) == (0, 0)
    assert screening.detectable is None
    assert found(screening.findings, "no-rows").says == (
        "No eligible row has an outcome, so nothing can be fitted."
    )


def test_constant_and_nearly_constant_predictors() -> None:
    """One value in all rows; one value in 95 % of them; two values."""
    frame = rooms(100)
    frame["outdoor"] = 5.0
    frame["load"] = np.where(np.arange(100) < 96, 20.0, np.arange(100.0) / 2.0)
    frame["door"] = np.resize([0.0, 1.0], 100)
    made, screening = reviewed_with(frame, {"predictors": [*FULL["predictors"], {"column": "door"}]})
    columns = screening.columns
    assert columns.constant == ("outdoor",)
    assert [(one.predictor, one.value, one.share) for one in columns.nearly_constant] == [
        ("load", 20.0, 0.96)
    ]
    assert columns.two_valued == ("door",)
    says = [one.says for one in findings_of(made)]
    assert "outdoor has one value in all complete rows and will leave." in says
    assert "load is 20 in 96 % of the complete rows, so the others alone carry its coefficient." in says
    assert "door has two values only: a curve has no meaning there and is not looked for." in says


def test_rare_levels_are_found() -> None:
    """Fewer than five rows of a level, none of a declared one, and few of the baseline."""
    frame = rooms(60)
    frame["kind"] = ["frozen"] * 53 + ["chilled"] * 3 + ["shock"] * 4
    levels = {"levels": ["chilled", "frozen", "shock", "dry"], "baseline": "chilled"}
    _, screening = reviewed_with(frame, {"predictors": predictors(kind=levels)})
    assert [(one.level, one.rows, one.baseline) for one in screening.columns.sparse_levels] == [
        ("chilled", 3, True),
        ("shock", 4, False),
        ("dry", 0, False),
    ]
    assert found(screening.findings, "sparse-baseline").says == (
        "The baseline, level chilled of kind, has 3 complete rows: every comparison with it is uncertain."
    )
    assert found(screening.findings, "sparse-level").says == (
        "The level shock of kind has 4 complete rows, so single rows decide its coefficient."
    )
    assert found(screening.findings, "empty-level").says == (
        "The level dry of kind has no complete row and no coefficient."
    )


def test_copies_and_sums_are_found_without_the_outcome() -> None:
    """A copy in another unit, and a predictor that is the sum of two others, with its equation."""
    frame = rooms(60)
    frame["outdoor"] = np.round(frame["outdoor"])
    frame["load"] = np.round(frame["load"])
    frame["fahrenheit"] = 32.0 + 2.0 * frame["outdoor"]
    frame["both"] = frame["outdoor"] + frame["load"]
    more = [*FULL["predictors"], {"column": "fahrenheit"}, {"column": "both"}]
    _, screening = reviewed_with(frame, {"predictors": more})
    columns = screening.columns
    assert [(one.first, one.second, one.r) for one in columns.duplicates] == [("outdoor", "fahrenheit", 1.0)]
    assert [one.predictor for one in columns.determined] == ["fahrenheit", "both"]
    assert columns.determined[1].equation == "both = 1 × outdoor + 1 × load"
    one = found(screening.findings, "duplicate-predictors")
    assert (one.clause, one.says) == (
        "predictors[3]",
        "outdoor and fahrenheit have a correlation of exactly +1: one is a copy of the other in another "
        "unit, and the later one leaves unless a rule keeps it.",
    )
    assert found(screening.findings, "dependent-predictor").says == (
        "both = 1 × outdoor + 1 × load holds in every complete row, so one of these leaves: the latest that "
        "no rule keeps."
    )


def test_related_predictors_are_found_by_the_plans_limit() -> None:
    """Pairs at or over the limit, the largest first; a product beside its part is no pair."""
    frame = rooms(120)
    draw = np.random.default_rng(5)
    frame["near"] = frame["load"] + draw.normal(0.0, 3.0, 120)
    frame["far"] = frame["load"] + draw.normal(0.0, 12.0, 120)
    more = [*FULL["predictors"], {"column": "near"}, {"column": "far"}]
    _, screening = reviewed_with(frame, {"predictors": more, "products": [["load", "kind"]]})
    expected = frame[["load", "near", "far"]].corr()
    pairs = [(one.first, one.second) for one in screening.columns.related]
    assert pairs[:3] == [("load", "near"), ("load", "far"), ("near", "far")]
    assert ("load", "load × kind") not in pairs
    for one in screening.columns.related[:3]:
        assert one.r == pytest.approx(expected.loc[one.first, one.second], abs=1e-14)
    _, lax = reviewed_with(
        frame,
        {"predictors": more, "collinearity": {"examine_when": {"correlation_above": None}}},
    )
    assert lax.columns.related == ()


def power_by_scipy(f2: float, n: int, p: int, alpha: float) -> float:
    """Power of the F test of one coefficient, straight from scipy's distributions."""
    return float(stats.ncf.sf(stats.f.isf(alpha, 1, n - p), 1, n - p, f2 * n))


def test_the_smallest_effect_is_found_with_power_080() -> None:
    """The detectable effect has power 0.80 by scipy's noncentral F, and its share is f²/(1 + f²)."""
    _, screening = reviewed_with(rooms(60))
    effect = screening.detectable
    assert effect is not None
    assert power_by_scipy(effect.partial_f2, 60, 4, 0.05) == pytest.approx(0.80, abs=1e-9)
    assert effect.share_of_remaining == effect.partial_f2 / (1.0 + effect.partial_f2)


def test_the_smallest_effect_in_units_counts_on_the_overlap() -> None:
    """In units per SD, and wider for a predictor that overlaps: the t test has power 0.80 there."""
    frame = rooms(60)
    frame["load"] = 20.0 + frame["outdoor"] + np.random.default_rng(3).normal(0.0, 4.0, 60)
    frame["load"] = frame["load"].clip(1.0, 89.0)
    _, screening = reviewed_with(frame)
    effect = screening.detectable
    assert effect is not None
    design = np.column_stack([np.ones(60), frame["outdoor"], frame["load"], frame["kind"] == "frozen"])
    inverse = np.linalg.inv(design.T @ design)
    for place, one in enumerate(effect.by_predictor, start=1):
        sd = design[:, place].std(ddof=1)
        assert one.inflation == pytest.approx(inverse[place, place] * 59 * sd**2, rel=1e-10)
        shift = one.per_sd / sd / (40.0 * math.sqrt(inverse[place, place]))
        critical = stats.t.isf(0.025, 56)
        power = stats.nct.sf(critical, 56, shift) + stats.nct.cdf(-critical, 56, shift)
        assert power == pytest.approx(0.80, abs=1e-8)


def test_the_smallest_effect_is_held_against_the_one_that_matters() -> None:
    """A table that is too small for the effect that matters says how many rows would do."""
    _, screening = reviewed_with(rooms(60))
    one = found(screening.findings, "effect-too-small")
    assert screening.detectable is not None
    assert screening.detectable.rows_needed == 128
    assert power_by_scipy((10 / 40) ** 2, 128, 4, 0.05) >= 0.80 > power_by_scipy((10 / 40) ** 2, 127, 4, 0.05)
    assert one.says == (
        "The table shows effects from 14.8 kWh per SD, and effects from 10 kWh matter: one that matters can "
        "be missed; about 128 complete rows would do."
    )
    _, large = reviewed_with(rooms(400))
    assert found(large.findings, "effect-large-enough").severity == "note"


def test_robust_errors_are_advised_in_a_small_table() -> None:
    """Up to 250 rows with classical errors, and not beyond nor with robust ones."""
    codes = [
        [one.code for one in reviewed_with(rooms(n), changes)[1].findings]
        for n, changes in ((250, {}), (251, {}), (250, {"errors": "hc3"}))
    ]
    assert [("small-table-errors" in found_codes) for found_codes in codes] == [True, False, False]
