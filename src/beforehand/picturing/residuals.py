"""The residuals: whether they spread evenly along the fit, and whether they look normal."""

from __future__ import annotations

import math
from statistics import NormalDist

from beforehand.lock import Lock
from beforehand.lock.pictures import SpreadAlong
from beforehand.picturing.clouds import draw_cloud
from beforehand.picturing.picture import Picture, shown
from beforehand.picturing.sheet import (
    BLUE,
    GREEN,
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
from beforehand.wording import number, p_value

SPREAD_TITLE = "Is the spread even along the fit?"
NORMAL_TITLE = "Do the residuals look normal?"

HEIGHT = 2.75

_TESTS = {
    "breusch_pagan": "Breusch-Pagan",
    "white": "White",
    "jarque_bera": "Jarque-Bera",
    "shapiro_wilk": "Shapiro-Wilk",
}


def spread(lock: Lock) -> Picture | None:
    """Studentized residuals along the fitted values with their mean and width; None without residuals."""
    if lock.pictures is None or lock.pictures.spread is None or lock.answer is None:
        return None
    seen = lock.pictures.spread
    widths = [width for _, width in seen.width]
    tested = _tested(lock, ("breusch_pagan", "white"))
    unit = "" if lock.answer.outcome.unit is None else f" [{shown(lock.answer.outcome.unit, 16)}]"
    label = f"fitted {_outcome(lock)}" + (unit if lock.answer.outcome.transform == "identity" else "")
    return Picture(
        name="spread",
        title=SPREAD_TITLE,
        alt=(
            f"Studentized residuals along the fitted values from {number(seen.cloud.x_low)} to "
            f"{number(seen.cloud.x_high)}. Their typical size goes from {number(min(widths), 2)} to "
            f"{number(max(widths), 2)} in {len(widths)} groups along the fit; an even spread is near 1 "
            f"everywhere.{tested}"
        ),
        note=(
            "Each dot is a studentized residual. The thick line is the mean of neighbours, the dashed ones "
            "lie their "
            "typical size above and below zero; an even spread keeps them level." + tested
        ),
        width=WIDTH,
        height=HEIGHT,
        draw=lambda sheet: _draw_spread(sheet, seen, label),
    )


def normal(lock: Lock) -> Picture | None:
    """Quantiles of the residuals against those of a normal sample; None without residuals."""
    if lock.pictures is None or not lock.pictures.normal or lock.answer is None:
        return None
    points = scores_of(lock.pictures.normal)
    sd = spread_of(points)
    if not sd > 0.0:
        return None
    tested = _tested(lock, ("jarque_bera", "shapiro_wilk"))
    n = lock.answer.rows
    out = sum(abs(y - sd * x) > _margin(x, sd, n) for x, y in points)
    unit = lock.answer.outcome.unit if lock.answer.outcome.transform == "identity" else None
    return Picture(
        name="normal",
        title=NORMAL_TITLE,
        alt=(
            f"{len(points)} quantiles of the residuals, from {number(points[0][1])} to "
            f"{number(points[-1][1])}, against "
            f"those of a normal sample with a standard deviation of {number(sd)}: {out} lie outside the "
            f"band in which "
            f"95 of 100 would lie.{tested}"
        ),
        note=(
            "On the line the residuals would be normal; the band holds each point 95 times in 100 if they "
            "are." + tested
        ),
        width=WIDTH,
        height=HEIGHT,
        draw=lambda sheet: _draw_normal(sheet, points, sd, n, unit),
    )


def scores_of(quantiles: tuple[float, ...]) -> tuple[tuple[float, float], ...]:
    """Each quantile with its normal score at (i - 1/2)/m."""
    m = len(quantiles)
    return tuple((NormalDist().inv_cdf((i + 0.5) / m), value) for i, value in enumerate(quantiles))


def spread_of(points: tuple[tuple[float, float], ...]) -> float:
    """Slope of the quantiles on their scores, through the origin."""
    over = sum(x * x for x, _ in points)
    return sum(x * y for x, y in points) / over if over else 0.0


def _margin(score: float, sd: float, n: int) -> float:
    """Half the band at a score: 1.96 asymptotic standard errors of a quantile (Cramér 1946, 28.5)."""
    law = NormalDist()
    p = law.cdf(score)
    return 1.96 * sd * math.sqrt(p * (1.0 - p) / n) / law.pdf(score)


def _outcome(lock: Lock) -> str:
    """The outcome on its fitted scale."""
    from beforehand.picturing.rungs import under

    assert lock.answer is not None
    return under(shown(lock.answer.outcome.column, 32), lock.answer.outcome.transform)


def _tested(lock: Lock, names: tuple[str, ...]) -> str:
    """The last such check of the model, in a sentence with a space before it."""
    found = [
        check
        for check in lock.checks.assumptions
        if check.check in names and check.subject is None and check.p is not None
    ]
    if not found:
        return ""
    last = found[-1]
    limit = "" if last.alpha is None else f" (limit {last.alpha:.6g})"
    return f" {_TESTS[last.check]} gives p {p_value(last.p)}{limit}."


def _draw_spread(sheet: Sheet, seen: SpreadAlong, label: str) -> None:
    width = sheet.width - 1.55
    axes = sheet.axes(0.5, 0.12, width, HEIGHT - 0.58)
    draw_cloud(axes, seen.cloud, across=width)
    axes.axhline(0.0, color=INK, linewidth=0.8, alpha=QUIET, zorder=1)
    xs = [x for x, _ in seen.width]
    for sign in (1.0, -1.0):
        stroke(
            axes,
            xs,
            [sign * y for _, y in seen.width],
            colour=GREEN,
            width=1.5,
            dashes=(4.0, 2.0),
            name="width",
        )
    stroke(
        axes, [x for x, _ in seen.line], [y for _, y in seen.line], colour=VERMILION, width=1.7, name="means"
    )
    # Words at the right, kept apart where the lines end close together.
    size = seen.width[-1][1]
    middle = seen.line[-1][1]
    low, high = axes.get_ylim()
    apart = 0.075 * (high - low)
    middle = min(max(middle, -size + apart), size - apart) if size > 2 * apart else 0.0
    words = ((size, "typical size", GREEN), (middle, "mean", VERMILION), (-size, "typical size", GREEN))
    for y, text, colour in words:
        put(axes, 1.015, y, text, colour=colour, size=SMALL, transform=axes.get_yaxis_transform())
    axes.set_xlabel(label, parse_math=False)
    axes.set_ylabel("studentized residual")


def _draw_normal(
    sheet: Sheet, points: tuple[tuple[float, float], ...], sd: float, n: int, unit: str | None
) -> None:
    axes = sheet.axes(0.6, 0.12, sheet.width - 1.65, HEIGHT - 0.58)
    xs = [x for x, _ in points]
    reach = 1.04 * max(abs(xs[0]), abs(xs[-1]), 0.1)
    grid = [reach * (k / 30.0 - 1.0) for k in range(61)]
    axes.fill_between(
        grid, [sd * x - _margin(x, sd, n) for x in grid], [sd * x + _margin(x, sd, n) for x in grid],
        color=INK, alpha=0.12, linewidth=0, zorder=0.8,
    )  # fmt: skip
    stroke(axes, (grid[0], grid[-1]), (sd * grid[0], sd * grid[-1]), colour=INK, strength=QUIET, width=0.9)
    mark(axes, xs, [y for _, y in points], size=3.6, colour=BLUE, name="quantiles")
    axes.set_xlim(-reach, reach)
    put(axes, 1.015, sd * reach, "normal", size=SMALL, strength=0.8, transform=axes.get_yaxis_transform())
    axes.set_xlabel("normal score")
    axes.set_ylabel("residual" if unit is None else f"residual [{shown(unit, 16)}]", parse_math=False)
