"""Single values: what each kind of field reads from a file, and what it says to anything else."""

from __future__ import annotations

import datetime
from collections.abc import Callable
from typing import Any

import pytest

from beforehand.faults import PlanError
from beforehand.plan import Plan, plan_from_mapping, plan_from_text

HEAD = """\
language: 1
title: T
question: Q
data: {file: a.csv}
outcome: {column: y}
predictors: [{column: x}, {column: c, kind: category, levels: [no, 1.0]}]
"""


def read(lines: str) -> Plan:
    """The small plan with lines added."""
    return plan_from_text(HEAD + lines)


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("0.05", 0.05),
        ("5%", 0.05),
        ("'5%'", 0.05),
        ("5 %", 0.05),
        ("0.1%", 0.001),
        ("2.5%", 0.025),
        ("1e-3", 0.001),
        ("1.5e-1%", 0.0015),
        (".5", 0.5),
        ("+0.5", 0.5),
        ("5E-2", 0.05),
        ("0.3%", 0.003),
    ],
)
def test_shares(written: str, value: float) -> None:
    """A share is a number or a percentage, to the last digit the same."""
    assert read(f"alpha: {written}\n").alpha == value


@pytest.mark.parametrize(
    ("lines", "message"),
    [
        ("alpha: 0\n", "alpha: is 0; it must lie between 0 and 1, both excluded"),
        ("alpha: 100%\n", "alpha: is 1; it must lie between 0 and 1, both excluded"),
        ("alpha: -5%\n", "alpha: is -0.05; it must lie between 0 and 1, both excluded"),
        (
            "alpha: '0.05'\n",
            "alpha: is '0.05'; it must be a number or a share such as 40%; take the quotes away",
        ),
        ("alpha: small\n", "alpha: is 'small'; it must be a number or a share such as 40%"),
        ("alpha: .inf\n", "alpha: is '.inf'; it must be a number or a share such as 40%"),
        ("alpha: nan\n", "alpha: is 'nan'; it must be a number or a share such as 40%"),
        ("alpha: 1e999\n", "alpha: is '1e999'; it must be a finite number"),
        ("alpha: 0,05\n", "alpha: is '0,05'; it must be a number or a share such as 40%"),
        ("alpha: 0_05\n", "alpha: is '0_05'; it must be a number or a share such as 40%"),
        ("alpha: null\n", "alpha: is nothing; it must be a number or a share such as 40%"),
        ("alpha: true\n", "alpha: is 'true'; it must be a number or a share such as 40%"),
        ("alpha: [0.05]\n", "alpha: is a list; it must be a number or a share such as 40%"),
        ("alpha: {is: 0.05}\n", "alpha: is a mapping; it must be a number or a share such as 40%"),
        ("influence: {at_most: 101%}\n", "influence.at_most: is 1.01; it must lie between 0 and 1"),
        (f"alpha: {'9' * 5000}\n", f"alpha: is '{'9' * 39}…; it must be a number or a share such as 40%"),
        ("rehearsal: {replicates: 0}\n", "rehearsal.replicates: is '0'; it must lie between 1 and 10000000"),
        ("rehearsal: {replicates: 2.5}\n", "rehearsal.replicates: is '2.5'; it must be a whole number"),
        ("rehearsal: {seed: -1}\n", "rehearsal.seed: is '-1'; it must lie between 0 and 9223372036854775807"),
        (
            "expects: {residual_sd: 0}\n",
            "expects.residual_sd: is 0; it must be above 0",
        ),
        (
            "collinearity: {examine_when: {vif_above: 0.5}}\n",
            "collinearity.examine_when.vif_above: is 0.5; it must be at least 1",
        ),
        (
            "collinearity: {examine_when: {correlation_above: 0}}\n",
            "collinearity.examine_when.correlation_above: is 0; it must lie between 0 and 1, 0 excluded",
        ),
        ("intercept: yes\n", "intercept: is 'yes'; it must be true or false"),
        ("intercept: 1\n", "intercept: is '1'; it must be true or false"),
        ("intercept: 'true'\n", "intercept: is 'true'; it must be true or false"),
        (
            "multiplicity: hulm\n",
            "multiplicity: is 'hulm'; it must be none, holm or benjamini_hochberg (nearest: 'holm')",
        ),
        (
            "purpose: Explain\n",
            "purpose: is 'Explain'; it must be explain, predict or describe (nearest: 'explain')",
        ),
        ("purpose: null\n", "purpose: is nothing; it must be explain, predict or describe"),
        (
            "errors: robust\n",
            "errors: is 'robust'; it must be classical, hc0, hc1, hc2, hc3 or "
            "{cluster_by: column} or {autocorrelation_lags: 7}",
        ),
        ("errors: {cluster: site}\n", "errors.cluster_by: is missing"),
        ("written_by: [me]\n", "written_by: is a list; it must be text"),
        ("written_by: ''\n", "written_by: is empty; it must be text"),
        ("steps: selection\n", "steps: is 'selection'; it must be a list, such as [first, second]"),
        ("steps: null\n", "steps: is nothing; it must be a list, such as [first, second]"),
        (
            "influence:\n",
            "influence: is nothing; it must be a mapping, such as {key: value}; "
            "leave the key out or give it keys of its own",
        ),
        ("influence: strict\n", "influence: is 'strict'; it must be a mapping, such as {key: value}"),
        ("influence: [a]\n", "influence: is a list; it must be a mapping, such as {key: value}"),
        ("products: [x]\n", "products[0]: is 'x'; it must be two predictors, [first, second]"),
        (
            "products: [[x, c, x]]\n",
            "products[0]: is a list of 3; it must be two predictors, [first, second]",
        ),
        (
            "influence: {flag_when: {leverage: 3*k/n}}\n",
            "influence.flag_when.leverage: has 'k', but only n and p have a meaning here "
            "(a limit is a number or a formula in n and p, such as 4/n)",
        ),
        (
            "influence: {flag_when: {leverage: [3]}}\n",
            "influence.flag_when.leverage: is a list; it must be a number or a formula such as 4/n",
        ),
        (
            "assumptions: {curvature: none}\n",
            "assumptions.curvature: is 'none'; it must be skip or a mapping, such as {alpha: 0.01}",
        ),
        (
            "keep: [{predictor: [x], rule: always, because: b}]\n",
            "keep[0].predictor: is a list of 1; it must be a predictor, or two for their product",
        ),
        (
            "amendments: [{date: 2026-13-01, why: w, kind: gap, seen: nothing, expected_effect: e}]\n",
            "amendments[0].date: is '2026-13-01'; it must be a date such as 2026-12-01",
        ),
        (
            "eligibility: [{column: when, at_least: soon, because: b}]\n",
            "eligibility[0].at_least: is 'soon'; it must be a number or a date such as 2026-12-01",
        ),
        (
            "eligibility: [{column: a, is: 1, above: 2, because: b}]\n",
            "eligibility[0]: has 2 conditions (is, above); each line has exactly one of "
            "is, is_not, one_of, at_least, at_most, above, below",
        ),
        (
            "eligibility: [{column: a, because: b}]\n",
            "eligibility[0]: has no condition; each line has exactly one of "
            "is, is_not, one_of, at_least, at_most, above, below",
        ),
        (
            "derive: [{column: z, from: x +}]\n",
            "derive[0].from: ends where a number, a name or a bracket is expected",
        ),
        (
            "derive: [{column: z, from: 3}]\n",
            "derive[0].from: names no column, so that every row would be the same",
        ),
        (
            "missing_data: {fill: {x: 0}}\n",
            "missing_data.fill.x: is '0'; it must be mean, median, most_common, regression or {value: 0}",
        ),
    ],
)
def test_refused(lines: str, message: str) -> None:
    """A wrong value is told back with what would be right, in one line."""
    with pytest.raises(PlanError) as refused:
        read(lines)
    first = refused.value.faults[0]
    assert f"{first.place}: {first.what}" == message
    assert first.line == 7
    assert "\n" not in str(first)


