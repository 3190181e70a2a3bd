"""Plans with changes, and the alternatives of a plan."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from beforehand.faults import PlanError
from beforehand.plan import Plan, decisions_digest, plan_from_text, with_changes, written_out
from beforehand.plan.changes import merged


def test_alternatives_hold_what_was_read(large: Plan) -> None:
    """The changes of an alternative are plain data with the values that the changed plan has."""
    assert large.alternatives == {"all_rows": {"influence": {"at_most": 0.0}}, "stricter": {"alpha": 0.01}}


def test_with_changes(large: Plan) -> None:
    """A changed plan differs in what was changed only, and has no alternatives of its own."""
    changed = with_changes(large, large.alternatives["stricter"])
    assert changed.alpha == 0.01
    assert dict(changed.alternatives) == {}
    assert changed.origin == large.origin
    back = written_out(changed) | {"alpha": 0.05, "alternatives": written_out(large)["alternatives"]}
    assert back == written_out(large)


def test_no_changes(large: Plan) -> None:
    """A plan without changes is the plan without its alternatives."""
    assert written_out(with_changes(large, {})) == written_out(large) | {"alternatives": {}}


def test_blocks_are_merged_and_lists_replaced(large: Plan) -> None:
    """A block keeps what is not named; a list is replaced whole."""
    changed = with_changes(
        large,
        {"influence": {"flag_when": {"leverage": None}}, "transforms": {"try": ["cube"]}, "products": []},
    )
    flags = changed.influence.flag_when
    assert (flags.leverage, flags.cooks_distance) == (None, large.influence.flag_when.cooks_distance)
    assert changed.influence.at_most == 0.05
    assert changed.transforms.try_ == ("cube",)
    assert changed.products == ()


def test_values_that_exclude_each_other_are_replaced(large: Plan) -> None:
    """Errors, fills and checks of another kind replace the old ones whole."""
    changed = with_changes(
        large,
        {
            "errors": {"autocorrelation_lags": 3},
            "missing_data": {"fill": {"warm": "mean", "rain": {"value": 1}}},
            "assumptions": {"curvature": "skip"},
        },
    )
    assert written_out(changed)["errors"] == {"autocorrelation_lags": 3}
    assert written_out(changed)["missing_data"]["fill"] == {
        "breed": "most_common", "rain": {"value": 1.0}, "warm": "mean",
    }  # fmt: skip
    again = with_changes(changed, {"assumptions": {"curvature": {"alpha": 0.2}}})
    assert written_out(again)["assumptions"]["curvature"] == {"alpha": 0.2}


def test_a_null_takes_an_entry_out(large: Plan) -> None:
    """A fill or a slope is taken out by a null; elsewhere a null is a value."""
    changed = with_changes(
        large, {"missing_data": {"fill": {"rain": None}}, "expects": {"slopes": {"bloom": None}}}
    )
    assert list(changed.missing_data.fill) == ["breed", "warm"]
    assert changed.expects is not None
    assert dict(changed.expects.slopes) == {}
    assert with_changes(large, {"expects": None}).expects is None


def test_merging_leaves_its_arguments_alone() -> None:
    """Neither the base nor the changes are touched."""
    base: dict[str, Any] = {"a": {"b": 1}}
    changes: dict[str, Any] = {"a": {"c": 2}}
    assert merged(base, changes) == {"a": {"b": 1, "c": 2}}
    assert (base, changes) == ({"a": {"b": 1}}, {"a": {"c": 2}})


def test_changes_that_make_no_plan(large: Plan) -> None:
    """Changes that cannot be run are refused like a plan that cannot."""
    with pytest.raises(PlanError) as refused:
        with_changes(large, {"alpha": 2, "predictors": [{"column": "sun"}]})
    assert "hives.plan.yaml: alpha: is 2; it must lie between 0 and 1, both excluded" in str(refused.value)


CASES: dict[str, tuple[dict[str, Any], list[str]]] = {
    "nothing": ({"a": {}}, ["alternatives.a: is empty; it must be changes, such as {alpha: 0.01}"]),
    "a word": ({"a": "none"}, ["alternatives.a: is 'none'; it must be changes, such as {alpha: 0.01}"]),
    "a list": (["alpha"], ["alternatives: is a list; it must be a mapping of names to changes"]),  # type: ignore[dict-item]
    "null": (None, ["alternatives: is nothing; leave it out or give it named changes"]),  # type: ignore[dict-item]
    "the same value": ({"a": {"alpha": "5%"}}, ["alternatives.a: changes nothing"]),
    "the same words": ({"a": {"selection": {"method": "backward"}}}, ["alternatives.a: changes nothing"]),
    "a unit": ({"a": {"outcome": {"unit": "g"}}}, ["alternatives.a: changes nothing"]),
    "a title": (
        {"a": {"title": "T", "alpha": 0.01}},
        ["alternatives.a.title: is only words; an alternative changes decisions"],
    ),
    "the language": (
        {"a": {"language": 2}},
        ["alternatives.a.language: is the same for the plan and its alternatives"],
    ),
    "an alternative": (
        {"a": {"alternatives": {"b": {"alpha": 0.01}}}},
        ["alternatives.a.alternatives: is an alternative inside an alternative; write it beside the others"],
    ),
    "twice the same": (
        {"a": {"alpha": 0.01}, "b": {"alpha": "1%"}},
        ["alternatives.b: leads to the same plan as alternatives.a"],
    ),
    "a wrong value": (
        {"a": {"alpha": 0}},
        ["alternatives.a.alpha: is 0; it must lie between 0 and 1, both excluded"],
    ),
    "a wrong key": (
        {"a": {"influence": {"atmost": 0}}},
        ["alternatives.a.influence.atmost: is not a key that stands here (nearest: 'at_most')"],
    ),
    "a predictor that rules need": (
        {"a": {"predictors": [{"column": "rain"}]}},
        ["alternatives.a.keep[0].predictor: names 'bloom', which is not among the predictors"],
    ),
    "a step out of order": (
        {"a": {"steps": ["selection", "missing_data"]}},
        ["alternatives.a.steps[1]: has missing_data after selection; it comes first"],
    ),
    "a word for later": (
        {"a": {"weights": "w"}},
        [
            "alternatives.a.weights: is kept for a later version of the plan language (weighted rows); "
            "this one cannot do it"
        ],
    ),
    "a name with blanks": ({"all rows": {"alpha": 5}}, [
        'alternatives."all rows".alpha: is 5; it must lie between 0 and 1, both excluded'
    ]),
    "no name": ({" ": {"alpha": 0.01}}, ['alternatives." ": has no name']),
    "too many": (
        {f"a{n}": {"alpha": (n + 1) / 1000} for n in range(101)},
        ["alternatives: has 101 entries; more than 100 alternatives are not run"],
    ),
    "lawful ones": (
        {"a": {"steps": []}, "b": {"keep": []}, "c": {"errors": "hc3"}, "d": {"data": {"file": "b.csv"}}},
        [],
    ),
}  # fmt: skip


@pytest.mark.parametrize("case", CASES)
def test_refused_alternatives(case: str, faults_with: Callable[..., list[str]]) -> None:
    """An alternative that changes nothing, or leads to no plan, is a fault in its own place."""
    alternatives, expected = CASES[case]
    keep = [{"predictor": "bloom", "rule": "always", "because": "b"}]
    assert faults_with(keep=keep, alternatives=alternatives) == expected


def test_a_fault_of_the_plan_is_said_once(faults_with: Callable[..., list[str]]) -> None:
    """What is wrong with the plan itself is not repeated for every alternative."""
    keep = [{"predictor": "moon", "rule": "always", "because": "b"}]
    assert faults_with(keep=keep, alternatives={"a": {"alpha": 0.01}, "b": {"alpha": 0.02}}) == [
        "keep[0].predictor: names 'moon', which is not among the predictors"
    ]


def test_lines_of_alternatives(large_text: str) -> None:
    """A fault in an alternative has the line of what is wrong, or of the alternative."""
    with pytest.raises(PlanError) as refused:
        plan_from_text(large_text.replace("alpha: 1%", "predictors: [{column: rain}]"), "f")
    line = next(n for n, text in enumerate(large_text.splitlines(), 1) if "stricter" in text)
    assert {fault.line for fault in refused.value.faults} == {line}


def test_order_of_alternatives_is_no_decision(plan_with: Callable[..., Plan]) -> None:
    """The order in which alternatives are written touches no digest."""
    one, two = {"a": {"alpha": 0.01}}, {"b": {"alpha": 0.02}}
    assert decisions_digest(plan_with(alternatives=one | two)) == decisions_digest(
        plan_with(alternatives=two | one)
    )
