"""What each column of the plan looks like: small histograms, and rows of each level."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from beforehand.lock import Descriptive, Lock
from beforehand.lock.pictures import Histogram
from beforehand.picturing.picture import Picture, counted, listed, shown
from beforehand.picturing.sheet import BLUE, GREEN, INK, QUIET, SMALL, WIDTH, Sheet, put
from beforehand.wording import number

if TYPE_CHECKING:
    from matplotlib.axes import Axes

TITLE = "What do the columns look like?"

MOST_PANELS, IN_A_ROW = 25, 5
PANEL_WIDTH, PANEL_HEIGHT, GAP_X, GAP_Y = 1.24, 0.6, 0.21, 0.56

# Levels of a category beyond so many are counted together.
MOST_LEVELS = 5


@dataclass(frozen=True, slots=True)
class Panel:
    """One column: bars from left to right for a number, from top to bottom for a category."""

    name: str
    unit: str | None
    missing: int
    counts: tuple[int, ...]
    low: float | None
    high: float | None
    ends: tuple[float, float] | None
    levels: tuple[str, ...]


def columns(lock: Lock) -> Picture | None:
    """Small histograms of the plan's columns; None for a lock without them."""
    panels = panels_of(lock)
    if not panels:
        return None
    drawn = panels[:MOST_PANELS]
    left_out = len(panels) - len(drawn)
    note = "The outcome first, in green, then the predictors, among the eligible rows and as they were read."
    if left_out:
        note += f" The first {len(drawn)} are shown, {left_out} more are not."
    rows = -(-len(drawn) // IN_A_ROW)
    return Picture(
        name="columns",
        title=TITLE,
        alt=_words(lock),
        note=note,
        width=WIDTH,
        height=rows * (PANEL_HEIGHT + GAP_Y) + 0.05,
        draw=lambda sheet: _draw(sheet, drawn),
    )


def panels_of(lock: Lock) -> tuple[Panel, ...]:
    """Every column of the plan that has a value, the outcome first."""
    if lock.pictures is None:
        return ()
    histograms = {one.column: one for one in lock.pictures.histograms}
    found: list[Panel] = []
    for seen in lock.checks.descriptives:
        histogram = histograms.get(seen.column)
        if histogram is not None:
            found.append(
                Panel(
                    seen.column,
                    seen.unit,
                    seen.missing,
                    histogram.counts,
                    histogram.low,
                    histogram.high,
                    _ends(seen, histogram),
                    (),
                )
            )
        elif seen.levels:
            levels = sorted(seen.levels.items(), key=lambda one: -one[1])
            shown_levels = levels if len(levels) <= MOST_LEVELS else levels[: MOST_LEVELS - 1]
            names, counts = [name for name, _ in shown_levels], [count for _, count in shown_levels]
            if len(levels) > MOST_LEVELS:
                rest = levels[MOST_LEVELS - 1 :]
                names.append(f"{len(rest)} more")
                counts.append(sum(count for _, count in rest))
            found.append(
                Panel(seen.column, seen.unit, seen.missing, tuple(counts), None, None, None, tuple(names))
            )
    return tuple(found)


def _ends(seen: Descriptive, histogram: Histogram) -> tuple[float, float]:
    """Smallest and largest value, where they are known."""
    if seen.minimum is None or seen.maximum is None:
        return histogram.low, histogram.high
    return seen.minimum, seen.maximum


def _words(lock: Lock) -> str:
    said: list[str] = []
    for seen in lock.checks.descriptives:
        if seen.levels:
            levels = [f"{shown(level, 24)} {count:,}" for level, count in seen.levels.items()]
            said.append(f"{shown(seen.column)} ({listed(levels, 5)})")
        elif seen.mean is not None:
            unit = f" {shown(seen.unit, 24)}" if seen.unit else ""
            said.append(
                f"{shown(seen.column)} from {number(seen.minimum)} to {number(seen.maximum)}, mean "
                f"{number(seen.mean)}{unit}"
            )
    return f"{counted(len(said), 'column', 'columns')}, the outcome first: {'; '.join(said[:20])}" + (
        f"; and {len(said) - 20} more." if len(said) > 20 else "."
    )


def _draw(sheet: Sheet, panels: tuple[Panel, ...]) -> None:
    for at, one in enumerate(panels):
        row, place = divmod(at, IN_A_ROW)
        left = 0.06 + place * (PANEL_WIDTH + GAP_X)
        axes = sheet.axes(left, 0.22 + row * (PANEL_HEIGHT + GAP_Y), PANEL_WIDTH, PANEL_HEIGHT)
        colour = GREEN if at == 0 else BLUE
        axes.spines["left"].set_visible(False)
        axes.set_yticks([])
        put(axes, 0.0, 1.07, sheet.fitted(shown(one.name), PANEL_WIDTH), upright="baseline",
            transform=axes.transAxes)  # fmt: skip
        if one.low is not None and one.high is not None:
            _number(sheet, axes, one, colour, one.low, one.high)
        else:
            _category(sheet, axes, one, colour)


def _number(sheet: Sheet, axes: Axes, one: Panel, colour: str, low: float, high: float) -> None:
    """Bars of one width, with the two ends and the unit beneath."""
    width = (high - low) / len(one.counts)
    axes.bar(
        [low + width * (k + 0.5) for k in range(len(one.counts))],
        one.counts,
        width=0.9 * width,
        color=colour,
        alpha=0.85,
        linewidth=0,
        gid="bars",
    )
    axes.set(xlim=(low, high), ylim=(0.0, 1.05 * max(*one.counts, 1)), xticks=[])
    first, last = (f"{value:.4g}".replace("-", "−") for value in one.ends or (low, high))
    put(axes, 0.0, -0.07, first, size=SMALL, upright="top", transform=axes.transAxes)
    put(axes, 1.0, -0.07, last, at="right", size=SMALL, upright="top", transform=axes.transAxes)
    room = PANEL_WIDTH - sheet.width_of(first, SMALL) - sheet.width_of(last, SMALL) - 0.12
    unit = "" if one.unit is None else shown(one.unit)
    if unit and room > 0.15:
        put(axes, 0.5, -0.07, sheet.fitted(unit, room, SMALL), at="center", size=SMALL, strength=0.7,
            upright="top", transform=axes.transAxes)  # fmt: skip


def _category(sheet: Sheet, axes: Axes, one: Panel, colour: str) -> None:
    """A bar for each level, with its name at the left."""
    names = 0.08 + sheet.room_for([shown(level) for level in one.levels], 0.2, 0.62 * PANEL_WIDTH, SMALL)
    most = max(*one.counts, 1)
    start = names / PANEL_WIDTH
    count_room = sheet.width_of(f"{most:,}", SMALL) / PANEL_WIDTH + 0.04
    scale = max(1.0 - start - count_room, 0.1) / most
    axes.barh(
        range(len(one.counts)),
        [count * scale for count in one.counts],
        left=start,
        height=0.62,
        color=colour,
        alpha=0.85,
        linewidth=0,
        gid="bars",
    )
    axes.set(xlim=(0.0, 1.0), ylim=(max(len(one.counts), 3) - 0.4, -0.6), xticks=[])
    axes.spines["bottom"].set_visible(False)
    axes.axvline(start, color=INK, linewidth=0.6, alpha=QUIET)
    size = SMALL if len(one.counts) < MOST_LEVELS else SMALL - 0.8
    for at, (level, count) in enumerate(zip(one.levels, one.counts, strict=True)):
        put(axes, start - 0.03, at, sheet.fitted(shown(level), names - 0.06, size), at="right", size=size)
        put(axes, start + count * scale + 0.02, at, f"{count:,}", size=size, strength=0.8)