def test_words_that_yaml_takes_for_values_are_text() -> None:
    """Where text is expected, no, 1.0 and a date are text, with or without quotes."""
    plan = read("written_by: 2026-12-01\neligibility: [{column: on, is: no, because: off}]\n")
    assert plan.written_by == "2026-12-01"
    assert plan.predictors[1].levels == ("no", "1.0")
    assert plan.eligibility[0].column == "on"
    assert plan.eligibility[0].condition == ("is", "no")


def test_text_cannot_be_nothing() -> None:
    """Where text is expected, an empty value is a fault that says how to write the word null."""
    with pytest.raises(PlanError) as refused:
        plan_from_text(HEAD.replace("title: T", "title: null"), "f")
    assert str(refused.value) == (
        'f:2: title: is empty; it must be text (the word null stands in quotes: "null")'
    )


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("5", 5.0),
        ("'5'", "5"),
        ("yes", "yes"),
        ("true", "true"),
        ("007", 7.0),
        ("''", ""),
        ("2026-12-01", "2026-12-01"),
    ],
)
def test_cells(written: str, value: float | str) -> None:
    """A cell to compare with is a number only where it is written as one without quotes."""
    plan = read(f"eligibility: [{{column: a, is_not: {written}, because: b}}]\n")
    assert plan.eligibility[0].condition == ("is_not", value)


