"""What moved with the refreshed data: each coefficient's shift, and where it comes from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from beforehand.picturing.picture import Picture, listed, shown
from beforehand.picturing.sheet import (
    BLUE,
    GREEN,
    INK,
    ORANGE,
    PURPLE,
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
from beforehand.refreshing import Refreshed, as_mapping
from beforehand.wording import number

TITLE = "What moved with the refreshed data?"

MOST_TERMS = 40
PITCH = 0.23

PARTS = (
    ("from_new_rows", "new rows", BLUE),
    ("from_gone_rows", "rows that are gone", ORANGE),
    ("from_revised_rows", "revised rows", GREEN),
    ("from_other_form", "another form of the model", PURPLE),
)


@dataclass(frozen=True, slots=True)
class Shift:
    """One coefficient in both answers; shift and parts in standard errors of the old one.

    ``size`` is None where one answer does not have it; ``parts`` is empty where the shift cannot be
    divided.
    """

    term: str
    old: float | None
    new: float | None
    size: float | None
    parts: tuple[float, ...]


def moved(record: Refreshed | Mapping[str, Any], limit: float | None = None) -> Picture | None:
    """What moved in a refresh; None where there are no coefficients to compare.

    Parameters
    ----------
    record : Refreshed or mapping
        A refresh, or its record as read from a ``NAME.refresh.yaml``.
    limit : float, optional
        The plan's limit of a shift, in old standard errors.
    """
    data = as_mapping(record) if isinstance(record, Refreshed) else record
    shifts = shifts_of(data)
    if not shifts:
        return None
    both = [one for one in shifts if one.size is not None]
    others = [one for one in shifts if one.size is None]
    ordered = (*sorted(both, key=lambda one: -abs(one.size or 0.0)), *others)
    drawn = ordered[:MOST_TERMS]
    note = (
        "Shift of each coefficient in standard errors of the old one (dot); bars divide it by where it "
        "comes from. "
        "At the right the old and the new coefficient."
    )
    if limit is not None:
        note += f" Dashed: the plan's limit of {limit:g}."
    if len(drawn) < len(ordered):
        note += f" {len(drawn)} of {len(ordered)} are shown, those that moved most."
    said = [f"{shown(one.term)} {number(one.size, 2)}" for one in ordered if one.size is not None]
    alt = f"The answer {_verdict(data)}. {_rows(data)}"
    if said:
        alt += f" Shifts in standard errors of the old coefficient: {listed(said, 12)}."
    for words, gone in (("Only in the old answer", True), ("Only in the new answer", False)):
        names = [shown(one.term) for one in others if (one.new is None) == gone]
        if names:
            alt += f" {words}: {listed(names)}."
    return Picture(
        name="moved",
        title=TITLE,
        alt=alt,
        note=note,
        width=WIDTH,
        height=PITCH * len(drawn) + 1.0,
        draw=lambda sheet: _draw(sheet, tuple(drawn), limit, _rows(data)),
    )


def shifts_of(data: Mapping[str, Any]) -> tuple[Shift, ...]:
    """Every coefficient of either answer, in the order of the record."""
    found: list[Shift] = []
    for one in data["coefficients"]:
        old, new, size = one["old"], one["new"], one["shift_in_old_se"]
        parts: tuple[float, ...] = ()
        if size and old is not None and new is not None and new != old:
            # One standard error of the old coefficient, from the shift in both units.
            unit = (new - old) / size
            amounts = [one[name] for name, *_ in PARTS]
            if any(amount is not None for amount in amounts):
                parts = tuple((amount or 0.0) / unit for amount in amounts)
        found.append(Shift(str(one["term"]), old, new, size, parts))
    return tuple(found)


def _verdict(data: Mapping[str, Any]) -> str:
    return {"holds": "holds", "moved": "moved", "broken": "does not hold"}.get(
        str(data["verdict"]), "was compared"
    )


def _rows(data: Mapping[str, Any]) -> str:
    rows = data.get("rows")
    if rows is None:
        return ""
    said = [
        f"{len(rows[name]):,} {words}"
        for name, words in (("new", "new"), ("gone", "gone"), ("revised", "revised"), ("same", "unchanged"))
    ]
    return f"Rows: {', '.join(said)}."


def _draw(sheet: Sheet, shifts: tuple[Shift, ...], limit: float | None, rows: str) -> None:
    told = [_both(one) for one in shifts]
    names = 0.16 + sheet.room_for([shown(one.term) for one in shifts], 0.8, 2.2)
    figures = 0.2 + sheet.room_for(told, 0.8, 1.9, SMALL)
    width, tall = sheet.width - names - figures, PITCH * len(shifts)
    axes = sheet.axes(names, 0.52, width, tall, lines="x")
    ends = [0.0]
    for one in shifts:
        ends += [one.size or 0.0, sum(p for p in one.parts if p > 0), sum(p for p in one.parts if p < 0)]
    reach = max(max(abs(value) for value in ends), 0.0 if limit is None else 1.08 * limit, 0.1)
    low = min(min(ends), 0.0 if limit is None else -1.08 * limit)
    high = max(max(ends), 0.0 if limit is None else 1.08 * limit)
    axes.set(xlim=(low - 0.04 * reach, high + 0.04 * reach), ylim=(len(shifts) - 0.5, -0.5), yticks=[])
    axes.spines["left"].set_visible(False)
    axes.axvline(0.0, color=INK, linewidth=0.9, alpha=QUIET, zorder=1)
    axes.set_xlabel("shift in standard errors of the old coefficient")
    if limit is not None:
        for x in (-limit, limit):
            stroke(
                axes,
                (x, x),
                (-0.5, len(shifts) - 0.5),
                colour=VERMILION,
                width=1.0,
                dashes=(4.0, 2.0),
                name="limit",
            )
    beside = axes.get_yaxis_transform()
    for at, one in enumerate(shifts):
        put(axes, -0.09 / width, at, sheet.fitted(shown(one.term), names - 0.1), at="right", transform=beside)
        put(
            axes,
            1.0 + 0.13 / width,
            at,
            sheet.fitted(told[at], figures - 0.1, SMALL),
            size=SMALL,
            transform=beside,
        )
        sides = {True: 0.0, False: 0.0}
        for part, (_, _, colour) in zip(one.parts, PARTS, strict=False):
            start = sides[part > 0]
            if part:
                bar(
                    axes,
                    min(start, start + part),
                    max(start, start + part),
                    at,
                    0.5,
                    colour=colour,
                    strength=0.7,
                    name="part",
                )
            sides[part > 0] = start + part
        if one.size is not None:
            mark(axes, one.size, at, size=4.6, colour=INK, name="shift")
    canvas = sheet.canvas()
    put(canvas, names, 0.12, rows, size=SMALL, strength=0.85)
    x = names
    for place, (_, words, colour) in enumerate(PARTS):
        if any(len(one.parts) > place and one.parts[place] for one in shifts):
            bar(canvas, x, x + 0.1, 0.34, 0.09, colour=colour, strength=0.7)
            put(canvas, x + 0.15, 0.34, words, size=SMALL, strength=0.85)
            x += 0.15 + sheet.width_of(words, SMALL) + 0.2


def _both(one: Shift) -> str:
    """Old and new coefficient."""
    if one.old is None:
        return f"new: {number(one.new)}".replace("-", "−")
    if one.new is None:
        return f"gone: {number(one.old)}".replace("-", "−")
    return f"{number(one.old)} → {number(one.new)}".replace("-", "−")
