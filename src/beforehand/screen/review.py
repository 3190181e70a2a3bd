"""What a check found: decisions left open, rules that never act, what the table allows."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from beforehand.screen.digits import count, figure, percent, trimmed
from beforehand.screen.layout import Section, labelled, page, wrapped

if TYPE_CHECKING:
    from beforehand.review import Finding, Review, Screening


def review_text(reviewed: Review, plan: str, *, width: int = 100, colour: bool = False) -> str:
    """A review as text.

    Parameters
    ----------
    reviewed : Review
        Of a plan without faults.
    plan : str
        Name of the plan's file.
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    screening = reviewed.screening
    found = [*reviewed.forks, *reviewed.dead_rules, *reviewed.unreachable, *reviewed.risks]
    found += screening.findings if screening is not None else ()
    cautions = sum(finding.severity == "caution" for finding in found)
    what = "the plan and its table" if screening is not None else "the plan; no table was read"
    summary = (
        f"No fault in {what}. {_counted(cautions, len(found) - cautions)} The outcome's values were not used."
    )
    sections = [Section(title=f"{plan} can be run", lines=wrapped(summary, width), tone="good")]
    if screening is not None:
        sections.append(Section(title="Rows and size", lines=_size(screening, width)))
    for title, findings in (
        ("Decisions left open", reviewed.forks),
        ("Rules that never act", reviewed.dead_rules),
        ("Branches that no run comes to", reviewed.unreachable),
        ("Rules that can mislead", reviewed.risks),
        ("The table under this plan", screening.findings if screening is not None else ()),
    ):
        sections.append(Section(title=title, lines=_findings(findings, width)))
    return page([section for section in sections if section.lines], colour=colour)


def _counted(cautions: int, notes: int) -> str:
    """How much a reviewer has to read."""
    if not cautions and not notes:
        return "Nothing to remark."
    parts = [count(cautions, "caution")] * bool(cautions) + [count(notes, "note")] * bool(notes)
    return f"{' and '.join(parts)}."


def _findings(findings: Sequence[Finding], width: int) -> tuple[str, ...]:
    """One labelled line a finding, cautions first."""
    ordered = sorted(findings, key=lambda finding: finding.severity != "caution")
    return labelled([(one.severity, _about(one)) for one in ordered], width)


def _about(finding: Finding) -> str:
    """The clause and what is said of it, the clause once."""
    says, clause = finding.says, finding.clause
    return says if says.startswith(clause) else f"{clause}: {says}"


def _size(screening: Screening, width: int) -> tuple[str, ...]:
    """Rows at each stage, coefficients, and the smallest effect that can be shown."""
    pairs = [
        (
            "Rows",
            f"{screening.read:,} read, {screening.eligible:,} eligible, "
            f"{screening.with_outcome:,} with an outcome, {screening.complete:,} complete",
        )
    ]
    each = screening.rows_per_coefficient
    size = count(screening.n_coefficients, "coefficient")
    pairs.append(("Full model", size if each is None else f"{size}, {figure(each)} rows for each"))
    effect = screening.detectable
    if effect is not None:
        text = (
            f"explains {percent(effect.share_of_remaining)} of what the others leave "
            f"(power {figure(effect.power, 2)} at alpha {trimmed(effect.alpha)})"
        )
        if effect.per_sd is not None:
            text += f": {figure(effect.per_sd)} in the outcome for one standard deviation of a predictor"
        pairs.append(("Smallest effect shown", text))
        if effect.rows_needed is not None:
            pairs.append(("Rows needed", f"{effect.rows_needed:,} for the smallest effect that matters"))
    return labelled(pairs, width)
