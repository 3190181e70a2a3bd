"""Which rows pull: leverage against studentized residual, with the plan's limits and what became of rows."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from beforehand.faults import NumericalError
from beforehand.lock import Lock
from beforehand.lock.pictures import Cloud
from beforehand.picturing.clouds import draw_cloud
from beforehand.picturing.picture import Picture, counted, listed, shown
from beforehand.picturing.sheet import (
    GREEN,
    INK,
    ORANGE,
    QUIET,
    SMALL,
    VERMILION,
    WIDTH,
    Sheet,
    mark,
    put,
    stroke,
)
from beforehand.plan.limits import Limit

if TYPE_CHECKING:
    from matplotlib.axes import Axes

TITLE = "Which rows pull?"

HEIGHT = 3.1

# Labels of rows that stayed are shown for so many, the largest Cook's distances first.
MOST_LABELS = 6


@dataclass(frozen=True, slots=True)
class MarkedRow:
    """A flagged row where the influence step saw it."""

    label: str
    leverage: float
    residual: float
    stays: bool


@dataclass(frozen=True, slots=True)
class Limits:
    """The plan's limits in the model that was looked at: ``n`` rows, ``p`` coefficients."""

    n: int
    p: int
    leverage: float | None
    residual: float | None
    cook: float | None


def pull(lock: Lock) -> Picture | None:
    """Leverage against studentized residual; None without a fit that has residuals."""
    if lock.pictures is None or lock.pictures.pull is None or lock.answer is None:
        return None
    cloud, limits, rows = lock.pictures.pull, limits_of(lock), marked_of(lock)
    gone = [row for row in rows if not row.stays]
    stayed = [row for row in rows if row.stays]
    said = [
        f"{counted(lock.answer.rows, 'row', 'rows')} by leverage (up to {cloud.x_high:.3g}) and "
        f"studentized residual ({cloud.y_low:.3g} to {cloud.y_high:.3g})"
    ]
    if gone:
        said.append(f"Removed: {listed([row.label for row in gone])}")
    said.append(
        f"{counted(len(stayed), 'flagged row stays', 'flagged rows stay')}"
        + (f", foremost {listed([row.label for row in stayed], 5)}" if stayed else "")
    )
    marked = " Crosses are rows that were removed, rings flagged rows that stayed," if rows else ""
    note = (
        "To the right, rows that are unlike the others; up and down, rows that the model misses."
        + (f"{marked} each as it was when the influence step looked at it." if rows else "")
        + _limits_said(limits)
    )
    return Picture(
        name="pull",
        title=TITLE,
        alt=". ".join(said) + "." + _limits_said(limits),
        note=note,
        width=WIDTH,
        height=HEIGHT,
        draw=lambda sheet: _draw(sheet, cloud, limits, rows),
    )


def marked_of(lock: Lock) -> tuple[MarkedRow, ...]:
    """Flagged rows that have both measures, in the order of the record."""
    return tuple(
        MarkedRow(shown(row.row, 24), row.leverage, row.studentized_residual, row.stays)
        for row in lock.checks.influence
        if row.leverage is not None and row.studentized_residual is not None
    )


def limits_of(lock: Lock) -> Limits:
    """The plan's limits at the size of the answer's model."""
    assert lock.answer is not None
    n, p = lock.answer.rows, len(lock.answer.terms)
    block = lock.plan.written.get("influence")
    when = block.get("flag_when") if isinstance(block, Mapping) else None
    found: dict[str, float | None] = {}
    for name in ("leverage", "studentized_residual", "cooks_distance"):
        written = when.get(name) if isinstance(when, Mapping) else None
        found[name] = None
        if isinstance(written, str | int | float):
            try:
                found[name] = Limit.of(written).value(n, p)
            except (ValueError, NumericalError):
                # A formula without a value at this size has no line.
                continue
    return Limits(n, p, found["leverage"], found["studentized_residual"], found["cooks_distance"])


def cook_curve(limits: Limits, leverages: list[float]) -> list[tuple[float, float]]:
    """Studentized residual at which Cook's distance reaches its limit, by leverage.

    With D = r²h / (p(1 - h)) and the external residual t² = r²(df - 1) / (df - r²) (Belsley, Kuh &
    Welsch 1980, ch. 2); where r² comes to df no residual is large enough.
    """
    if limits.cook is None:
        return []
    df = limits.n - limits.p
    found: list[tuple[float, float]] = []
    for h in leverages:
        squared = limits.cook * limits.p * (1.0 - h) / h
        if 0.0 < squared < df:
            found.append((h, math.sqrt(squared * (df - 1) / (df - squared))))
    return found


def _limits_said(limits: Limits) -> str:
    said = [
        f"{name} {value:.3g}"
        for name, value in (
            ("leverage", limits.leverage),
            ("studentized residual", limits.residual),
            ("Cook's distance", limits.cook),
        )
        if value is not None
    ]
    return f" The plan flags rows beyond: {listed(said)}." if said else ""


