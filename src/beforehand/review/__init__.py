"""The review of a plan before it is run: open decisions, dead rules, and what a table allows.

A review never looks at the outcome beyond counting its missing cells, so that it may be made, and
answered in the plan, before anything is known of the result.
"""

from __future__ import annotations

from dataclasses import dataclass

from beforehand.plan import Plan
from beforehand.review.columns import Columns, Commonest, Determined, LevelCount, Related
from beforehand.review.findings import Finding
from beforehand.review.forks import open_forks
from beforehand.review.idle import dead_rules
from beforehand.review.risks import misleading_rules
from beforehand.review.screening import MissingShare, Screening, screened
from beforehand.review.size import ColumnCount, Detectable, Overlap
from beforehand.review.unreachable import unreachable_branches
from beforehand.table import Table

__all__ = [
    "ColumnCount",
    "Columns",
    "Commonest",
    "Detectable",
    "Determined",
    "Finding",
    "LevelCount",
    "MissingShare",
    "Overlap",
    "Related",
    "Review",
    "Screening",
    "findings_of",
    "review",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Review:
    """Everything that a reviewer should know before a plan is run.

    Attributes
    ----------
    forks : tuple of Finding
        Decisions that the plan leaves open.
    dead_rules : tuple of Finding
        Clauses that are written and can never act.
    unreachable : tuple of Finding
        Branches that no run of the plan can come to.
    risks : tuple of Finding
        Rules that act as written and are known to mislead.
    screening : Screening or None
        What a table allows under the plan; None without a table.
    """

    forks: tuple[Finding, ...]
    dead_rules: tuple[Finding, ...]
    unreachable: tuple[Finding, ...]
    risks: tuple[Finding, ...]
    screening: Screening | None


def review(plan: Plan, table: Table | None = None) -> Review:
    """Review a plan, and what a table allows under it.

    Parameters
    ----------
    table : Table or None
        As read under this plan. The values of its outcome change nothing in the review.
    """
    return Review(
        forks=open_forks(plan),
        dead_rules=dead_rules(plan),
        unreachable=unreachable_branches(plan),
        risks=misleading_rules(plan),
        screening=None if table is None else screened(plan, table),
    )


def findings_of(reviewed: Review) -> tuple[Finding, ...]:
    """Every finding of a review, those of the plan first, in its own order."""
    return (
        *reviewed.forks,
        *reviewed.dead_rules,
        *reviewed.unreachable,
        *reviewed.risks,
        *(reviewed.screening.findings if reviewed.screening is not None else ()),
    )
