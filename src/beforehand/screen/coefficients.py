"""The table of coefficients, and the same as a list where a terminal is too narrow for it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import beside, figure, p_text
from beforehand.screen.finding import outcome_unit, outcome_words, per
from beforehand.screen.layout import INDENT, Column, cells, on_point, shorten, shown, table, wrapped
from beforehand.screen.planned import PRODUCT, Planned

if TYPE_CHECKING:
    from beforehand.lock import Answer, AnswerTerm

# A name is shortened in its middle down to so many cells before a column is given up.
SHORTEST_NAME = 16
SHORTEST_UNIT = 8
EXACT = "The model fits without residuals, so there is no standard error, t, p or interval."


def coefficient_lines(answer: Answer, plan: Planned, width: int) -> tuple[str, ...]:
    """Every term with Coefficient, Standard error, t, p, interval and what it is per unit of.

    The predictors stand in plan order and the intercept last. Where the table does not fit, the
    units move to a line beneath it; where it still does not, each term takes lines of its own.
    """
    terms = [term for term in answer.terms if term.predictor is not None]
    terms += [term for term in answer.terms if term.predictor is None]
    names = tuple(shown(_name(term, plan)) for term in terms)
    units = tuple(shown(_unit(term, plan)) for term in terms)
    exact = bool(terms) and all(term.t is None for term in terms)
    numbers = _numbers(terms, plan)[: 1 if exact else None]
    wide = (
        Column(head="", texts=names, align="left", least=SHORTEST_NAME),
        *numbers,
        Column(head="Per", texts=units, align="left", least=SHORTEST_UNIT),
    )
    note = wrapped(EXACT, width) if exact else ()
    told = _units_told(names, units)
    units_below = wrapped(told, width) if told else ()
    for shortening in (False, True):
        drawn = table(wide, width, shortening=shortening)
        if drawn is not None:
            return (*drawn, *note)
        drawn = table(wide[:-1], width, shortening=shortening)
        if drawn is not None:
            return (*drawn, *units_below, *note)
    return (*_cards(names, units, numbers, width), *note)


def coefficient_scale(answer: Answer, plan: Planned) -> str:
    """In which unit the coefficients are, and which standard errors stand beside them."""
    unit = outcome_unit(answer, plan) or f"units of {outcome_words(answer)}"
    errors = "" if answer.errors == "classical" else f"; standard errors {errors_words(answer.errors)}"
    return f"in {unit} per unit of each predictor{errors}"


def errors_words(errors: str) -> str:
    """How standard errors were computed, in words."""
    if errors.lower().startswith("hc"):
        return f"robust to uneven spread ({errors.upper()})"
    return {
        "cluster": "robust to dependence within clusters",
        "autocorrelation": "robust to dependence in order",
    }.get(errors, errors)


def _name(term: AnswerTerm, plan: Planned) -> str:
    """A term for a table: the predictor, its transform or its level."""
    if term.predictor is None:
        return "intercept"
    if term.level is not None:
        if PRODUCT in term.predictor:
            return term.term
        return f"{term.predictor}: {term.level}"
    if term.transform in (None, "identity") or PRODUCT in term.predictor:
        return term.predictor
    words = str(term.transform).replace("_", " ")
    return (
        f"{term.predictor}, {words}"
        if term.exponent is None
        else f"{term.predictor}, power {figure(term.exponent)}"
    )


def _unit(term: AnswerTerm, plan: Planned) -> str:
    """What a coefficient is for one of; for a level, the level it is held against."""
    if term.predictor is None:
        return ""
    if term.level is not None and PRODUCT not in term.predictor:
        return f"against {plan.baselines.get(term.predictor, 'the baseline')}"
    return per(term, plan)


def _units_told(names: tuple[str, ...], units: tuple[str, ...]) -> str:
    """What each coefficient is for one of, as a sentence; empty where no unit is known."""
    told = [f"{name} {unit}" for name, unit in zip(names, units, strict=True) if unit not in ("", "unit")]
    return f"Per: {'; '.join(told)}." if told else ""


def _together(name: str, unit: str) -> str:
    """Name and unit in one, as ``load, per t``."""
    if not unit or unit == "unit":
        return name
    return f"{name}, {unit}" if unit.startswith(("against ", "as ")) else f"{name}, per {unit}"


def _numbers(terms: list[AnswerTerm], plan: Planned) -> tuple[Column, ...]:
    """The columns of numbers, each with as many digits as its standard error supports."""
    told = [beside((t.coefficient, t.standard_error, t.low, t.high), t.standard_error) for t in terms]
    adjusted = any(term.adjusted_p is not None for term in terms)
    intervals = _intervals([(row[2], row[3]) for row in told])
    columns = [
        Column(head="Coefficient", texts=on_point([row[0] for row in told])),
        Column(head="Standard error", texts=on_point([row[1] for row in told])),
        Column(head="t", texts=on_point([_t(term.t) for term in terms])),
        Column(head="p", texts=on_point([p_text(term.p, plan.alpha) for term in terms])),
    ]
    if adjusted:
        texts = ["" if t.adjusted_p is None else p_text(t.adjusted_p, plan.alpha) for t in terms]
        columns.append(Column(head="p adjusted", texts=on_point(texts)))
    columns.append(Column(head=f"{plan.level} interval", texts=intervals))
    return tuple(columns)


def _t(value: float | None) -> str:
    """A t with two decimals where it matters, fewer digits where it is large."""
    if value is None:
        return "none"
    return f"{value:.2f}" if abs(value) < 100 else figure(value)


def _intervals(ends: list[tuple[str, str]]) -> tuple[str, ...]:
    """``low to high`` with the ``to`` of all rows under each other."""
    lows, highs = on_point([pair[0] for pair in ends]), on_point([pair[1] for pair in ends])
    low = max(map(len, lows), default=0)
    high = max(map(len, highs), default=0)
    return tuple(
        "none" if "none" in pair else f"{first.rjust(low)} to {second.rjust(high)}"
        for pair, first, second in zip(ends, lows, highs, strict=True)
    )


def _cards(
    names: tuple[str, ...], units: tuple[str, ...], numbers: tuple[Column, ...], width: int
) -> tuple[str, ...]:
    """One term under the other, each with its numbers on lines of their own."""
    lines: list[str] = []
    for place, (name, unit) in enumerate(zip(names, units, strict=True)):
        lines.append(INDENT + shorten(_together(name, unit), width - len(INDENT)))
        line = INDENT
        for column in numbers:
            text = " ".join(column.texts[place].split())
            if not text:
                continue
            piece = f"{INDENT}{column.head} {text}"
            if cells(line + piece) > width and line.strip():
                lines.append(line)
                line = INDENT
            line += piece
        lines.append(line)
    return tuple(lines)