def _draw(sheet: Sheet, cloud: Cloud, limits: Limits, rows: tuple[MarkedRow, ...]) -> None:
    width = sheet.width - 1.9
    axes = sheet.axes(0.5, 0.12, width, HEIGHT - 0.58)
    draw_cloud(axes, cloud, across=width)
    right = max([cloud.x_high, *(row.leverage for row in rows)])
    heights = [cloud.y_low, cloud.y_high, *(row.residual for row in rows)]
    if limits.leverage is not None:
        right = max(right, min(limits.leverage, 1.6 * right))
    low, high = min(heights), max(heights)
    room = 0.06 * (high - low)
    axes.set(xlim=(0.0, 1.05 * right), ylim=(low - room, high + room))
    axes.axhline(0.0, color=INK, linewidth=0.6, alpha=QUIET, zorder=1)
    _draw_limits(axes, limits, 1.05 * right)
    for row in rows:
        if row.stays:
            mark(axes, row.leverage, row.residual, size=5.2, colour=ORANGE, hollow=True, name="stays")
        else:
            mark(axes, row.leverage, row.residual, shape="X", size=6.0, colour=VERMILION, name="removed")
    _draw_labels(sheet, axes, rows, width, limits.residual)
    axes.set_xlabel("leverage")
    axes.set_ylabel("studentized residual")


def _draw_limits(axes: Axes, limits: Limits, right: float) -> None:
    low, high = axes.get_ylim()
    beside = axes.get_yaxis_transform()
    taken: list[float] = []

    def told(y: float, words: str) -> None:
        """Words at the right end of a line, moved where others stand already."""
        apart = 0.06 * (high - low)
        while any(abs(y - other) < apart for other in taken):
            y += apart
        taken.append(y)
        put(axes, 1.012, y, words, colour=GREEN, size=SMALL, transform=beside)

    if limits.residual is not None:
        for y in (limits.residual, -limits.residual):
            if low < y < high:
                stroke(axes, (0.0, right), (y, y), colour=GREEN, width=1.0, dashes=(4.0, 2.0), name="limit")
                told(y, f"residual {y:.3g}".replace("-", "−"))
    if limits.leverage is not None and limits.leverage < right:
        x = limits.leverage
        stroke(axes, (x, x), (low, high), colour=GREEN, width=1.0, dashes=(4.0, 2.0), name="limit")
        put(axes, x, 1.01, f"leverage {x:.3g}", at="center", colour=GREEN, size=SMALL, upright="bottom",
            transform=axes.get_xaxis_transform())  # fmt: skip
    grid = [right * k / 200.0 for k in range(1, 200)]
    curve = cook_curve(limits, [h for h in grid if h < 1.0])
    for sign in (1.0, -1.0):
        inside = [(h, sign * t) for h, t in curve if low < sign * t < high]
        if inside:
            stroke(axes, [h for h, _ in inside], [t for _, t in inside], colour=GREEN, width=1.0,
                   dashes=(1.2, 1.6), name="cook")  # fmt: skip
            told(inside[-1][1], f"Cook's distance {limits.cook:.2g}")


def _draw_labels(
    sheet: Sheet, axes: Axes, rows: tuple[MarkedRow, ...], width: float, limit: float | None
) -> None:
    """Labels of removed rows, and of the first that stayed, where there is room for them."""
    (left, right), (low, high) = axes.get_xlim(), axes.get_ylim()
    inch_x, inch_y = width / (right - left), (HEIGHT - 0.58) / (high - low)
    taken: list[tuple[float, float, float, float]] = []
    gone = [row for row in rows if not row.stays]
    for row in (*gone, *[row for row in rows if row.stays][:MOST_LABELS]):
        x, y = (row.leverage - left) * inch_x, (row.residual - low) * inch_y
        if limit is not None and abs(abs(row.residual) - limit) * inch_y < 0.08:
            # Off the line of the limit.
            outside = y + 0.1 if row.residual > 0 else y - 0.1
            y = outside if 0.06 < outside < HEIGHT - 0.64 else y - (outside - y)
        long = sheet.width_of(row.label, SMALL)
        for at, start in (("left", x + 0.07), ("right", x - 0.07 - long)):
            box = (start, y - 0.06, start + long, y + 0.06)
            free = all(
                box[2] < o[0] or box[0] > o[2] or box[3] < o[1] or box[1] > o[3] for o in taken
            ) and not any(
                box[0] - 0.03 < (o.leverage - left) * inch_x < box[2] + 0.03
                and box[1] < (o.residual - low) * inch_y < box[3]
                for o in rows
                if o is not row
            )
            if free and box[0] > 0.0 and box[2] < width:
                taken.append(box)
                place = row.leverage + (0.07 if at == "left" else -0.07) / inch_x
                put(axes, place, low + y / inch_y, row.label, at=at, size=SMALL, strength=0.9)  # type: ignore[arg-type]
                break
