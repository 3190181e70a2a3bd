"""The story of one predictor or row: how it ended, ruling by ruling, fit by fit."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from beforehand.screen.digits import beside, figure, listed, p_text, trimmed
from beforehand.screen.layout import (
    INDENT,
    Column,
    Section,
    Tone,
    labelled,
    on_point,
    page,
    shorten,
    shown,
    table,
    wrapped,
)

if TYPE_CHECKING:
    from beforehand.lock import InfluenceRow
    from beforehand.lock.story import Entry, Flag, Standing, Story

# Evidence is told with a digit more than a sentence has.
EVIDENCE_DIGITS = 4
SHORTEST_TEXT = 14

_VERDICTS = {"in_model": "in a model that is not adopted"}
_ROLES = {
    "partner": "as its partner",
    "part": "about its part",
    "member": "as one of several",
}


def story_text(story: Story, *, beside: Sequence[str] = (), width: int = 100, colour: bool = False) -> str:
    """A story as text.

    Parameters
    ----------
    story : Story
    beside : sequence of str
        What a rehearsal says of the same predictor, or what else a reader should know.
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    ended = _ended(story)
    name = f"row {story.subject}" if story.kind == "row" else story.subject
    first, *rest = wrapped(f"{name}: {ended}", width, first="")
    tone: Tone = "careful" if story.verdict == "removed" else "good"
    head = Section(title=first, lines=(*rest, *_head(story, width)), tone=tone)
    sections = [
        head,
        Section(title="Its measures", lines=_flags(story.flags, width)),
        Section(title="Without it", lines=_without(story.measures, width)),
        Section(title="Ruling by ruling", lines=_entries(story.entries, width)),
        Section(title="Fit by fit", lines=standing_lines(story.fits, width)),
        Section(
            title="In the alternatives",
            lines=labelled([(other.alternative, other.says) for other in story.alternatives], width),
        ),
        Section(title="Beside it", lines=tuple(line for text in beside for line in wrapped(text, width))),
    ]
    return page([section for section in sections if section.lines or section is head], colour=colour)


def _ended(story: Story) -> str:
    """How it ended, in a few words."""
    if story.kind == "outcome":
        scale = story.verdict.replace("_", " ")
        return "fitted on its own scale" if scale == "identity" else f"fitted under {scale}"
    return _VERDICTS.get(story.verdict, story.verdict.replace("_", " "))


def _head(story: Story, width: int) -> tuple[str, ...]:
    """How it ended, as what it stood, and what it belongs to."""
    decided = f"{story.ruling}: {story.says}" if story.ruling else story.says
    lines = list(wrapped(decided, width)) if decided else []
    if story.transform not in (None, "identity") and story.kind != "outcome":
        lines += wrapped(f"It stands under the transform {str(story.transform).replace('_', ' ')}.", width)
    if story.parts:
        lines += wrapped(f"It is the product of {listed(story.parts)}.", width)
    if story.products:
        lines += wrapped(f"It is a part of {listed(story.products)}.", width)
    for group in story.groups:
        lines += wrapped(f"A rule keeps at least one of {listed(group)}.", width)
    return tuple(lines)


def _entries(entries: Sequence[Entry], width: int) -> tuple[str, ...]:
    """Every ruling with its clause, evidence, limit, margin and reason."""
    lines: list[str] = []
    for entry in entries:
        lines += wrapped(entry.says, width, first=f"{INDENT}{entry.ruling:<4}{INDENT}")
        rest = " " * (len(INDENT) * 2 + max(4, len(entry.ruling)))
        role = _ROLES.get(entry.role)
        where = f"{entry.step}, {entry.clause}" + (f", {role}" if role else "")
        fits = f"; {', '.join(standing.fit for standing in entry.fits)}" if entry.fits else ""
        lines += wrapped(f"{where}{fits}", width, first=rest)
        evidence = _evidence(entry.evidence)
        if evidence:
            lines += wrapped(evidence, width, first=rest)
        if entry.limit is not None and entry.margin is not None:
            edge = ", a knife edge" if entry.knife_edge else ""
            limits = f"limit {trimmed(entry.limit)}, margin {figure(entry.margin)}{edge}"
            lines += wrapped(limits, width, first=rest)
        if entry.because and entry.because not in entry.says:
            lines += wrapped(f"because: {entry.because}", width, first=rest)
    return tuple(lines)


def _evidence(evidence: Mapping[str, object]) -> str:
    """Named numbers in the order of the record."""
    return ", ".join(
        f"{name.replace('_', ' ')} {_told(name, value)}"
        for name, value in evidence.items()
        if value is not None and value != ""
    )


