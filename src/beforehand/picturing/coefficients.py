"""Coefficients with their intervals on one scale: standard deviations of both sides."""

from __future__ import annotations

from dataclasses import dataclass

from beforehand.lock import Lock
from beforehand.picturing.picture import Picture, listed, shown
from beforehand.picturing.rungs import under
from beforehand.picturing.sheet import (
    BLUE,
    INK,
    QUIET,
    SMALL,
    VERMILION,
    WIDTH,
    Sheet,
    mark,
    put,
    stroke,
)
from beforehand.wording import number

TITLE = "How large is each effect, on a common scale?"

MOST_TERMS = 40
PITCH = 0.215


@dataclass(frozen=True, slots=True)
class Effect:
    """One coefficient in standard deviations of the outcome to one of its column.

    ``low`` and ``high`` are None where the coefficient has no interval; ``figures`` is the same in
    units of the table.
    """

    name: str
    size: float
    low: float | None
    high: float | None
    figures: str

    @property
    def clear(self) -> bool:
        """Whether the interval lies on one side of zero."""
        return self.low is not None and self.high is not None and self.low * self.high > 0.0


def coefficients(lock: Lock) -> Picture | None:
    """Standardized coefficients with intervals; None where the answer has none."""
    effects = effects_of(lock)
    if not effects or lock.answer is None:
        return None
    drawn = effects[:MOST_TERMS]
    more = len(effects) - len(drawn)
    alpha = lock.plan.written.get("alpha")
    level = f"{100 * (1 - alpha):.6g} %" if isinstance(alpha, float) else "the plan's"
    note = (
        f"Change of the outcome, in its standard deviations, for one standard deviation of the column; the "
        f"line is "
        f"the {level} interval ({lock.answer.errors.replace('_', ' ')} errors). A hollow mark's interval "
        f"holds zero. "
        "At the right the coefficient and its interval in units of the table."
    )
    if more:
        note += f" The {MOST_TERMS} largest are shown, {more} smaller ones are not."
    return Picture(
        name="coefficients",
        title=TITLE,
        alt=_words(effects, level),
        note=note,
        width=WIDTH,
        height=PITCH * len(drawn) + 0.62,
        draw=lambda sheet: _draw(sheet, drawn, level),
    )


def effects_of(lock: Lock) -> tuple[Effect, ...]:
    """Every coefficient that has a standardized size, the largest first."""
    if lock.answer is None:
        return ()
    found: list[Effect] = []
    for term in lock.answer.terms:
        if term.standardized is None:
            continue
        scale = None if term.coefficient == 0 else term.standardized / term.coefficient
        low = None if scale is None or term.low is None else term.low * scale
        high = None if scale is None or term.high is None else term.high * scale
        figures = number(term.coefficient).replace("-", "−")
        if term.low is not None and term.high is not None:
            figures += f"  [{number(term.low)}, {number(term.high)}]".replace("-", "−")
        name = shown(term.term)
        if term.transform is not None and " × " not in term.term:
            name = under(name, term.transform)
        found.append(Effect(name=name, size=term.standardized, low=low, high=high, figures=figures))
    return tuple(sorted(found, key=lambda one: -abs(one.size)))


def _words(effects: tuple[Effect, ...], level: str) -> str:
    """The largest effects in words."""
    said = [
        f"{one.name} {number(one.size, 2)}"
        + ("" if one.low is None or one.high is None else f" ({number(one.low, 2)} to {number(one.high, 2)})")
        for one in effects
    ]
    unclear = [one.name for one in effects if one.low is not None and not one.clear]
    text = f"Effects in standard deviations with {level} intervals, the largest first: {listed(said, 12)}."
    if unclear:
        text += f" The interval of {listed(unclear)} {'holds' if len(unclear) == 1 else 'hold'} zero."
    return text


def _draw(sheet: Sheet, effects: tuple[Effect, ...], level: str) -> None:
    top = 0.2
    names = 0.16 + sheet.room_for([one.name for one in effects], 0.8, 2.2)
    figures = 0.2 + sheet.room_for([one.figures for one in effects], 1.3, 2.0, SMALL)
    width = sheet.width - names - figures
    axes = sheet.axes(names, top, width, PITCH * len(effects), lines="x")
    ends = [0.0, *(v for one in effects for v in (one.size, one.low, one.high) if v is not None)]
    pad = 0.04 * (max(ends) - min(ends) or 1.0)
    axes.set(xlim=(min(ends) - pad, max(ends) + pad), ylim=(len(effects) - 0.5, -0.5), yticks=[])
    axes.spines["left"].set_visible(False)
    axes.axvline(0.0, color=INK, linewidth=0.9, alpha=QUIET, zorder=1)
    beside = 1.0 + 0.13 / width
    for at, one in enumerate(effects):
        colour = BLUE if one.size > 0 else VERMILION
        if one.low is not None and one.high is not None:
            stroke(
                axes, (one.low, one.high), (at, at), colour=colour, width=1.8, strength=0.75, name="interval"
            )
        mark(axes, one.size, at, colour=colour, hollow=not one.clear, name="effect")
        right = axes.get_yaxis_transform()
        put(axes, -0.09 / width, at, sheet.fitted(one.name, names - 0.1), at="right", transform=right)
        put(axes, beside, at, sheet.fitted(one.figures, figures - 0.1, SMALL), size=SMALL, transform=right)
    put(axes, beside, -0.85, f"coefficient  [{level} interval]", size=SMALL, strength=0.75,
        transform=axes.get_yaxis_transform())  # fmt: skip
    axes.set_xlabel("standard deviations of the outcome to one of the column")
