"""Which columns move together: each number with the outcome, and pairs of predictors as arcs."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from beforehand.lock import Lock
from beforehand.picturing.picture import Picture, listed, shown
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

if TYPE_CHECKING:
    from matplotlib.axes import Axes

TITLE = "Which columns move together?"

MOST_COLUMNS = 40

# Arcs of weaker pairs would hide the others.
WEAKEST = 0.3

# With more arcs than this the weaker ones are left out.
MOST_ARCS = 80

PITCH = 0.2

# Room for the number of a pair.
NUMBER = 0.5


@dataclass(frozen=True, slots=True)
class Pair:
    """Two predictors and their correlation."""

    first: str
    second: str
    r: float


def correlations(lock: Lock) -> Picture | None:
    """Correlations with the outcome and among predictors; None where the record has none."""
    if lock.pictures is None or not lock.pictures.with_outcome:
        return None
    outcome = str(_outcome(lock))
    with_outcome = {one.predictor: one.r for one in lock.pictures.with_outcome}
    all_pairs = pairs_of(lock, with_outcome)
    names = chosen(with_outcome, all_pairs)
    pairs = tuple(p for p in all_pairs if p.first in names and p.second in names and abs(p.r) >= WEAKEST)
    pairs = tuple(sorted(pairs, key=lambda one: -abs(one.r))[:MOST_ARCS])
    limit = limit_of(lock)
    note = (
        f"At the left each number's correlation with {shown(outcome)}, both as read. At the right an arc "
        f"joins two "
        f"predictors whose correlation is {WEAKEST:g} or more either way, as they first stood in the "
        f"model; blue is positive, "
        "red negative, and a thicker arc is a closer pair."
    )
    if limit is not None:
        note += f" Pairs beyond the plan's limit of {limit:g} carry their number."
    if len(names) < len(with_outcome):
        note += f" {len(names)} of {len(with_outcome)} numbers are shown, those of the closest correlations."
    ordered = sorted(with_outcome.items(), key=lambda one: -abs(one[1]))
    alt = f"Correlations with {shown(outcome)}: {listed([f'{shown(n)} {r:.2f}' for n, r in ordered], 10)}."
    if pairs:
        said = [f"{shown(one.first)} and {shown(one.second)} {one.r:.2f}" for one in pairs]
        alt += f" Closest pairs of predictors: {'; '.join(said[:8])}."
    elif all_pairs:
        alt += f" No pair of predictors has a correlation of {WEAKEST:g} or more."
    return Picture(
        name="correlations",
        title=TITLE,
        alt=alt,
        note=note,
        width=WIDTH,
        height=PITCH * len(names) + 0.68,
        draw=lambda sheet: _draw(sheet, names, with_outcome, pairs, limit, outcome),
    )


def pairs_of(lock: Lock, known: Mapping[str, float]) -> tuple[Pair, ...]:
    """Pairs of predictors at the first stage that recorded any, in its order."""
    stages = [one.stage for one in lock.checks.correlations]
    return tuple(
        Pair(one.first, one.second, one.r)
        for one in lock.checks.correlations
        if one.stage == stages[0] and one.r is not None and one.first in known and one.second in known
    )


def chosen(with_outcome: Mapping[str, float], pairs: tuple[Pair, ...]) -> tuple[str, ...]:
    """At most forty columns, those of the closest correlations, in plan order."""
    if len(with_outcome) <= MOST_COLUMNS:
        return tuple(with_outcome)
    closest = {name: abs(r) for name, r in with_outcome.items()}
    for pair in pairs:
        for name in (pair.first, pair.second):
            closest[name] = max(closest[name], abs(pair.r))
    kept = set(sorted(closest, key=lambda name: -closest[name])[:MOST_COLUMNS])
    return tuple(name for name in with_outcome if name in kept)


def limit_of(lock: Lock) -> float | None:
    """The plan's limit of a correlation, where it has one."""
    block = lock.plan.written.get("collinearity")
    when = block.get("examine_when") if isinstance(block, Mapping) else None
    limit = when.get("correlation_above") if isinstance(when, Mapping) else None
    return float(limit) if isinstance(limit, int | float) else None


