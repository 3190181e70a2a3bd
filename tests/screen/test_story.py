from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from rich.cells import cell_len

from beforehand.lock import Lock
from beforehand.lock.trace import trace
from beforehand.screen.story import story_text

LockOf = Callable[[dict[str, Any]], Lock]


def test_a_removed_predictor_is_told_ruling_by_ruling(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Verdict, rulings with clause, evidence, limit and margin, the fits in which it stood, alternatives."""
    assert story_text(trace(lock_of(hives), "rain"), width=100) == (
        "rain: removed\n"
        "  R011: rain leaves: p 0.413 is above 0.0500.\n"
        "\n"
        "Ruling by ruling\n"
        "  R007  humidity leaves: its correlation with rain is 0.834; beside it p is 0.124 for humidity and\n"
        "        0.0310 for rain.\n"
        "        collinearity, collinearity.when_one_significant, as its partner; F002, F003\n"
        "        partner rain, correlation 0.8344, p 0.124, p partner 0.031\n"
        "  R011  rain leaves: p 0.413 is above 0.0500.\n"
        "        selection, selection.method; F005\n"
        "        p 0.413\n"
        "        limit 0.05, margin 0.363\n"
        "\n"
        "Fit by fit\n"
        "  Fit    Why                  Rows   Coefficient   Standard error      t       p\n"
        "  F001   working model         208        0.0044           0.0054   0.82   0.413\n"
        "  F002   colony_age squared    208        0.0044           0.0054   0.82   0.413\n"
        "  F003   without humidity      208        0.0044           0.0054   0.82   0.413\n"
        "  F005   without row h117      207        0.0044           0.0054   0.82   0.413\n"
        "\n"
        "In the alternatives\n"
        "  stricter        rain leaves: p 0.413 is above 0.0500.\n"
        "  keep_all_rows   rain leaves: p 0.413 is above 0.0500.\n"
    )


def test_a_row_is_told_by_its_measures_and_what_changes_without_it(
    hives: dict[str, Any], lock_of: LockOf
) -> None:
    """Measures beside the plan's limits, the comparison, the verdict."""
    text = story_text(trace(lock_of(hives), "h117"), width=100)
    assert text.split("\n\n")[:3] == [
        "row h117: removed\n"
        "  R008: Row h117 leaves: without it a coefficient (of mites) moves by 1.31 standard errors, limit\n"
        "  1.00.",
        "Its measures\n"
        "                          Value       Limit   As written   Flagged\n"
        "  Cook's distance         0.190      0.0192   4/n          yes\n"
        "  leverage                0.110      0.115    3*p/n        no\n"
        "  studentized residual   -3.41       3.00     3            yes\n"
        "  DFFITS                 -1.20    none                     no",
        "Without it\n"
        "  R² changes by 0.00910 and the coefficient that moves most (mites) by 1.31 standard errors. No\n"
        "  significance and no sign changes. The row leaves.",
    ]


def test_levels_of_a_category_stand_under_each_other(hives: dict[str, Any], lock_of: LockOf) -> None:
    """A block has one line a level and its own p once a fit."""
    text = story_text(trace(lock_of(hives), "strain"), width=120)
    fit = [" ".join(line.split()) for line in text.split("\n") if line.startswith("  F006")]
    assert fit == [
        "F006 working model golden 207 3.9 1.0 3.79 <0.001 <0.001",
        "F006 working model grey 207 -0.4 1.1 -0.40 0.691",
    ]


@pytest.mark.parametrize("width", [60, 80, 100, 120, 140])
@pytest.mark.parametrize("subject", ["rain", "strain", "colony_age", "honey", "h117", "h005", "h020"])
def test_no_line_of_a_story_passes_the_edge(
    width: int, subject: str, hives: dict[str, Any], lock_of: LockOf
) -> None:
    """Every kind of story fits every screen."""
    lines = story_text(trace(lock_of(hives), subject), width=width).split("\n")
    assert [line for line in lines if cell_len(line) > width] == []
