"""Predictors drawn from what a plan declares have what it declares; what cannot be drawn is a fault."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np
import pytest
from scipy import stats

from beforehand.faults import PlanError
from beforehand.plan import Plan, plan_from_mapping, plan_from_text
from beforehand.rehearsing.drawing import Declared, declared_predictors, drawn_columns
from beforehand.rehearsing.seeds import generator

ROWS = 200_000

LOOMS = """\
language: 1
title: Looms
question: What wears the shuttles?
data: {file: looms.csv}
outcome: {column: wear}
predictors:
  - {column: speed, range: [0, null]}
  - {column: damp}
  - {column: yarn, kind: category, levels: [wool, flax, silk], baseline: wool}
  - {column: age}
expects:
  residual_sd: 3
  slopes: {speed: 0.5, yarn: {silk: 4}}
  predictors:
    speed: {mean: 10, sd: 8}
    damp: {mean: 55, sd: 5}
    yarn: {shares: {wool: 0.5, flax: 0.2, silk: 0.3}}
    age: {mean: -3, sd: 2}
  correlations:
    - {between: [damp, age], r: -0.6}
    - {between: [speed, damp], r: 0.3}
"""


def looms(**changes: Any) -> Plan:
    """The plan of the looms with some texts in it replaced."""
    text = LOOMS
    for old, new in changes.get("texts", ()):
        assert old in text
        text = text.replace(old, new)
    return plan_from_text(text, "looms.plan.yaml")


@pytest.fixture(scope="module")
def drawn() -> dict[str, Any]:
    """Many rows of the looms."""
    declared = declared_predictors(looms())
    return drawn_columns(declared, generator(1, "predictors", 0), ROWS)


def test_means_and_spreads_are_those_declared(drawn):
    """Within four standard errors."""
    for name, mean, sd in (("damp", 55.0, 5.0), ("age", -3.0, 2.0)):
        values = drawn[name].values
        assert abs(values.mean() - mean) < 4 * sd / ROWS**0.5
        assert abs(values.std() - sd) < 4 * sd / (2 * ROWS) ** 0.5


def test_numbers_without_a_range_are_normal_and_correlated_as_declared(drawn):
    """Kolmogorov's distance, and the standard error of a correlation."""
    assert stats.kstest(drawn["damp"].values, stats.norm(55, 5).cdf).pvalue > 1e-3
    r = np.corrcoef(drawn["damp"].values, drawn["age"].values)[0, 1]
    assert abs(r + 0.6) < 4 * (1 - 0.36) / ROWS**0.5
    rest = np.corrcoef(drawn["speed"].values, drawn["age"].values)[0, 1]
    assert abs(rest) < 4 / ROWS**0.5


def test_a_range_cuts_the_bell_off(drawn):
    """Against the truncated normal of scipy; correlations keep their sign and nearly their size."""
    values = drawn["speed"].values
    assert values.min() >= 0.0
    cut = stats.truncnorm(-10 / 8, np.inf, loc=10, scale=8)
    assert stats.kstest(values, cut.cdf).pvalue > 1e-3
    assert 0.25 < np.corrcoef(values, drawn["damp"].values)[0, 1] < 0.31


def test_levels_come_in_their_shares(drawn):
    """A chi-squared test of the counts."""
    column = drawn["yarn"]
    assert (column.kind, column.levels) == ("category", ("wool", "flax", "silk"))
    counts = np.bincount(column.values, minlength=3)
    assert stats.chisquare(counts, np.array([0.5, 0.2, 0.3]) * ROWS).pvalue > 1e-3


def test_shares_that_add_up_to_nearly_one_are_scaled_and_none_is_drawn_at_no_share():
    """0.999 is what a hand writes down for 1."""
    texts = [("{wool: 0.5, flax: 0.2, silk: 0.3}", "{wool: 0.333, flax: 0.666}")]
    declared = declared_predictors(looms(texts=texts))
    np.testing.assert_allclose(declared.categories[0].shares, [1 / 3, 2 / 3, 0.0], rtol=1e-12)
    values = drawn_columns(declared, generator(1, "predictors", 0), 10_000)["yarn"].values
    assert set(values) == {0, 1}


