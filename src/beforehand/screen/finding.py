"""The key finding: the equation in words, with units, one sentence a predictor."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from beforehand.screen.digits import beside, figure, listed, p_phrase
from beforehand.screen.layout import wrapped
from beforehand.screen.planned import PRODUCT, Planned

if TYPE_CHECKING:
    from beforehand.lock import Answer, AnswerTerm

# One screen has room for so many sentences; the table beneath has every predictor.
MOST_SENTENCES = 5
# A category with more columns than this is told by its two ends.
MOST_LEVELS = 3
# A change by less than this is told on the scale of the model only.
SMALLEST_RATIO = 1e-4
HELD_FIXED = "the other predictors held fixed"

_TRANSFORMED = {
    "square": "the square of {name}",
    "cube": "the cube of {name}",
    "square_root": "the square root of {name}",
    "cube_root": "the cube root of {name}",
    "log": "the natural logarithm of {name}",
    "reciprocal": "the reciprocal of {name}",
}


def key_finding(answer: Answer, plan: Planned, width: int) -> tuple[str, ...]:
    """Lines of the key finding: focal predictors first, then the strongest, the unclear last.

    Parameters
    ----------
    answer : Answer
        An answer with at least one predictor.
    width : int
        Cells of a line.
    """
    blocks = ranked(answer, plan)
    said = blocks[:MOST_SENTENCES]
    held = f", {HELD_FIXED}" if len(blocks) > 1 else ""
    lines: list[str] = []
    for place, block in enumerate(said):
        said_so = predictor_sentence(block, answer, plan, held if not place else "")
        # A name keeps its letters at the start of a sentence; only an article is made large.
        lines += wrapped("The " + said_so[4:] if said_so.startswith("the ") else said_so, width)
    left = len(blocks) - len(said)
    if left:
        what = "predictor follows" if left == 1 else "predictors follow"
        lines += wrapped(f"{left} more {what} in the table.", width)
    return tuple(lines)


def ranked(answer: Answer, plan: Planned) -> list[list[AnswerTerm]]:
    """The terms of each predictor, in the order in which a reader wants them."""
    blocks: dict[str, list[AnswerTerm]] = {}
    for term in answer.terms:
        if term.predictor is not None:
            blocks.setdefault(term.predictor, []).append(term)

    def rank(block: Sequence[AnswerTerm]) -> tuple[bool, bool, float, int]:
        name = block[0].predictor
        size = max(abs(term.standardized or 0.0) for term in block)
        return (
            not shows(block, answer, plan),
            plan.roles.get(name or "") != "focal",
            -size,
            plan.place(name),
        )

    return sorted(blocks.values(), key=rank)


def shows(block: Sequence[AnswerTerm], answer: Answer, plan: Planned) -> bool:
    """Whether a predictor's p is at or below alpha; without p (an exact fit) it counts as shown."""
    p = predictor_p(block, answer)
    return p is None or p <= plan.alpha


def predictor_p(block: Sequence[AnswerTerm], answer: Answer) -> float | None:
    """The p of a predictor as a whole: its block's where it has several columns."""
    name = block[0].predictor
    return next((entry.p for entry in answer.predictors if entry.predictor == name), block[0].p)


def predictor_sentence(block: Sequence[AnswerTerm], answer: Answer, plan: Planned, held: str) -> str:
    """One predictor in words; ``held`` is what stands before the full stop of the first sentence."""
    term = block[0]
    if not shows(block, answer, plan):
        p = p_phrase(predictor_p(block, answer), plan.alpha)
        if len(block) > 1:
            return f"{term.predictor}: no clear difference between its levels ({p})."
        return f"{_subject(term, plan)}: no clear relation ({p})."
    if term.level is not None and PRODUCT not in (term.predictor or ""):
        return _category(block, answer, plan, held)
    return _slope(term, answer, plan, held)


def per(term: AnswerTerm, plan: Planned) -> str:
    """What a coefficient is for one of: ``°C``, ``(°C)²``, ``log of t``; empty where it has no unit."""
    name = term.predictor or ""
    if term.predictor is None or term.level is not None:
        return ""
    if PRODUCT in name:
        if term.transform not in (None, "identity"):
            return "as transformed"
        parts = [plan.units.get(part, "unit") for part in name.split(PRODUCT)]
        return " × ".join(parts) if parts != ["unit"] * len(parts) else "unit"
    unit = plan.units.get(name, "unit")
    return {
        None: unit,
        "identity": unit,
        "square": f"{_bracketed(unit)}²",
        "cube": f"{_bracketed(unit)}³",
        "square_root": f"√{_bracketed(unit)}",
        "cube_root": f"∛{_bracketed(unit)}",
        "log": f"log {unit}",
        "reciprocal": f"1/{_bracketed(unit)}",
    }.get(term.transform, f"{_bracketed(unit)}^{figure(term.exponent)}")


