"""What a replay came to: the same, or every difference with its place."""

from __future__ import annotations

import shlex
from typing import TYPE_CHECKING

from beforehand.screen.digits import count
from beforehand.screen.layout import INDENT, Section, page, shown, wrapped

if TYPE_CHECKING:
    from beforehand.lock.difference import Replay

# Beyond so many a screen helps nobody; --json has them all.
MOST_DIFFERENCES = 200


def replay_text(again: Replay, record: str, *, width: int = 100, colour: bool = False) -> str:
    """A replay as text; every difference stands on lines of its own with its place.

    Parameters
    ----------
    again : Replay
    record : str
        Name of the lockfile.
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    if not again.differences:
        told = (
            "Every byte of the record comes out again."
            if again.same_bytes
            else "Every number and ruling comes out again; only digits beyond the tolerance of 1e-8 differ."
        )
        return page(
            [Section(title=f"Same: {shown(record)}", lines=wrapped(told, width), tone="good")], colour=colour
        )
    lines: list[str] = []
    for difference in again.differences[:MOST_DIFFERENCES]:
        lines += wrapped(str(difference), width, rest=INDENT * 2)
    left = len(again.differences) - MOST_DIFFERENCES
    if left > 0:
        lines.append(f"{INDENT}{left:,} more: beforehand replay {shlex.quote(shown(record))} --json")
    title = f"Different: {shown(record)}, {count(len(again.differences), 'difference')}"
    return page([Section(title=title, lines=tuple(lines), tone="careful")], colour=colour)
