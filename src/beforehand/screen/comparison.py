"""Two plans or two records side by side, for a terminal."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from beforehand.comparing.sentences import FIGURE_WORDS, facts, summary
from beforehand.screen.digits import beside, count, figure, percent
from beforehand.screen.layout import (
    INDENT,
    Column,
    Section,
    Tone,
    labelled,
    on_point,
    page,
    shown,
    table,
    wrapped,
)

if TYPE_CHECKING:
    from beforehand.comparing import Change, CoefficientPair, Comparison, Figure, Grade, LockComparison

# A term is shortened in its middle down to so many cells before the table becomes a list.
SHORTEST_TERM = 16
# The headings under which changes stand, the one that a reviewer looks at first on top.
HEADINGS: dict[Grade, tuple[str, Tone]] = {
    "looser": ("Looser", "careful"),
    "different": ("Different", "plain"),
    "stricter": ("Stricter", "plain"),
    "wording": ("Wording", "plain"),
}
SHARES = ("r_squared", "adjusted_r_squared", "predicted_r_squared")


def comparison_text(compared: Comparison, *, width: int = 100, colour: bool = False) -> str:
    """A comparison as text: what changed, grade by grade, then the two records.

    Parameters
    ----------
    compared : Comparison
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    title = f"{shown(compared.old)} to {shown(compared.new)}"
    tone: Tone = "good" if compared.same else "plain"
    sections = [Section(title=title, lines=wrapped(summary(compared), width), tone=tone)]
    for grade, (heading, tone) in HEADINGS.items():
        changes = [change for change in compared.changes if change.grade == grade]
        if changes:
            told = f"{heading}: {count(len(changes), 'change')}"
            sections.append(Section(title=told, lines=_changes(changes, width), tone=tone))
    if compared.locks is not None and not compared.locks.same:
        sections += _records(compared.locks, width)
    return page(sections, colour=colour)


def _changes(changes: Sequence[Change], width: int) -> tuple[str, ...]:
    """One sentence a change; the grade stands in the heading already."""
    lines: list[str] = []
    for change in changes:
        says = change.says.removesuffix(f": {change.grade}.") + "."
        lines += wrapped(says, width, rest=INDENT * 2)
    return tuple(lines)


def _records(locks: LockComparison, width: int) -> list[Section]:
    """What differs between the two records, in words and in numbers."""
    pairs = [(fact.label, fact.says) for fact in facts(locks)]
    sections = [Section(title="The two records", lines=labelled(pairs, width))]
    if locks.coefficients:
        lines = _coefficients(locks.coefficients, width)
        sections.append(Section(title="Coefficients, and their shift in old standard errors", lines=lines))
    if locks.figures:
        sections.append(Section(title="How well they fit", lines=_fit(locks.figures, width)))
    return sections


def _coefficients(pairs: Sequence[CoefficientPair], width: int) -> tuple[str, ...]:
    """The two tables side by side, or one term under the other where the screen is narrow."""
    terms = tuple(shown(pair.term) for pair in pairs)
    old = on_point([_beside(pair.old, pair.old_error) for pair in pairs])
    new = on_point([_beside(pair.new, pair.new_error) for pair in pairs])
    shifts = tuple(_shift(pair) for pair in pairs)
    drawn = table(
        (
            Column(head="", texts=terms, align="left", least=SHORTEST_TERM),
            Column(head="Before", texts=old),
            Column(head="Now", texts=new),
            Column(head="Shift", texts=shifts),
        ),
        width,
    )
    if drawn is not None:
        return drawn
    told = zip(terms, old, new, shifts, strict=True)
    return labelled([(term, f"{a.strip()} to {b.strip()}, {shift}") for term, a, b, shift in told], width)


def _beside(value: float | None, error: float | None) -> str:
    """A coefficient with as many digits as its standard error supports."""
    return "none" if value is None else beside((value,), error)[0]


def _shift(pair: CoefficientPair) -> str:
    """The shift, or why there is none."""
    return pair.why or "none" if pair.shift is None else f"{pair.shift:+.2f}"


def _fit(figures: Sequence[Figure], width: int) -> tuple[str, ...]:
    """One labelled line a figure."""
    pairs = []
    for one in figures:
        old, new = (_figure(one.name, value) for value in (one.old, one.new))
        pairs.append(
            (
                FIGURE_WORDS[one.name],
                f"{old}, as before" if one.old == one.new else f"{old} before, {new} now",
            )
        )
    return labelled(pairs, width)


def _figure(name: str, value: float | None) -> str:
    """One figure: a share in percent, rows whole, an error with three digits."""
    if value is None:
        return "none"
    if name in SHARES:
        return percent(value)
    return f"{int(value):,}" if name == "rows" else figure(value)
