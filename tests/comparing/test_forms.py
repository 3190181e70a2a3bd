from __future__ import annotations

import html
import json
import re

import pytest
from rich.cells import cell_len

from beforehand.comparing import Change, Comparison, comparison, read_side
from beforehand.comparing.forms import cell, mapping, markdown
from beforehand.screen.comparison import comparison_text

QUARTERS = ("plans/repair-bench/jobs.lock.yaml", "plans/repair-bench/jobs-q2.lock.yaml")


@pytest.fixture(scope="module")
def quarters() -> Comparison:
    """Two locks of one plan on two tables."""
    from pathlib import Path

    root = Path(__file__).parents[2]
    return comparison(*(read_side(root / name) for name in QUARTERS))


def of(*changes: Change) -> Comparison:
    """A comparison of two plans with these changes."""
    return Comparison(old="old.plan.yaml", new="new.plan.yaml", changes=changes, locks=None)


LOOSER = Change(clause="alpha", grade="looser", says="alpha from 0.05 to 0.10: more passes: looser.")
WORDS = Change(clause="title", grade="wording", says="title from a to b: only words: wording.")


def test_json_has_its_keys_and_no_nan(quarters):
    """The keys are a promise to programs."""
    found = mapping(of(LOOSER, WORDS))
    assert list(found) == ["same", "old", "new", "counts", "changes", "locks"]
    assert found["same"] is False
    assert found["counts"] == {"looser": 1, "different": 0, "stricter": 0, "wording": 1}
    assert found["changes"] == [
        {"clause": "alpha", "class": "looser", "says": "alpha from 0.05 to 0.10: more passes: looser."},
        {"clause": "title", "class": "wording", "says": "title from a to b: only words: wording."},
    ]
    assert mapping(of())["same"] is True
    text = json.dumps(mapping(quarters), allow_nan=False)
    locks = json.loads(text)["locks"]
    assert list(locks) == [
        "same", "status", "data", "ledger", "rows_came", "rows_went", "predictors", "parting", "flipped",
        "only_old", "only_new", "coefficients", "figures", "alternatives", "sections",
    ]  # fmt: skip
    assert list(locks["coefficients"][0]) == [
        "term", "old", "new", "old_standard_error", "new_standard_error", "shift", "why_no_shift",
    ]  # fmt: skip


def test_markdown_is_a_heading_a_sentence_and_a_table():
    """As it stands in a comment on a proposed change."""
    assert markdown(of(LOOSER, WORDS)) == (
        "### old.plan.yaml → new.plan.yaml\n"
        "\n"
        "2 changes of the plan: 1 looser, 1 wording.\n"
        "\n"
        "| Clause | Class | What changes |\n"
        "|---|---|---|\n"
        "| alpha | looser | alpha from 0.05 to 0.10: more passes: looser. |\n"
        "| title | wording | title from a to b: only words: wording. |\n"
    )
    assert markdown(of()) == "### old.plan.yaml → new.plan.yaml\n\nNothing differs.\n"


def shown_by_markdown(text: str) -> str:
    """What a reader of Markdown sees of a cell: escapes and entities undone, comments left out."""
    return html.unescape(re.sub(r"\\([\\`*_{}\[\]#|~$])", r"\1", text.replace("<!-- -->", "")))


@pytest.mark.parametrize(
    "text",
    [
        "a | b | c",
        "back\\slash \\| and `code`",
        "*bold* _slanted_ ~~gone~~ # no heading",
        "<img src=x onerror=alert(1)> & &lt;",
        "[a link](http://invented.example) ![x](y)",
        "$x^2$",
        "@everyone and a@b",
    ],
)
def test_no_text_has_an_effect_in_a_cell(text):
    """Every sign that means something is escaped, and a reader sees the text as it was."""
    found = cell(text)
    assert shown_by_markdown(found) == text
    bare = re.sub(r"\\[\\`*_{}\[\]#|~$]", "", found.replace("<!-- -->", ""))
    assert not re.search(r"[\\`*_{}\[\]#|~$<>]", bare)
    assert not re.search(r"@\w", found)


def test_a_cell_stays_on_its_line_and_steers_no_terminal():
    """Line ends are blanks, and signs that do not print are named."""
    assert cell("one\ntwo\r\tthree\u2028four") == "one two  three four"
    assert cell("\x1b[31mred\u202eder") == "U+001B\\[31mredU+202Eder"


def test_a_hostile_name_makes_no_second_row():
    """A name with bars and line ends is one cell."""
    name = "x|y\n| z | looser | nothing |"
    change = Change(clause=f"predictors[{name}]", grade="different", says=f"{name} is new: different.")
    lines = markdown(of(change)).splitlines()
    assert len(lines) == 7
    assert len(re.findall(r"(?<!\\)\|", lines[-1])) == 4


def test_two_records_are_told_in_markdown(quarters):
    """Facts, coefficients and fit; every row of a table has as many cells as its head."""
    text = markdown(quarters)
    assert "The plans say the same; their records differ." in text
    assert "- **Paths part**: At R002." in text
    assert "| Term | Before | Now | Shift in old standard errors |" in text
    assert "| parts |  | 5.330 | new |" in text
    blocks = [block.splitlines() for block in text.split("\n\n") if block.startswith("|")]
    for rows in blocks:
        assert len({len(re.findall(r"(?<!\\)\|", row)) for row in rows}) == 1


def test_the_screen_sorts_changes_by_their_grade():
    """The looser ones first; the grade is said once, in the heading."""
    assert comparison_text(of(WORDS, LOOSER)) == (
        "old.plan.yaml to new.plan.yaml\n"
        "  2 changes of the plan: 1 looser, 1 wording.\n"
        "\n"
        "Looser: 1 change\n"
        "  alpha from 0.05 to 0.10: more passes.\n"
        "\n"
        "Wording: 1 change\n"
        "  title from a to b: only words.\n"
    )
    assert comparison_text(of()) == "old.plan.yaml to new.plan.yaml\n  Nothing differs.\n"


@pytest.mark.parametrize("width", [40, 60, 80, 100, 140])
def test_no_line_is_wider_than_the_screen(quarters, width):
    """Two records fit on a narrow screen too."""
    text = comparison_text(quarters, width=width)
    body = text.splitlines()[1:]
    assert max(map(cell_len, body)) <= width or width == 40
    assert "parts" in text


def test_colour_is_only_in_headings(quarters):
    """And nothing else of the text changes by it."""
    plain = comparison_text(quarters)
    coloured = comparison_text(quarters, colour=True)
    assert re.sub(r"\x1b\[[\d;]*m", "", coloured) == plain
    assert "\x1b" not in plain


def test_what_ends_the_command():
    """Without a grade any difference, with grades only theirs."""
    assert not of().fails(())
    assert of(WORDS).fails(())
    assert not of(WORDS).fails(["looser"])
    assert of(LOOSER, WORDS).fails(["stricter", "looser"])