def _told(name: str, value: object) -> str:
    """One piece of evidence."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, int):
        return f"{value:,}"
    if isinstance(value, float):
        return p_text(value) if name == "p" or name.startswith("p_") else figure(value, EVIDENCE_DIGITS)
    return str(value)


def standing_lines(fits: Sequence[Standing], width: int) -> tuple[str, ...]:
    """A coefficient through the fits in which it stood; one line a coefficient and fit."""
    rows = [(standing, term) for standing in fits for term in standing.terms]
    if not rows:
        return ()
    told = [beside((term.coefficient, term.standard_error), term.standard_error) for _, term in rows]
    several = len({term.term for _, term in rows}) > 1
    blocks = [standing.p for standing in fits if len(standing.terms) > 1]
    columns = [
        Column(head="Fit", texts=tuple(standing.fit for standing, _ in rows), align="left"),
        Column(
            head="Why",
            texts=tuple(shown(standing.why) for standing, _ in rows),
            align="left",
            least=SHORTEST_TEXT,
        ),
        Column(head="Rows", texts=tuple(f"{standing.rows:,}" for standing, _ in rows)),
        Column(head="Coefficient", texts=on_point([pair[0] for pair in told])),
        Column(head="Standard error", texts=on_point([pair[1] for pair in told])),
        Column(head="t", texts=on_point([_t(term.t) for _, term in rows])),
        Column(head="p", texts=on_point([p_text(term.p) for _, term in rows])),
    ]
    if blocks:
        texts = [p_text(standing.p) if term is standing.terms[0] else "" for standing, term in rows]
        columns.append(Column(head="p as a whole", texts=on_point(texts)))
    if several:
        names = tuple(shown(term.level or term.term) for _, term in rows)
        columns.insert(2, Column(head="Of", texts=names, align="left", least=SHORTEST_TEXT // 2))
    numbers = [column for column in columns if column.head != "Why"]
    drawn = table(columns, width) or table(numbers, width)
    return drawn if drawn is not None else _cards(columns, width)


def _cards(columns: Sequence[Column], width: int) -> tuple[str, ...]:
    """The rows of a table that does not fit, each in words."""
    lines: list[str] = []
    for place in range(len(columns[0].texts)):
        told = [f"{column.head} {' '.join(column.texts[place].split())}" for column in columns[1:]]
        lines += wrapped(
            f"{columns[0].texts[place]}: {', '.join(told)}", width, first=INDENT, rest=INDENT * 2
        )
    return tuple(lines)


def _t(value: float | None) -> str:
    """A t with two decimals where they matter."""
    return "none" if value is None else f"{value:.2f}" if abs(value) < 100 else figure(value)


def _flags(flags: Sequence[Flag], width: int) -> tuple[str, ...]:
    """Measures of a row beside the plan's limits."""
    if not flags:
        return ()
    columns = (
        Column(head="", texts=tuple(_measure(flag.measure) for flag in flags), align="left"),
        Column(head="Value", texts=on_point([figure(flag.value) for flag in flags])),
        Column(head="Limit", texts=on_point([_limit(flag.limit) for flag in flags])),
        Column(head="As written", texts=tuple(flag.written or "" for flag in flags), align="left"),
        Column(head="Flagged", texts=tuple("yes" if flag.flagged else "no" for flag in flags), align="left"),
    )
    drawn = table(columns, width)
    if drawn is not None:
        return drawn
    return tuple(INDENT + shorten(f"{_measure(flag.measure)} {figure(flag.value)}", width) for flag in flags)


def _measure(name: str) -> str:
    """Name of a measure as the trade writes it."""
    return {"cooks_distance": "Cook's distance", "dffits": "DFFITS"}.get(name, name.replace("_", " "))


def _limit(value: float | None) -> str:
    """A limit, or that the plan sets none."""
    return "none" if value is None else figure(value)


def _without(measures: InfluenceRow | None, width: int) -> tuple[str, ...]:
    """What changes in the model when the row is left out."""
    if measures is None:
        return ()
    parts = []
    if measures.change_r_squared is not None:
        parts.append(f"R² changes by {figure(measures.change_r_squared)}")
    if measures.change_coefficient is not None:
        moved = figure(measures.change_coefficient)
        parts.append(f"the coefficient that moves most ({measures.of}) by {moved} standard errors")
    text = f"{listed(parts)}. " if parts else ""
    for names, what in (
        (measures.significance_changes, "significance"),
        (measures.sign_changes, "sign"),
    ):
        if names:
            text += f"The {what} of {listed(names)} changes. "
    if not measures.significance_changes and not measures.sign_changes:
        text += "No significance and no sign changes. "
    text += "The row stays." if measures.stays else "The row leaves."
    text = text[0].upper() + text[1:]
    return wrapped(text, width)