def test_the_same_generator_draws_the_same_rows():
    """And another replicate draws others."""
    declared = declared_predictors(looms())
    one, again, other = (
        drawn_columns(declared, generator(1, "predictors", replicate), 50) for replicate in (3, 3, 4)
    )
    assert all(one[name].values.tobytes() == again[name].values.tobytes() for name in one)
    assert (one["damp"].values != other["damp"].values).all()


def test_a_plan_of_categories_only_can_be_drawn():
    """There need be no number."""
    plan = plan_from_mapping(
        {
            "language": 1, "title": "t", "question": "q", "data": {"file": "t.csv"},
            "outcome": {"column": "y"},
            "predictors": [{"column": "c", "kind": "category", "levels": ["a", "b"]}],
            "expects": {"residual_sd": 1, "predictors": {"c": {"shares": {"a": 0.5, "b": 0.5}}}},
        }
    )  # fmt: skip
    columns = drawn_columns(declared_predictors(plan), generator(1, "predictors", 0), 20)
    assert list(columns) == ["c"]
    assert len(columns["c"].values) == 20


FAULTS = {
    "nothing declared of a number": (
        [("    damp: {mean: 55, sd: 5}\n", "")],
        [
            "looms.plan.yaml:14: expects.predictors.damp: lacks mean and sd; "
            "without a table 'damp' is drawn from its declared mean and sd"
        ],
    ),
    "half of it": (
        [("damp: {mean: 55, sd: 5}", "damp: {mean: 55}"), ("age: {mean: -3, sd: 2}", "age: {sd: 2}")],
        [
            "looms.plan.yaml:16: expects.predictors.damp: lacks sd; "
            "without a table 'damp' is drawn from its declared mean and sd",
            "looms.plan.yaml:18: expects.predictors.age: lacks mean; "
            "without a table 'age' is drawn from its declared mean and sd",
        ],
    ),
    "no shares": (
        [("    yarn: {shares: {wool: 0.5, flax: 0.2, silk: 0.3}}\n", "")],
        [
            "looms.plan.yaml:14: expects.predictors.yarn: is missing; "
            "without a table the shares of the levels of 'yarn' must be declared"
        ],
    ),
    "a bell outside its range": (
        [("speed: {mean: 10, sd: 8}", "speed: {mean: -40, sd: 8}")],
        [
            "looms.plan.yaml:15: expects.predictors.speed: has a mean and sd of which hardly a value lies "
            "in the declared range of 'speed'"
        ],
    ),
    "clusters": (
        [("expects:\n", "errors: {cluster_by: mill}\nexpects:\n")],
        [
            "looms.plan.yaml:11: errors.cluster_by: names the clusters by 'mill', "
            "which cannot be drawn without a table"
        ],
    ),
}


@pytest.mark.parametrize("case", FAULTS)
def test_what_cannot_be_drawn_is_a_fault_with_its_line(case):
    """Every one at once."""
    texts, expected = FAULTS[case]
    with pytest.raises(PlanError) as caught:
        declared_predictors(looms(texts=texts))
    assert str(caught.value).splitlines() == expected


def test_correlations_that_cannot_hold_are_found_in_a_plan_that_was_never_checked():
    """A plan changed in memory has not gone through the checks of a file."""
    plan = looms()
    assert plan.expects is not None
    one, two = plan.expects.correlations
    lines = (
        one.model_copy(update={"r": 0.9}), two.model_copy(update={"r": 0.9}),
        two.model_copy(update={"between": ("speed", "age"), "r": -0.9}),
    )  # fmt: skip
    expects = plan.expects.model_copy(update={"correlations": lines})
    with pytest.raises(PlanError, match="not positive definite"):
        declared_predictors(plan.model_copy(update={"expects": expects}))


def test_what_rows_are_drawn_from_goes_to_another_process_whole():
    """Pickled and back, it draws the same rows."""
    import pickle

    declared = declared_predictors(looms())
    again: Declared = pickle.loads(pickle.dumps(declared))
    assert [field.name for field in dataclasses.fields(again)] == ["numbers", "categories"]
    one, two = (drawn_columns(part, generator(1, "predictors", 0), 20) for part in (declared, again))
    assert all(one[name].values.tobytes() == two[name].values.tobytes() for name in one)
