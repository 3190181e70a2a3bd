from __future__ import annotations

import pytest
from rich.cells import cell_len

from beforehand.review import Detectable, Finding, Review, Screening
from beforehand.review.columns import NO_COLUMNS
from beforehand.screen.review import review_text

FORK = Finding(code="fork", clause="purpose", says="The plan does not say what for.", severity="note")
RISK = Finding(
    code="risk",
    clause="influence.remove_when",
    says="Removing rows on changed signs misleads.",
    severity="caution",
)
IN_TABLE = Finding(code="rare", clause="predictors[2]", says="grey has 3 rows.", severity="note")


def screening(*, detectable: Detectable | None, findings: tuple[Finding, ...] = ()) -> Screening:
    """What a table of 220 rows allows."""
    return Screening(
        ledger=(),
        read=220,
        eligible=214,
        with_outcome=212,
        complete=208,
        missing=(),
        coefficients=(),
        n_coefficients=9,
        rows_per_coefficient=208 / 9,
        columns=NO_COLUMNS,
        detectable=detectable,
        findings=findings,
    )


def review(table: Screening | None, *findings: Finding) -> Review:
    """A review with these findings under the heading of their kind."""
    return Review(
        forks=tuple(one for one in findings if one is FORK),
        dead_rules=(),
        unreachable=(),
        risks=tuple(one for one in findings if one is RISK),
        screening=table,
    )


def test_a_plan_without_remarks_takes_two_lines() -> None:
    """Nothing to say is said shortly."""
    assert review_text(review(None), "hives.plan.yaml") == (
        "hives.plan.yaml can be run\n"
        "  No fault in the plan; no table was read. Nothing to remark. The outcome's values were not used.\n"
    )


def test_findings_stand_under_their_kind_with_the_clause_they_are_about() -> None:
    """What a reviewer should know, cautions named as such, with what the table allows."""
    effect = Detectable(
        alpha=0.05,
        power=0.8,
        n=208,
        p=9,
        partial_f2=0.0389,
        share_of_remaining=0.0374,
        per_sd=1.02,
        by_predictor=(),
        rows_needed=61,
    )
    table = screening(detectable=effect, findings=(IN_TABLE,))
    assert review_text(review(table, FORK, RISK), "hives.plan.yaml") == (
        "hives.plan.yaml can be run\n"
        "  No fault in the plan and its table. 1 caution and 2 notes. The outcome's values were not used.\n"
        "\n"
        "Rows and size\n"
        "  Rows                    220 read, 214 eligible, 212 with an outcome, 208 complete\n"
        "  Full model              9 coefficients, 23.1 rows for each\n"
        "  Smallest effect shown   explains 3.7 % of what the others leave (power 0.80 at alpha 0.05): 1.02\n"
        "                          in the outcome for one standard deviation of a predictor\n"
        "  Rows needed             61 for the smallest effect that matters\n"
        "\n"
        "Decisions left open\n"
        "  note   purpose: The plan does not say what for.\n"
        "\n"
        "Rules that can mislead\n"
        "  caution   influence.remove_when: Removing rows on changed signs misleads.\n"
        "\n"
        "The table under this plan\n"
        "  note   predictors[2]: grey has 3 rows.\n"
    )


@pytest.mark.parametrize("width", [60, 80, 100, 140])
def test_no_line_of_a_review_passes_the_edge(width: int) -> None:
    """Every screen fits."""
    text = review_text(review(screening(detectable=None), FORK, RISK), "hives.plan.yaml", width=width)
    assert [line for line in text.split("\n") if cell_len(line) > width] == []
