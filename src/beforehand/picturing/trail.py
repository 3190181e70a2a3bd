"""The decision trail: every predictor as a line through the steps, ending where a ruling removed it."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import TYPE_CHECKING

from beforehand.lock import Lock
from beforehand.picturing.picture import Picture, counted, listed, shown
from beforehand.picturing.rungs import rung_sign
from beforehand.picturing.sheet import (
    BLUE,
    FAINT,
    GREEN,
    QUIET,
    SMALL,
    VERMILION,
    WIDTH,
    Sheet,
    bar,
    mark,
    put,
    stroke,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes

TITLE = "Which way did each predictor go?"

# Lines beyond so many are told together.
MOST_LINES = 44

RIGHT = 0.62
TOP, PITCH, BAND = 0.42, 0.185, 0.13

READ, ANSWER = "read", "answer"


@dataclass(frozen=True, slots=True)
class Line:
    """One predictor on its way.

    Attributes
    ----------
    name : str
    kept : bool
        Whether it reaches the end.
    end : int
        Station at which it ends.
    ruling : str or None
        The ruling that decided it.
    looked : tuple of int
        Stations with a ruling about it.
    turned : tuple of int and str, or None
        Where it was transformed, and the sign of its rung.
    """

    name: str
    kept: bool
    end: int
    ruling: str | None
    looked: tuple[int, ...]
    turned: tuple[int, str] | None


@dataclass(frozen=True, slots=True)
class RowsLeft:
    """Rows that left at a station, and how many stayed."""

    station: int
    left: int
    stayed: int


def trail(lock: Lock) -> Picture | None:
    """The decision trail of a run; None for a lock without predictors."""
    if not lock.predictors:
        return None
    stations = stations_of(lock)
    lines = lines_of(lock, stations)
    rows = rows_of(lock, stations)
    drawn, rest = limited(lines)
    height = TOP + PITCH * (len(drawn) + (1 if rest else 0)) + 0.62
    return Picture(
        name="trail",
        title=TITLE,
        alt=_words(lock, lines, stations),
        note=(
            ""
            if not rest
            else f"The {len(rest)} predictors that left first stand together in the last line. "
        )
        + (
            "Each line is a predictor on its way through the steps. A dot is a ruling about it; a cross is "
            "the ruling, named beside it, by which it leaves. The band beneath is the rows in use."
        ),
        width=WIDTH,
        height=height,
        draw=lambda sheet: _draw(sheet, lock, stations, drawn, rest, rows),
    )


def stations_of(lock: Lock) -> tuple[str, ...]:
    """What a line passes: reading, the steps of the plan in their order, the answer."""
    written = lock.plan.written.get("steps")
    steps = [str(step) for step in written] if isinstance(written, tuple | list) else []
    used = dict.fromkeys(
        [*(ruling.step for ruling in lock.rulings), *(row.step for row in lock.rows_removed)]
    )
    missing = [step for step in used if step not in steps]
    first = [step for step in missing if step == "missing_data"]
    return (READ, *first, *steps, *(step for step in missing if step not in first), ANSWER)


def lines_of(lock: Lock, stations: tuple[str, ...]) -> tuple[Line, ...]:
    """Every predictor's way, in plan order."""
    place = {step: at for at, step in enumerate(stations)}
    rulings = {ruling.id: ruling for ruling in lock.rulings}
    looked: dict[str, dict[int, None]] = {}
    turned: dict[str, int] = {}
    for ruling in lock.rulings:
        looked.setdefault(ruling.subject, {})[place[ruling.step]] = None
        if ruling.verdict == "transform":
            turned[ruling.subject] = place[ruling.step]
    found: list[Line] = []
    for name, fate in lock.predictors.items():
        kept = fate.verdict != "removed"
        decided = rulings.get(fate.ruling or "")
        end = len(stations) - 1 if kept or decided is None else place[decided.step]
        sign = None if fate.transform is None or name not in turned else rung_sign(fate.transform)
        found.append(
            Line(
                name=name,
                kept=kept,
                end=end,
                ruling=fate.ruling,
                looked=tuple(at for at in looked.get(name, {}) if at < end),
                turned=None if sign is None else (turned[name], sign),
            )
        )
    return tuple(found)


def rows_of(lock: Lock, stations: tuple[str, ...]) -> tuple[RowsLeft, ...]:
    """Rows lost at each station, from the ledger; stations at which none is lost are left out."""
    place = {step: at for at, step in enumerate(stations)}
    step_of = {ruling.id: ruling.step for ruling in lock.rulings}
    found: dict[int, list[int]] = {}
    before = lock.ledger[0].rows if lock.ledger else 0
    for stage in lock.ledger:
        lost, before = before - stage.rows, stage.rows
        if not lost:
            continue
        if stage.stage in ("with an outcome", "complete"):
            at = place.get("missing_data", 0)
        elif stage.stage.startswith("after R"):
            at = place.get(step_of.get(stage.stage.removeprefix("after "), ""), 0)
        else:
            at = 0
        seen = found.setdefault(at, [0, 0])
        found[at] = [seen[0] + lost, stage.rows]
    return tuple(RowsLeft(at, lost, stayed) for at, (lost, stayed) in sorted(found.items()))


def limited(lines: tuple[Line, ...], most: int = MOST_LINES) -> tuple[tuple[Line, ...], tuple[Line, ...]]:
    """The lines to draw, in plan order, and those told together: the first to leave."""
    if len(lines) <= most:
        return lines, ()
    last = sorted(range(len(lines)), key=lambda at: (not lines[at].kept, -lines[at].end, at))
    drawn = set(last[: most - 1])
    return (
        tuple(line for at, line in enumerate(lines) if at in drawn),
        tuple(line for at, line in enumerate(lines) if at not in drawn),
    )


