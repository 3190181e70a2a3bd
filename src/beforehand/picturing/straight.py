"""Whether the relation of each number with the outcome is straight: small multiples."""

from __future__ import annotations

from collections.abc import Mapping

from beforehand.lock import Lock
from beforehand.lock.pictures import Straight
from beforehand.picturing.clouds import draw_cloud, draw_line
from beforehand.picturing.picture import Picture, listed, shown
from beforehand.picturing.rungs import under
from beforehand.picturing.sheet import INK, QUIET, SMALL, VERMILION, WIDTH, Sheet, put, stroke
from beforehand.wording import p_value

TITLE = "Is each relation straight, the others held?"

MOST_PANELS, IN_A_ROW = 12, 3
PANEL_WIDTH, PANEL_HEIGHT, GAP_X, GAP_Y = 1.95, 1.25, 0.44, 0.62
LEFT = 0.46


def straight(lock: Lock) -> Picture | None:
    """Component plus residual of each number in the model; None where there is none."""
    if lock.pictures is None or not lock.pictures.straight:
        return None
    p = curvature_of(lock)
    panels = chosen(lock.pictures.straight, p)
    left_out = len(lock.pictures.straight) - len(panels)
    rows = -(-len(panels) // IN_A_ROW)
    note = (
        "Across, the predictor; up, its part of the fitted value plus the residual. The line through means "
        "of neighbours (thick) should follow the model's straight line (thin)."
    )
    if left_out:
        note += f" Shown are the {len(panels)} with the smallest curvature p; {left_out} more are not."
    said = [
        f"{_name(one)}"
        + ("" if p.get(one.predictor) is None else f" (curvature p {p_value(p[one.predictor])})")
        for one in lock.pictures.straight
    ]
    outcome = "" if lock.answer is None else shown(lock.answer.outcome.column)
    return Picture(
        name="straight",
        title=TITLE,
        alt=(
            f"Each number in the model against its part of {outcome}: {listed(said, 12)}. {_farthest(panels)}"
        ),
        note=note,
        width=WIDTH,
        height=rows * (PANEL_HEIGHT + GAP_Y) + 0.02,
        draw=lambda sheet: _draw(sheet, panels, p, _units(lock)),
    )


def curvature_of(lock: Lock) -> Mapping[str, float | None]:
    """The last curvature p of each predictor."""
    return {
        check.subject: check.p
        for check in lock.checks.assumptions
        if check.check == "curvature" and check.subject is not None
    }


def chosen(panels: tuple[Straight, ...], p: Mapping[str, float | None]) -> tuple[Straight, ...]:
    """At most twelve, those with the smallest curvature p, in plan order."""
    if len(panels) <= MOST_PANELS:
        return panels
    first = sorted(
        range(len(panels)), key=lambda at: (1.0 if (v := p.get(panels[at].predictor)) is None else v, at)
    )
    kept = set(first[:MOST_PANELS])
    return tuple(one for at, one in enumerate(panels) if at in kept)


def _farthest(panels: tuple[Straight, ...]) -> str:
    """Where the means leave the model's line farthest, over the height of the panel."""
    found: list[tuple[float, str]] = []
    for one in panels:
        cloud = one.cloud
        slope = (one.at_high - one.at_low) / (cloud.x_high - cloud.x_low)
        away = max(abs(y - one.at_low - slope * (x - cloud.x_low)) for x, y in one.line)
        found.append((away / (cloud.y_high - cloud.y_low), _name(one)))
    size, name = max(found)
    return f"The means of neighbours leave the line farthest in {name}, by {100 * size:.0f} % of the height."


def _units(lock: Lock) -> Mapping[str, str | None]:
    return {one.column: one.unit for one in lock.checks.descriptives}


def _name(one: Straight) -> str:
    return under(shown(one.predictor), one.transform)


def _draw(
    sheet: Sheet,
    panels: tuple[Straight, ...],
    p: Mapping[str, float | None],
    units: Mapping[str, str | None],
) -> None:
    from matplotlib.ticker import MaxNLocator

    for at, one in enumerate(panels):
        row, column = divmod(at, IN_A_ROW)
        left = LEFT + column * (PANEL_WIDTH + GAP_X)
        axes = sheet.axes(left, 0.2 + row * (PANEL_HEIGHT + GAP_Y), PANEL_WIDTH, PANEL_HEIGHT)
        draw_cloud(axes, one.cloud, across=PANEL_WIDTH)
        stroke(axes, (one.cloud.x_low, one.cloud.x_high), (one.at_low, one.at_high), colour=INK, width=0.9,
               strength=QUIET, name="model")  # fmt: skip
        draw_line(axes, one.line, colour=VERMILION)
        axes.xaxis.set_major_locator(MaxNLocator(4))
        axes.yaxis.set_major_locator(MaxNLocator(4))
        unit = units.get(one.predictor)
        tail = f" [{shown(unit, 12)}]" if unit and one.transform == "identity" else ""
        value = p.get(one.predictor)
        tested = "" if value is None else ("p < 0.001" if value < 0.001 else f"p {value:.3f}")
        room = PANEL_WIDTH - sheet.width_of(tested, SMALL) - 0.06
        put(
            axes,
            0.0,
            1.045,
            sheet.fitted(_name(one) + tail, room),
            upright="bottom",
            transform=axes.transAxes,
        )
        put(axes, 1.0, 1.045, tested, at="right", size=SMALL, strength=0.75, upright="bottom",
            transform=axes.transAxes)  # fmt: skip