def test_bounds_of_eligibility() -> None:
    """A bound is a number or a date."""
    plan = read(
        "eligibility: [{column: a, above: 1e3, because: b}, {column: d, below: 2026-12-01, because: b}]\n"
    )
    assert [line.condition for line in plan.eligibility] == [("above", 1000.0), ("below", "2026-12-01")]


def test_dates() -> None:
    """The date of an amendment is a date."""
    plan = read("amendments: [{date: 2026-12-01, why: w, kind: gap, seen: nothing, expected_effect: e}]\n")
    assert plan.amendments[0].date == datetime.date(2026, 12, 1)


def test_whole_numbers() -> None:
    """A whole number may be written with an exponent, and a long one loses no digit."""
    plan = read("rehearsal: {replicates: 2e3, seed: 9007199254740993}\n")
    assert (plan.rehearsal.replicates, plan.rehearsal.seed) == (2000, 9007199254740993)


def test_encodings_have_one_name() -> None:
    """Two names of an encoding are the same; what is no text encoding is refused."""
    assert plan_from_text(HEAD.replace("a.csv", "a.csv, encoding: UTF8")).data.encoding == "utf-8"
    for wrong in ("hex", "no-such", "x\\0"):
        with pytest.raises(PlanError):
            plan_from_text(HEAD.replace("a.csv", f'a.csv, encoding: "{wrong}"'))


@pytest.mark.parametrize(
    ("blocks", "message"),
    [
        ({"alpha": True}, "alpha: is true; it must be a number or a share such as 40%"),
        (
            {"alpha": "0.05"},
            "alpha: is '0.05'; it must be a number or a share such as 40%; take the quotes away",
        ),
        ({"alpha": float("nan")}, "alpha: is nan; it must be a finite number"),
        ({"alpha": 10**400}, "alpha: is too large a number"),
        ({"intercept": 1}, "intercept: is 1; it must be true or false"),
        ({"title": 5}, "title: is 5; it must be text (write it in quotes)"),
        ({"title": "a\x00b"}, "title: has a control character in its text"),
        ({"title": "a\ud800b"}, "title: has a control character in its text"),
        ({1: 2}, ": has the key 1; a key is text"),
        ({"rehearsal": {"replicates": 2.5}}, "rehearsal.replicates: is 2.5; it must be a whole number"),
    ],
)
def test_data_made_in_memory(blocks: dict[Any, Any], message: str, small: dict[str, Any]) -> None:
    """Python values must be of the right type already."""
    with pytest.raises(PlanError) as refused:
        plan_from_mapping({**small, **blocks})
    fault = refused.value.faults[0]
    assert f"{fault.place}: {fault.what}" == message


def test_shares_in_memory(plan_with: Callable[..., Plan]) -> None:
    """A percentage and a limit are text in memory too; lists may be lists."""
    plan = plan_with(alpha="5%", influence={"flag_when": {"leverage": "2*p/n"}}, steps=["selection"])
    assert plan.alpha == 0.05
    assert plan.influence.flag_when.leverage is not None
    assert plan.influence.flag_when.leverage.text == "2*p/n"
    assert plan.steps == ("selection",)
