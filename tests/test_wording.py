"""Every ground has its sentence and its verdict; no sentence shows a hole."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

from beforehand import read_lock
from beforehand.steps.rulings import Ruling
from beforehand.wording import (
    SENTENCES,
    cautions,
    limit_text,
    number,
    p_value,
    plural,
    sentence,
    share,
    verdict_of,
)

ROOT = Path(__file__).parents[1]
VERDICTS = {
    "keep", "remove", "fill", "transform", "reject", "not_applicable", "examine", "significant", "weak",
    "near_miss", "mean_only", "robust_errors", "report", "pass", "stop",
}  # fmt: skip
# What stands in a sentence only when a number was not there.
HOLES = re.compile(r"\bNone\b|\bnan\b|\binf\b|not available|\{|\}|  |\.\.|\bTrue\b|\bFalse\b")
READY = sorted(ROOT.glob("plans/*/*.lock.yaml"))


def test_every_ground_has_one_verdict():
    """A word of the short list for each ground, and no ground without."""
    assert {verdict_of(ground) for ground in SENTENCES} == VERDICTS


def test_every_ground_that_a_step_rules_on_has_a_sentence():
    """Texts that steps hand over as a ground are found in the source, and stand among the sentences."""
    named: set[str] = set()
    for path in (ROOT / "src" / "beforehand" / "steps").glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if (
                isinstance(node, ast.Call)
                and isinstance(node.func, ast.Attribute)
                and node.func.attr == "add"
            ):
                grounds = [argument for argument in node.args[2:3] if isinstance(argument, ast.Constant)]
                named |= {str(ground.value) for ground in grounds}
    assert len(named) > 15
    assert named <= set(SENTENCES)


@pytest.mark.parametrize("path", READY, ids=lambda path: path.stem)
def test_sentences_of_the_ready_plans_have_no_holes(path):
    """Each ruling of each committed lock is a whole sentence."""
    lock = read_lock(path)
    said = [ruling.says for ruling in lock.rulings] + [fate.says for fate in lock.predictors.values()]
    said += list(lock.answer.cautions)
    for one in said:
        assert not HOLES.search(one), one
        assert one[-1] in ".…"


@pytest.mark.parametrize(
    ("value", "said"),
    [
        (0.0123456, "0.0123"), (12.3456, "12.3"), (1234.5, "1234"), (0.0, "0"), (3, "3"), (12345, "12,345"),
        (1.5e-7, "1.50e-07"), (2.5e8, "2.50e+08"), (-0.5, "-0.500"), (None, "not available"), ("x", "x"),
    ],
)  # fmt: skip
def test_numbers_in_a_sentence(value, said):
    """Three digits, no exponent where a person would not write one (common practice)."""
    assert number(value) == said


def test_p_shares_limits_and_counts():
    """A p to three decimals or below a thousandth; shares in per cent; plural forms right."""
    assert [p_value(p) for p in (0.0004, 0.001, 0.04999, 1.0, None)] == [
        "below 0.001", "0.001", "0.050", "1.000", "not available",
    ]  # fmt: skip
    assert (share(0.4), share(0.0125), share(None)) == ("40 %", "1.25 %", "not available")
    assert (limit_text(0.05), limit_text(10), limit_text(None)) == ("0.05", "10", "not available")
    assert (plural(1, "row"), plural(2, "row"), plural(0, "row"), plural(3, "entry", "entries")) == (
        "1 row", "2 rows", "0 rows", "3 entries",
    )  # fmt: skip


def test_a_p_that_rounds_to_its_limit_shows_more_digits():
    """0.0502 against 0.05 must not read "0.050 is above 0.05"."""
    ruling = Ruling(
        id="R001", step="selection", clause="alpha", subject="x", ground="leaves_backward", fits=("F001",),
        checks=(), evidence={"p": 0.05004}, limit=0.05, margin=0.0008, knife_edge=True,
    )  # fmt: skip
    assert sentence(ruling) == "x leaves: p 0.05004 is above 0.05."


def test_what_always_holds_is_always_said():
    """Whatever the run, the cautions end with the three that belong to every answer."""
    said = cautions(
        status="adopted", cap_reached=True, exact=False, unmended=("x",), failed=[], selected=True,
        filled=True, rows_per_coefficient=3.0, alternatives=2,
    )  # fmt: skip
    assert len(said) == 9
    plain = cautions(
        status="mean_only", cap_reached=False, exact=False, unmended=(), failed=[], selected=False,
        filled=False, rows_per_coefficient=50.0, alternatives=0,
    )  # fmt: skip
    assert said[-3:] == plain
    assert any("causation" in one for one in plain)
    assert any("health" in one for one in plain)
