"""What each predictor adds to the variance explained that no other can."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from beforehand.lock import Lock
from beforehand.picturing.picture import Picture, listed, shown
from beforehand.picturing.sheet import BLUE, GREEN, INK, SMALL, WIDTH, Sheet, bar, put

if TYPE_CHECKING:
    pass

TITLE = "What does each predictor add that no other can?"

MOST_PREDICTORS = 40
PITCH = 0.215


def share(value: float) -> str:
    """A share of variance as a percentage, never finer than a hundredth."""
    percent = 100.0 * value
    if 0.0 < percent < 0.01:
        return "below 0.01 %"
    return f"{percent:.2f} %" if abs(percent) < 1.0 else f"{percent:.3g} %"


@dataclass(frozen=True, slots=True)
class Part:
    """R² that is lost when one predictor alone is left out."""

    name: str
    size: float


def contributions(lock: Lock) -> Picture | None:
    """Semipartial R² of each predictor; None where the answer has none."""
    parts = parts_of(lock)
    if not parts or lock.answer is None or lock.answer.r_squared is None:
        return None
    total = lock.answer.r_squared
    drawn = parts[:MOST_PREDICTORS]
    note = (
        "R² that is lost when the predictor alone is left out (its squared semipartial correlation). What "
        "several predictors explain between them belongs to none alone."
    )
    if len(parts) > len(drawn):
        note += f" The {MOST_PREDICTORS} largest are shown, {len(parts) - len(drawn)} smaller ones are not."
    said = listed([f"{one.name} {share(one.size)}" for one in parts], 12)
    shared = total - sum(one.size for one in parts)
    alt = f"The model explains {share(total)} of the variance. Alone, each adds: {said}."
    if shared >= 0:
        alt += f" {share(shared)} is explained by several between them, {share(1.0 - total)} by none."
    else:
        alt += " The parts come to more than the whole, as some predictors work only beside others."
    return Picture(
        name="contributions",
        title=TITLE,
        alt=alt,
        note=note,
        width=WIDTH,
        height=PITCH * len(drawn) + (1.05 if shared >= 0 else 0.55),
        draw=lambda sheet: _draw(sheet, drawn, total, shared),
    )


def parts_of(lock: Lock) -> tuple[Part, ...]:
    """Every predictor's part, the largest first."""
    if lock.answer is None:
        return ()
    found = [
        Part(shown(one.predictor), one.semipartial_r_squared)
        for one in lock.answer.predictors
        if one.semipartial_r_squared is not None
    ]
    return tuple(sorted(found, key=lambda one: -one.size))


def _draw(sheet: Sheet, parts: tuple[Part, ...], total: float, shared: float) -> None:
    from matplotlib.ticker import MaxNLocator

    top = 0.1
    names = 0.16 + sheet.room_for([one.name for one in parts], 0.9, 2.2)
    width = sheet.width - names - 0.75
    if shared >= 0:
        _whole(sheet, total, shared, names, width)
        top = 0.62
    axes = sheet.axes(names, top, width, PITCH * len(parts), lines="x")
    most = max(max(one.size for one in parts), 1e-6)
    axes.set(xlim=(0.0, 1.04 * most), ylim=(len(parts) - 0.5, -0.5), yticks=[])
    axes.xaxis.set_major_formatter(lambda value, _: f"{100 * value:.3g} %")
    axes.xaxis.set_major_locator(MaxNLocator(6))
    for at, one in enumerate(parts):
        bar(axes, 0.0, one.size, at, 0.55, name="part")
        put(axes, -0.02, at, sheet.fitted(one.name, names - 0.1), at="right",
            transform=axes.get_yaxis_transform())  # fmt: skip
        put(axes, one.size + 0.012 * most, at, share(one.size), size=SMALL)
    axes.set_xlabel("share of the outcome's variance")


def _whole(sheet: Sheet, total: float, shared: float, names: float, width: float) -> None:
    """All of the variance on one strip: one alone, several between them, none."""
    axes = sheet.axes(names, 0.24, width, 0.14)
    axes.set_axis_off()
    axes.set(xlim=(0.0, 1.0), ylim=(-0.5, 0.5))
    own = max(total - shared, 0.0)
    places = ((0.0, own, BLUE, 0.85), (own, total, GREEN, 0.75), (total, 1.0, INK, 0.18))
    for (left, right, colour, strength), words in zip(
        places, ("one alone", "several between them", "none"), strict=True
    ):
        if right <= left:
            continue
        bar(axes, left, right, 0.0, 1.0, colour=colour, strength=strength, name="whole")
        text = f"{words} {share(right - left)}"
        if sheet.width_of(text, SMALL) <= (right - left) * width:
            put(axes, left, 1.05, text, size=SMALL)
    put(axes, -0.02, 0.0, "explained by", at="right", size=SMALL, strength=0.8)