def _words(lock: Lock, lines: tuple[Line, ...], stations: tuple[str, ...]) -> str:
    """The trail in words."""
    kept = [shown(line.name) for line in lines if line.kept]
    if lock.status == "adopted":
        where = "the adopted answer"
    elif lock.status == "stopped":
        where = "the point where the run stopped"
    else:
        where = "the end"
    said = [f"{len(kept)} of {counted(len(lines), 'predictor reaches', 'predictors reach')} {where}"]
    if kept:
        said[0] += f": {listed(kept, 20)}"
    for at, step in enumerate(stations):
        gone = [
            shown(line.name) + (f" ({line.ruling})" if line.ruling else "")
            for line in lines
            if not line.kept and line.end == at
        ]
        if gone:
            said.append(
                f"In {step.replace('_', ' ')} {listed(gone, 12)} {'leaves' if len(gone) == 1 else 'leave'}"
            )
    if lock.ledger:
        said.append(f"Rows: {lock.ledger[0].rows:,} read, {lock.ledger[-1].rows:,} in use")
    return ". ".join(said) + "."


def _draw(
    sheet: Sheet,
    lock: Lock,
    stations: tuple[str, ...],
    lines: tuple[Line, ...],
    rest: tuple[Line, ...],
    rows: tuple[RowsLeft, ...],
) -> None:
    axes = sheet.canvas()
    names = 0.16 + sheet.room_for([shown(line.name) for line in lines], 1.1, 2.2)
    step = (sheet.width - names - RIGHT) / max(len(stations) - 1, 1)
    xs = [names + step * at for at in range(len(stations))]
    bottom = TOP + PITCH * (len(lines) + (1 if rest else 0))
    for x, station in zip(xs, stations, strict=True):
        stroke(axes, (x, x), (TOP - 0.06, bottom + 0.36), strength=FAINT, width=0.6, above=0.5)
        words = sheet.fitted(station.replace("_", " "), step * 1.6, SMALL).split(" ")
        put(axes, x, TOP - 0.1, "\n".join(words), at="center", size=SMALL, strength=0.8, upright="baseline",
            linespacing=0.95)  # fmt: skip
    for at, line in enumerate(lines):
        _line(sheet, axes, line, TOP + PITCH * (at + 0.5), xs)
    if rest:
        y = TOP + PITCH * (len(lines) + 0.5)
        last = max(line.end for line in rest)
        stroke(axes, (xs[0], xs[last]), (y, y), strength=QUIET, width=0.9, dashes=(1.5, 2.0))
        put(axes, xs[0] - 0.1, y, f"{len(rest)} more", at="right", strength=0.8)
        ends = Counter(line.end for line in rest if not line.kept)
        for end, count in ends.items():
            mark(axes, xs[end], y, shape="x", size=4.0, colour=VERMILION)
            put(axes, xs[end] + 0.07, y + 0.02, f"{count}×", size=SMALL, colour=VERMILION)
    _rows(sheet, axes, lock, rows, xs, bottom + 0.3)


def _line(sheet: Sheet, axes: Axes, line: Line, y: float, xs: list[float]) -> None:
    """One predictor."""
    colour = BLUE if line.kept else None
    name = sheet.fitted(shown(line.name), xs[0] - 0.14)
    put(axes, xs[0] - 0.1, y, name, at="right", strength=1.0 if line.kept else 0.75)
    end = xs[line.end]
    if colour is not None:
        stroke(axes, (xs[0], end), (y, y), colour=colour, width=1.5, name="kept")
        mark(axes, end, y, size=5.0, name="reaches")
    else:
        stroke(axes, (xs[0], end), (y, y), strength=QUIET, width=0.9, name="leaves")
        mark(axes, end, y, shape="x", size=4.2, colour=VERMILION, name="removed")
    for at in line.looked:
        if line.turned is None or at != line.turned[0]:
            axes.plot(
                [xs[at]], [y], linestyle="none", marker="o", markersize=2.6, zorder=3,
                color=colour or "#8a8f98",
            )  # fmt: skip
    if line.turned is not None:
        at, sign = line.turned
        axes.plot([xs[at]], [y], linestyle="none", marker="D", markersize=4.0, color=GREEN, zorder=3)
        put(axes, xs[at] + 0.07, y - 0.065, sign, size=6.5, colour=GREEN)
    if line.ruling is not None:
        gap = 0.09
        put(axes, end + gap, y, line.ruling, size=SMALL, colour=BLUE if line.kept else VERMILION)


def _rows(
    sheet: Sheet, axes: Axes, lock: Lock, rows: tuple[RowsLeft, ...], xs: list[float], y: float
) -> None:
    """The band of rows: as thick as rows are left."""
    if not lock.ledger:
        return
    read, used = lock.ledger[0].rows, lock.ledger[-1].rows
    put(axes, xs[0] - 0.1, y, f"{counted(read, 'row', 'rows')} read", at="right", strength=0.75)
    left, start = read, xs[0]
    for one in (*rows, None):
        stop = xs[-1] if one is None else xs[one.station]
        if stop > start:
            bar(axes, start, stop, y, BAND * left / max(read, 1), colour=BLUE, strength=0.45, name="rows")
        if one is not None:
            put(axes, stop, y + 0.16, f"−{one.left:,}", at="center", size=SMALL, colour=VERMILION)
            left, start = one.stayed, stop
    put(axes, xs[-1] + 0.09, y - 0.055, f"{used:,}", size=SMALL, colour=BLUE)
    put(axes, xs[-1] + 0.09, y + 0.055, "in use", size=SMALL, colour=BLUE)