def _outcome(lock: Lock) -> object:
    block = lock.plan.written.get("outcome")
    return block.get("column", "the outcome") if isinstance(block, Mapping) else "the outcome"


def _draw(
    sheet: Sheet,
    names: tuple[str, ...],
    with_outcome: Mapping[str, float],
    pairs: tuple[Pair, ...],
    limit: float | None,
    outcome: str,
) -> None:
    room = 0.2 + sheet.room_for([shown(name) for name in names], 0.8, 2.0)
    top, tall = 0.2, PITCH * len(names)
    left = min(sheet.width - room - reach_of(names, pairs) - NUMBER - 0.42, 3.9)
    axes = sheet.axes(0.15, top, left, tall, lines="x")
    axes.set(xlim=(-1.05, 1.05), ylim=(len(names) - 0.5, -0.5), yticks=[], xticks=[-1, -0.5, 0, 0.5, 1])
    axes.spines["left"].set_visible(False)
    axes.axvline(0.0, color=INK, linewidth=0.8, alpha=QUIET, zorder=1)
    axes.set_xlabel(sheet.fitted(f"correlation with {shown(outcome)}", left + 0.2, 7.5), parse_math=False)
    for at, name in enumerate(names):
        r = with_outcome[name]
        colour = BLUE if r >= 0 else VERMILION
        stroke(axes, (0.0, r), (at, at), colour=colour, width=1.3, strength=0.7, name="stem")
        mark(axes, r, at, size=4.2, colour=colour, name="outcome")
    middle = 0.15 + left + 0.12
    beside = sheet.axes(middle, top, sheet.width - middle, tall)
    beside.set_axis_off()
    wide = sheet.width - middle
    beside.set(xlim=(0.0, wide), ylim=(len(names) - 0.5, -0.5))
    for at, name in enumerate(names):
        put(beside, room - 0.12, at, sheet.fitted(shown(name), room - 0.14), at="right")
        mark(beside, room, at, size=2.4, colour="#8a8f98")
    if pairs:
        _arcs(sheet, beside, names, pairs, limit, room, reach_of(names, pairs))
    put(beside, room, -0.85, "pairs of predictors" if pairs else f"no pair reaches {WEAKEST:g}", size=SMALL,
        strength=0.75)  # fmt: skip


def reach_of(names: tuple[str, ...], pairs: tuple[Pair, ...]) -> float:
    """How far the widest arc goes out, in inches; farther for names that stand farther apart."""
    if not pairs:
        return 0.6
    place = {name: at for at, name in enumerate(names)}
    return min(2.3, 0.3 + 0.13 * max(abs(place[one.first] - place[one.second]) for one in pairs))


def _arcs(
    sheet: Sheet,
    axes: Axes,
    names: tuple[str, ...],
    pairs: tuple[Pair, ...],
    limit: float | None,
    left: float,
    reach: float,
) -> None:
    """Half ellipses from one name to the other, the farther the names the wider; the closest on top."""
    place = {name: at for at, name in enumerate(names)}
    farthest = max(max(abs(place[one.first] - place[one.second]) for one in pairs), 1)
    for pair in reversed(pairs):
        one, other = place[pair.first], place[pair.second]
        centre, half = (one + other) / 2.0, abs(one - other) / 2.0
        out = reach * (2.0 * half / farthest) ** 0.75
        turn = [math.pi * k / 40.0 for k in range(41)]
        beyond = limit is not None and abs(pair.r) > limit
        strength = 0.95 if beyond else 0.35 + 0.5 * (abs(pair.r) - WEAKEST) / (1.0 - WEAKEST)
        stroke(
            axes,
            [left + out * math.sin(t) for t in turn],
            [centre - half * math.cos(t) for t in turn],
            colour=BLUE if pair.r >= 0 else VERMILION,
            width=0.6 + 2.4 * pair.r**2,
            strength=strength,
            name="arc",
        )
    for pair in pairs:
        if limit is not None and abs(pair.r) > limit:
            one, other = place[pair.first], place[pair.second]
            out = reach * (abs(one - other) / farthest) ** 0.75
            x, y = left + out + 0.05, (one + other) / 2.0
            put(axes, x, y, f"{pair.r:.2f}".replace("-", "−"), size=SMALL)
