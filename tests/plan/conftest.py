"""A small plan that is right, and a larger one that uses every block."""

from __future__ import annotations

import copy
from collections.abc import Callable
from typing import Any

import pytest

from beforehand.faults import PlanError
from beforehand.plan import Plan, plan_from_mapping, plan_from_text

SMALL: dict[str, Any] = {
    "language": 1,
    "title": "Honey of the hives",
    "question": "What goes with the honey of a hive?",
    "data": {"file": "hives.csv"},
    "outcome": {"column": "honey", "unit": "kg"},
    "predictors": [
        {"column": "bloom", "unit": "d", "range": [0, 120], "role": "focal"},
        {"column": "rain", "unit": "mm"},
        {"column": "breed", "kind": "category", "levels": ["dark", "yellow", "mixed"]},
    ],
}

LARGE = """\
language: 1
title: Honey of the hives
question: What goes with the honey of a hive?
written_by: apiary
data:
  file: hives.csv
  row_label: hive
  missing_codes: ["", NA, "-"]
purpose: explain
eligibility:
  - {column: settled, is: "yes", because: a swarm of this year brings no honey}
  - {column: year, at_least: 2019, because: the scales are new}
derive:
  - {column: warm, from: (day_temp - night_temp) / 2, unit: °C}
outcome:
  column: honey
  unit: kg
  smallest_effect_that_matters: 2
  range: [0, 90]
  transforms: [square_root]
predictors:
  - {column: bloom, unit: d, range: [0, 120], role: focal}
  - {column: rain, unit: mm}
  - {column: warm, unit: °C}
  - {column: breed, kind: category, levels: [dark, yellow, mixed], baseline: yellow}
products:
  - [bloom, rain]
keep:
  - predictor: bloom
    rule: {unless_p_above: 20%}
    because: No nectar without flowers.
    expected_sign: positive
  - at_least_one_of: [rain, warm]
    because: Weather must be represented.
alpha: 5%
multiplicity: holm
missing_data:
  fill: {rain: median, breed: most_common, warm: {value: 3}}
assumptions:
  independence: {in_order_of: date}
transforms: {try: [square, log]}
influence:
  flag_when: {cooks_distance: 4 / n, dffits: 2*sqrt(p/n)}
  at_most: 5%
errors: {cluster_by: apiary}
expects:
  residual_sd: 6
  slopes: {bloom: 0.2}
alternatives:
  stricter: {alpha: 1%}
  all_rows: {influence: {at_most: 0%}}
amendments:
  - date: 2026-12-01
    why: The scales of one apiary were swapped.
    kind: mistake
    seen: nothing
    expected_effect: none
"""


@pytest.fixture
def large_text() -> str:
    """A plan that uses every block."""
    return LARGE


@pytest.fixture
def large() -> Plan:
    """The plan that uses every block, read."""
    return plan_from_text(LARGE, "hives.plan.yaml")


@pytest.fixture
def small() -> dict[str, Any]:
    """The least a plan holds, as data to be changed."""
    return copy.deepcopy(SMALL)


@pytest.fixture
def plan_with() -> Callable[..., Plan]:
    """Make the small plan with some of its top keys set."""

    def make(**blocks: Any) -> Plan:
        return plan_from_mapping(copy.deepcopy(SMALL) | blocks)

    return make


@pytest.fixture
def faults_with(plan_with: Callable[..., Plan]) -> Callable[..., list[str]]:
    """Say what is wrong with the small plan with some of its top keys set."""

    def faults(**blocks: Any) -> list[str]:
        try:
            plan_with(**blocks)
        except PlanError as error:
            return [f"{fault.place}: {fault.what}" for fault in error.faults]
        return []

    return faults
