"""The written-out plan, its text, and the digests."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable
from typing import Any

import pytest
import yaml

from beforehand.plan import (
    Plan,
    canonical_text,
    decisions_digest,
    plan_from_mapping,
    plan_from_text,
    whole_digest,
    written_out,
)
from beforehand.plan.canonical import decisions


def test_written_out_reads_back(large: Plan) -> None:
    """The written-out plan makes an equal plan, as data and as text, again and again."""
    assert plan_from_mapping(written_out(large)) == large
    text = canonical_text(large)
    assert plan_from_text(text) == large
    assert canonical_text(plan_from_text(text)) == text


def test_any_reader_reads_the_text(large: Plan) -> None:
    """A YAML 1.1 and a YAML 1.2 reader find the same data in it."""
    ruamel = pytest.importorskip("ruamel.yaml")
    text = canonical_text(large)
    assert yaml.safe_load(text) == written_out(large)
    assert ruamel.YAML(typ="safe", pure=True).load(text) == written_out(large)


def test_every_default_is_written(plan_with: Callable[..., Plan]) -> None:
    """Every field of every block stands in the text, but for what cannot apply."""
    data = written_out(plan_with())
    assert list(data) == [
        "language", "title", "question", "written_by", "data", "purpose", "eligibility", "derive", "outcome",
        "predictors", "products", "keep", "alpha", "multiplicity", "intercept", "steps", "missing_data",
        "assumptions", "transforms", "collinearity", "influence", "selection", "weak_model", "final_checks",
        "errors", "expects", "rehearsal", "alternatives", "refresh", "amendments",
    ]  # fmt: skip
    assert data["transforms"] == {
        "when": ["curvature"], "try": ["square", "cube", "square_root"], "if_none_works": "keep_as_is",
    }  # fmt: skip
    assert data["predictors"][1] == {
        "column": "rain", "unit": "mm", "kind": "number", "range": None, "role": "candidate", "because": None,
    }  # fmt: skip
    assert data["predictors"][2]["baseline"] == "dark"


def test_digest_of_known_bytes(plan_with: Callable[..., Plan]) -> None:
    """A digest is the SHA-256 of the written-out plan as JSON: anybody can recompute it."""
    plan = plan_with()
    text = json.dumps(written_out(plan), sort_keys=True, ensure_ascii=False, separators=(",", ":"))
    assert whole_digest(plan) == "sha256:" + hashlib.sha256(text.encode("utf-8")).hexdigest()


def test_writing_touches_no_digest(large: Plan, large_text: str) -> None:
    """Comments, key order, quotes, blanks and other ways to write a number touch neither digest."""
    other = (
        large_text.replace("alpha: 5%", "alpha:   0.05   # five in a hundred")
        .replace("title: Honey of the hives", "title: 'Honey of the hives'")
        .replace("4 / n", "(4/n)")
        .replace("(day_temp - night_temp) / 2", "(day_temp-night_temp)/2.0")
        .replace("{column: rain, unit: mm}", "{unit: mm, column: rain, kind: number}")
        .replace("purpose: explain\n", "")
    )
    assert other != large_text
    plan = plan_from_text("purpose: explain\n" + other)
    assert whole_digest(plan) == whole_digest(large)
    assert decisions_digest(plan) == decisions_digest(large)


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("title: Honey of the hives", "title: Honey"),
        ("question: What goes", "question: What really goes"),
        ("written_by: apiary", "written_by: somebody"),
        ("because: the scales are new", "because: the scales are newer"),
        ("because: No nectar without flowers.", "because: Flowers.\n    source: a book"),
        ("unit: kg", "unit: kilogram"),
        ("unit: mm", "unit: millimetre"),
        ("  row_label: hive", "  row_label: hive\n  labels_in_lock: hashed"),
        ("why: The scales", "why: Scales"),
        ('["", NA, "-"]', '["-", "", NA]'),
        ("[rain, warm]", "[warm, rain]"),
    ],
)
def test_words_touch_whole_only(old: str, new: str, large: Plan, large_text: str) -> None:
    """A reason, a title, a unit or an order without meaning touches the digest of the whole only."""
    assert old in large_text
    plan = plan_from_text(large_text.replace(old, new))
    assert whole_digest(plan) != whole_digest(large)
    assert decisions_digest(plan) == decisions_digest(large)


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("alpha: 5%", "alpha: 4%"),
        ("file: hives.csv", "file: other.csv"),
        ('is: "yes"', "is_not: no"),
        ("at_least: 2019", "at_least: 2020"),
        ("/ 2, unit", "/ 3, unit"),
        ("range: [0, 120]", "range: [0, 121]"),
        ("role: focal}", "role: focal}\n  - {column: sun}"),
        ("baseline: yellow", "baseline: dark"),
        ("unless_p_above: 20%", "unless_p_above: 21%"),
        ("expected_sign: positive", "expected_sign: negative"),
        ("multiplicity: holm", "multiplicity: benjamini_hochberg"),
        ("rain: median", "rain: mean"),
        ("try: [square, log]", "try: [log, square]"),
        ("4 / n", "5 / n"),
        ("cluster_by: apiary", "cluster_by: year"),
        ("residual_sd: 6", "residual_sd: 7"),
        ("stricter: {alpha: 1%}", "stricter: {alpha: 2%}"),
        ("stricter:", "sterner:"),
        ("amendments:", "refresh: {r_squared: 1%}\namendments:"),
    ],
)
def test_decisions_touch_both(old: str, new: str, large: Plan, large_text: str) -> None:
    """Whatever can change a number, a ruling or a verdict touches both digests."""
    assert old in large_text
    plan = plan_from_text(large_text.replace(old, new))
    assert whole_digest(plan) != whole_digest(large)
    assert decisions_digest(plan) != decisions_digest(large)


def test_order_of_predictors_is_a_decision(plan_with: Callable[..., Plan], small: dict[str, Any]) -> None:
    """Ties go to the earlier predictor, so that their order counts."""
    turned = plan_with(predictors=small["predictors"][::-1])
    assert decisions_digest(turned) != decisions_digest(plan_with())


def test_decisions_hold_no_words(large: Plan) -> None:
    """No reason and no title is among the decisions, but a predictor may be called because."""
    text = json.dumps(decisions(large))
    for word in ("because", "source", "question", "unit", "swarm"):
        assert f'"{word}"' not in text
    named = plan_from_mapping(
        written_out(large)
        | {"predictors": [{"column": "because"}], "products": [], "keep": [], "multiplicity": "none",
           "alternatives": {}, "missing_data": {"fill": {"because": "mean"}}, "expects": None}
    )  # fmt: skip
    assert decisions(named)["missing_data"]["fill"] == {"because": "mean"}
