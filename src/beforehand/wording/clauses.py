"""Parts of sentences that several rulings share: a p against its limit, what called a pair up."""

from __future__ import annotations

from collections.abc import Callable

from beforehand.steps.rulings import Ruling
from beforehand.wording.phrases import CHECK_WORDS, RUNG_WORDS, limit_text, number, p_value


def against(ruling: Ruling) -> str:
    """The p of a ruling and the limit it passes, as ``0.412 is above 0.05``."""
    p = ruling.evidence.get("p")
    if not isinstance(p, int | float) or ruling.limit is None:
        return "its p is not available"
    return f"p {_p_against(p, ruling.limit)}"


def _p_against(p: float, limit: float) -> str:
    side = "above" if p > limit else "not above"
    shown = p_value(p)
    if shown == "below 0.001":
        return (
            f"below 0.001 is not above {limit_text(limit)}"
            if p <= limit
            else f"{p:.3g} is above {limit_text(limit)}"
        )
    if float(shown) == round(limit, 3) and p != limit:
        shown = f"{p:.6g}"
    return f"{shown} is {side} {limit_text(limit)}"


def checks(ruling: Ruling) -> str:
    """The checks of a ruling with their p, as ``the curvature check gives p 0.003``."""
    named = [(key[2:], value) for key, value in ruling.evidence.items() if key.startswith("p_")]
    parts = [
        f"{CHECK_WORDS.get(name, name)} gives p {p_value(value)}"
        if value is not None
        else f"{CHECK_WORDS.get(name, name)} cannot be made"
        for name, value in named
    ]
    limit = "" if ruling.limit is None else f" (limit {limit_text(ruling.limit)})"
    return (" and ".join(parts) + limit) if parts else "no check is declared"


def pair_words(ruling: Ruling) -> str:
    """What called a pair up."""
    evidence = ruling.evidence
    partner = evidence.get("partner")
    if "correlation" in evidence:
        return f"its correlation with {partner} is {number(evidence['correlation'])}"
    if "vif" in evidence:
        return f"beside {partner} the largest variance inflation is {number(evidence['vif'])}"
    return f"it and {partner} share one signal (correlation {number(evidence.get('r'))})"


def filling(value: object) -> str:
    """What a missing cell is filled with: a number of the plan's or the table's, or a level."""
    return value if isinstance(value, str) else limit_text(value)


def rung_words(ruling: Ruling) -> str:
    """The rung of a ruling, as ``as its square root``."""
    words = RUNG_WORDS.get(str(ruling.evidence.get("rung")), str(ruling.evidence.get("rung")))
    exponent = ruling.evidence.get("exponent")
    return words if exponent is None else f"{words} of {number(exponent)}"


def _change(ruling: Ruling) -> str:
    evidence = ruling.evidence
    of = evidence.get("of")
    moved = evidence.get("change_coefficient")
    tail = f" (of {of})" if of else ""
    return (
        f"R² changes by {number(abs(float(str(evidence.get('change_r_squared') or 0.0))))} "
        f"and a coefficient by {number(moved)} standard errors{tail}"
    )


Sentence = Callable[[Ruling], str]


def say(template: str) -> Sentence:
    """A sentence with the subject only."""
    return lambda ruling: template.format(s=ruling.subject)


def p_says(template: str) -> Sentence:
    """A sentence with the subject and its p against the limit."""
    return lambda ruling: template.format(s=ruling.subject, p=against(ruling))


def pair_says(template: str) -> Sentence:
    """A sentence about one of a pair."""

    def say(ruling: Ruling) -> str:
        evidence = ruling.evidence
        return template.format(
            s=ruling.subject,
            partner=evidence.get("partner"),
            pair=pair_words(ruling),
            p=p_value(evidence.get("p")),
            alone=p_value(evidence.get("p_alone")),
            partner_alone=p_value(evidence.get("p_partner_alone")),
            partner_p=p_value(evidence.get("p_partner")),
            change=_change(ruling) if "change_r_squared" in evidence else "",
        )

    return say


def dependence_words(ruling: Ruling) -> str:
    """The combination that determines a column."""
    weights = [
        f"{number(value, 6)} × {name.removeprefix('weight of ')}"
        for name, value in ruling.evidence.items()
        if name.startswith("weight of ")
    ]
    if not weights:
        return "one level only"
    return f"{ruling.evidence.get('column')} = " + " + ".join(weights)
