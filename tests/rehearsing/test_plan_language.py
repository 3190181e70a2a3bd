"""What the plan language has for rehearsals: effects of levels, correlations, folds and groups."""

from __future__ import annotations

import json
from typing import Any

import jsonschema
import numpy as np
import pandas as pd
import pytest

from beforehand.comparing.plans import plan_changes
from beforehand.faults import DataError
from beforehand.plan import (
    Plan,
    canonical_text,
    decisions_digest,
    plan_from_mapping,
    plan_from_text,
    plan_schema,
    whole_digest,
    with_changes,
    written_out,
)
from beforehand.runs import same_contract
from beforehand.table import table_from_frame
from beforehand.table.wanted import group_column, wanted_of

PIERS = """\
language: 1
title: Piers
question: What grows on them?
data: {file: piers.csv}
outcome: {column: growth}
predictors:
  - {column: depth}
  - {column: light}
  - {column: flow}
  - {column: wood, kind: category, levels: [oak, "yes", 12]}
expects:
  residual_sd: 2
  slopes: {depth: -1.5, wood: {yes: 3, 12: -4.5}}
  correlations:
    - {between: [depth, light], r: -0.7}
    - {between: [flow, light], r: 0.2}
rehearsal: {folds: 5, leave_out: harbour}
"""


@pytest.fixture
def piers() -> Plan:
    """The plan as read."""
    return plan_from_text(PIERS, "piers.plan.yaml")


def rewritten(plan: Plan, **expects: Any) -> Plan:
    """The plan with parts of its expectations replaced."""
    data = written_out(plan)
    return plan_from_mapping({**data, "expects": {**data["expects"], **expects}})


def test_levels_are_read_as_text_whatever_they_look_like(piers):
    """The words of the file, with numbers for effects."""
    assert piers.expects is not None
    assert dict(piers.expects.slopes) == {"depth": -1.5, "wood": {"12": -4.5, "yes": 3.0}}
    assert [(line.between, line.r) for line in piers.expects.correlations] == [
        (("depth", "light"), -0.7), (("flow", "light"), 0.2)
    ]  # fmt: skip
    assert (piers.rehearsal.folds, piers.rehearsal.leave_out) == (5, "harbour")


def test_the_written_out_plan_reads_back_equal(piers):
    """As text and as data; an equal plan has an equal hash."""
    for again in (plan_from_text(canonical_text(piers)), plan_from_mapping(written_out(piers))):
        assert again == piers
        assert hash(again) == hash(piers)
        assert whole_digest(again) == whole_digest(piers)


def test_a_slope_cannot_be_changed_in_memory(piers):
    """A plan is frozen to its depths."""
    with pytest.raises(TypeError):
        piers.expects.slopes["wood"]["yes"] = 9.0


def test_the_order_of_correlations_means_nothing(piers):
    """The decisions are the same, and a comparison calls it wording."""
    lines = written_out(piers)["expects"]["correlations"]
    other = rewritten(piers, correlations=lines[::-1])
    assert decisions_digest(other) == decisions_digest(piers)
    assert [change.grade for change in plan_changes(piers, other)] == ["wording"]


def test_changes_of_expectations_are_told_by_their_names(piers):
    """A level, a pair."""
    lines = [{"between": ["depth", "light"], "r": -0.5}]
    other = rewritten(piers, slopes={"depth": -1.5, "wood": {"yes": 5, "12": -4.5}}, correlations=lines)
    why = "rehearsal supposes another world; the run is not touched: different."
    assert [change.says for change in plan_changes(piers, other)] == [
        f"expects.slopes.wood.yes from 3 to 5: {why}",
        f"expects.correlations[depth, light].r from -0.7 to -0.5: {why}",
        f"expects.correlations[flow, light] is gone: {why}",
    ]
    assert decisions_digest(other) != decisions_digest(piers)


def test_an_alternative_replaces_the_slopes_of_a_category_whole(piers):
    """What it does not name has no effect there."""
    changed = with_changes(piers, {"expects": {"slopes": {"wood": {"yes": 1}}}})
    assert changed.expects is not None
    assert dict(changed.expects.slopes) == {"depth": -1.5, "wood": {"yes": 1.0}}


def test_an_editor_accepts_what_the_program_reads(piers):
    """The schema knows slopes of both kinds, and refuses what is neither."""
    check = jsonschema.Draft202012Validator(plan_schema())
    data = json.loads(json.dumps(written_out(piers)))
    assert list(check.iter_errors(data)) == []
    for wrong in ({"wood": {"yes": "much"}}, {"wood": {}}, {"depth": [1]}):
        data["expects"]["slopes"] = wrong
        assert list(check.iter_errors(data)), wrong


# ---- groups that are left out ----


def test_the_group_column_is_that_of_the_clusters_unless_the_plan_says_other(piers):
    """Or none."""
    bare = plan_from_mapping(written_out(piers) | {"rehearsal": {"folds": 5}})
    clustered = plan_from_mapping(written_out(bare) | {"errors": {"cluster_by": "tide"}})
    both = plan_from_mapping(written_out(piers) | {"errors": {"cluster_by": "tide"}})
    assert [group_column(plan) for plan in (piers, bare, clustered, both)] == [
        "harbour", None, "tide", "harbour"
    ]  # fmt: skip


def frame() -> pd.DataFrame:
    """Invented piers."""
    rng = np.random.default_rng(2)
    columns = {name: rng.normal(size=30) for name in ("growth", "depth", "light", "flow")}
    wood = rng.choice(["oak", "yes", "12"], 30)
    return pd.DataFrame({**columns, "wood": wood, "harbour": [f"h{n % 4}" for n in range(30)]})


def test_the_groups_are_read_from_the_table(piers):
    """As text, under the plan's contract, also where they label the rows."""
    wanted = wanted_of(piers)["harbour"]
    assert (wanted.kind, wanted.place) == ("text", "rehearsal.leave_out")
    table = table_from_frame(piers, frame())
    assert table.columns["harbour"].levels == ("h0", "h1", "h2", "h3")
    labelled = frame().assign(harbour=[f"h{n}" for n in range(30)])
    plan = plan_from_mapping(written_out(piers) | {"data": {"file": "piers.csv", "row_label": "harbour"}})
    assert len(table_from_frame(plan, labelled).columns["harbour"].levels) == 30


def test_a_table_without_the_groups_is_a_fault(piers):
    """It names the column and where the plan asks for it."""
    with pytest.raises(DataError, match="harbour"):
        table_from_frame(piers, frame().drop(columns="harbour"))


def test_plans_that_leave_out_other_groups_read_other_tables(piers):
    """So that the table of one does not lack what the other needs."""
    other = with_changes(piers, {"rehearsal": {"leave_out": "wood"}})
    assert not same_contract(piers, other)
    assert same_contract(piers, with_changes(piers, {"rehearsal": {"folds": 4}}))
