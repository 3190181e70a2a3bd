"""What a careful reader looks at twice: contradictions, near misses, knife edges, fragility."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import count, figure, listed, p_phrase
from beforehand.screen.layout import labelled
from beforehand.screen.planned import Planned

if TYPE_CHECKING:
    from beforehand.lock import Answer, Lock

MOST_NEAR_MISSES = 8
MOST_KNIFE_EDGES = 5


def doubt_lines(lock: Lock, answer: Answer, plan: Planned, width: int) -> tuple[str, ...]:
    """One labelled line a doubt; nothing where there is none."""
    return labelled(
        [
            *_signs(answer, plan),
            *_turned(answer, plan),
            *_near_misses(answer, plan),
            *_knife_edges(lock, answer),
            *_fragility(lock, answer),
        ],
        width,
    )


def _signs(answer: Answer, plan: Planned) -> list[tuple[str, str]]:
    """Coefficients whose sign contradicts what the plan expects."""
    pairs = []
    for entry in answer.sign_contradictions:
        reason = f" The plan expects it because: {entry.because}" if entry.because else ""
        text = (
            f"{entry.predictor} should be {entry.expected} and is {figure(entry.coefficient)} "
            f"({p_phrase(entry.p, plan.alpha)}).{reason}"
        )
        pairs.append(("Against expectation", text))
    return pairs


def _turned(answer: Answer, plan: Planned) -> list[tuple[str, str]]:
    """Predictors whose coefficient changes sign between standing alone and in the model."""
    adjusted = {
        term.predictor: term.coefficient for term in answer.terms if term.predictor and term.level is None
    }
    pairs = []
    for entry in answer.predictors:
        alone, beside_others = entry.alone, adjusted.get(entry.predictor)
        if alone is None or alone.coefficient is None or beside_others is None or alone.p is None:
            continue
        if alone.coefficient * beside_others < 0 and alone.p <= plan.alpha:
            text = (
                f"{entry.predictor}: {figure(alone.coefficient)} alone ({p_phrase(alone.p, plan.alpha)}), "
                f"{figure(beside_others)} beside the others."
            )
            pairs.append(("Turns its sign", text))
    return pairs


def _near_misses(answer: Answer, plan: Planned) -> list[tuple[str, str]]:
    """Predictors near alpha, with the sample that each would need."""
    pairs = []
    for miss in answer.near_misses[:MOST_NEAR_MISSES]:
        needs = (
            "no sample of a practical size would show an effect so small"
            if miss.rows_needed is None
            else f"its effect would need {count(miss.rows_needed, 'row')} to show, here are {answer.rows:,}"
        )
        pairs.append(("Near miss", f"{miss.predictor}: {p_phrase(miss.p, plan.alpha)}; {needs}."))
    left = len(answer.near_misses) - MOST_NEAR_MISSES
    if left > 0:
        pairs.append(("Near miss", f"{left} more in the record."))
    return pairs


def _knife_edges(lock: Lock, answer: Answer) -> list[tuple[str, str]]:
    """Rulings that rounding alone could turn."""
    says = {ruling.id: ruling.says for ruling in lock.rulings}
    pairs = [
        ("Knife edge", f"{number}: {says.get(number, '')}")
        for number in answer.knife_edges[:MOST_KNIFE_EDGES]
    ]
    left = answer.knife_edges[MOST_KNIFE_EDGES:]
    if left:
        pairs.append(("Knife edge", f"Also {listed(left, 10)}."))
    return pairs


def _fragility(lock: Lock, answer: Answer) -> list[tuple[str, str]]:
    """The ruling with the smallest margin; in short where its sentence stands further up."""
    fragile = answer.fragility
    if fragile is None:
        return []
    told = {entry.ruling for entry in lock.predictors.values() if entry.verdict == "removed"}
    told |= {entry.ruling for entry in lock.rows_removed} | set(answer.knife_edges)
    text = f"{fragile.ruling}, {figure(100 * fragile.margin)} % of its limit away"
    if fragile.ruling in told:
        return [("Nearest to flipping", f"{text}.")]
    says = next((ruling.says for ruling in lock.rulings if ruling.id == fragile.ruling), fragile.says)
    return [("Nearest to flipping", f"{text}: {says}")]