def _bracketed(unit: str) -> str:
    return unit if unit.isalpha() else f"({unit})"


def _subject(term: AnswerTerm, plan: Planned) -> str:
    """A predictor as it stands in the model."""
    name = term.predictor or term.term
    if PRODUCT in name:
        level = f", {term.level}" if term.level is not None else ""
        as_is = "" if term.transform in (None, "identity") else " as they stand in the model"
        return f"the product of {listed(name.split(PRODUCT))}{as_is}{level}"
    if term.transform in (None, "identity"):
        return name
    words = _TRANSFORMED.get(str(term.transform))
    if words is None:
        return f"{name} under the Box-Cox power {figure(term.exponent)}"
    unit = plan.units.get(name)
    return words.format(name=f"{name} (in {unit})" if unit else name)


def outcome_words(answer: Answer) -> str:
    """The outcome on the scale of the model."""
    outcome = answer.outcome
    if outcome.transform == "identity":
        return outcome.column
    words = _TRANSFORMED.get(outcome.transform)
    if words is None:
        return f"{outcome.column} under the Box-Cox power {figure(outcome.exponent)}"
    return words.format(name=outcome.column)


def outcome_unit(answer: Answer, plan: Planned) -> str:
    """The outcome's unit where the model is on the outcome's own scale; empty otherwise."""
    return (answer.outcome.unit or plan.unit) if answer.outcome.transform == "identity" else ""


def _amount(text: str, answer: Answer, plan: Planned) -> str:
    """A number with the outcome's unit."""
    unit = outcome_unit(answer, plan)
    return f"{text} {unit}" if unit else text


def _slope(term: AnswerTerm, answer: Answer, plan: Planned, held: str) -> str:
    """A predictor of one column: by how much the outcome moves for one unit of it."""
    name = term.predictor or term.term
    size = beside((abs(term.coefficient),), term.standard_error)[0]
    direction = "up" if term.coefficient > 0 else "down"
    straight = term.transform in (None, "identity") and PRODUCT not in name
    unit = plan.units.get(name, "unit") if straight else "unit"
    return (
        f"{outcome_words(answer)} goes {direction} by {_amount(size, answer, plan)} for each {unit} of "
        f"{_subject(term, plan)}{_where(name, answer)}{held}{_ratio(term, answer)}."
    )


def _where(name: str, answer: Answer) -> str:
    """At which value of its partner a slope holds, for a part of a product in the model."""
    partners = [
        other
        for term in answer.terms
        if term.predictor and PRODUCT in term.predictor and name in term.predictor.split(PRODUCT)
        for other in term.predictor.split(PRODUCT)
        if other != name
    ]
    if not partners:
        return ""
    categories = {term.predictor for term in answer.terms if term.level is not None}
    values = [
        f"{other} is at its baseline" if other in categories else f"{other} is 0"
        for other in dict.fromkeys(partners)
    ]
    return f" where {listed(values)}"


def _ratio(term: AnswerTerm, answer: Answer) -> str:
    """What a slope on a logarithm means on the outcome's own scale."""
    if answer.outcome.transform != "log" or abs(term.coefficient) > math.log(1000.0):
        return ""
    change = math.expm1(term.coefficient)
    if abs(change) < SMALLEST_RATIO:
        return ""
    direction = "up" if change > 0 else "down"
    return f"; {answer.outcome.column} itself goes {direction} by {figure(100 * abs(change))} %"


def _category(block: Sequence[AnswerTerm], answer: Answer, plan: Planned, held: str) -> str:
    """A category: every level against the baseline, or the two ends where there are many."""
    name = block[0].predictor or ""
    baseline = plan.baselines.get(name, "the baseline")
    clear = [term for term in block if term.p is None or term.p <= plan.alpha]
    unclear = [str(term.level) for term in block if term not in clear]
    if not clear:
        return f"{name}: its levels differ as a whole, none clearly from {baseline}{held}."
    chosen = sorted(clear, key=lambda term: term.coefficient)
    ends = len(chosen) > MOST_LEVELS
    if ends:
        chosen = [chosen[0], chosen[-1]]
    parts = []
    for term in chosen:
        size = beside((abs(term.coefficient),), term.standard_error)[0]
        way = "higher" if term.coefficient > 0 else "lower"
        parts.append(f"{_amount(size, answer, plan)} {way} with {term.level}")
    tail = f", the two ends of {len(clear)} levels" if ends else ""
    rest = f"; no clear difference with {listed(unclear, MOST_LEVELS)}" if unclear else ""
    return (
        f"Against {name} {baseline}, {outcome_words(answer)} is {listed(parts)}{tail}"
        f"{_where(name, answer)}{held}{rest}."
    )
