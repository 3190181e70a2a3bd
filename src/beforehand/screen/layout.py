"""Lines, sections and tables of plain text, aligned by the cells that a terminal gives each sign."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

# Longer lines of prose are hard to follow back to their start.
PROSE_WIDTH = 100
# Narrower than this the tables become lists and lines may pass the edge.
NARROWEST = 40
INDENT = "  "
GAP = "   "
NARROW_GAP = "  "
LONGEST_LABEL = 24
# A line may break at a space, but not between a number and its percent sign or its error.
_BREAK = re.compile(r"(?<!±) +(?![%±])")

Align = Literal["left", "right"]
Tone = Literal["plain", "good", "careful"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Section:
    """A heading and the lines beneath it.

    Attributes
    ----------
    title : str
    lines : tuple of str
        Lines as they stand, indented and no wider than the screen.
    tone : {"plain", "good", "careful"}
        Colours the heading where colour is used.
    close : bool
        Whether it follows the section above without an empty line.
    """

    title: str
    lines: tuple[str, ...] = ()
    tone: Tone = "plain"
    close: bool = False


_TONES: Mapping[Tone, str] = {"plain": "\x1b[1m", "good": "\x1b[1;32m", "careful": "\x1b[1;33m"}
_RESET = "\x1b[0m"


def page(sections: Sequence[Section], *, colour: bool = False) -> str:
    """The sections one under the other with an empty line between, ending in a newline."""
    lines: list[str] = []
    for section in sections:
        if lines and not section.close:
            lines.append("")
        title = f"{_TONES[section.tone]}{section.title}{_RESET}" if colour else section.title
        lines += [title, *(line.rstrip() for line in section.lines)]
    return "\n".join(lines) + "\n"


def shown(text: str) -> str:
    """The text with control signs made visible, so that a name in a table cannot steer a terminal."""
    if text.isprintable():
        return text
    return "".join(sign if sign.isprintable() else _visible(sign) for sign in text)


def _visible(sign: str) -> str:
    """A sign that does not print, written out; joiners and unusual spaces pass as they are."""
    if sign == "\u200d":
        return sign
    if sign.isspace():
        return " "
    return sign.encode("unicode_escape").decode("ascii")


def cells(text: str) -> int:
    """Cells of a terminal that a text takes: 2 for a wide sign, 0 for a combining one."""
    if text.isascii():
        return len(text)
    from rich.cells import cell_len

    return cell_len(text)


def pad(text: str, width: int, align: Align = "left") -> str:
    """The text filled with spaces to ``width`` cells."""
    space = " " * max(0, width - cells(text))
    return space + text if align == "right" else text + space


def shorten(text: str, width: int) -> str:
    """The text with … in its middle where it takes more than ``width`` cells."""
    if cells(text) <= width:
        return text
    if width < 3:
        return _head(text, width)
    head = _head(text, (width - 1) - (width - 1) // 2)
    return head + "…" + _tail(text, width - 1 - cells(head))


def _head(text: str, width: int) -> str:
    """As much of the start as fits in ``width`` cells."""
    stop = min(len(text), width)
    while stop and cells(text[:stop]) > width:
        stop -= 1
    # What follows without width of its own (an accent) belongs to the sign before it.
    while stop < len(text) and stop and cells(text[: stop + 1]) <= width:
        stop += 1
    return text[:stop]


def _tail(text: str, width: int) -> str:
    """As much of the end as fits in ``width`` cells, never beginning with a lone accent."""
    start = max(0, len(text) - width)
    while start < len(text) and (cells(text[start:]) > width or cells(text[start]) == 0):
        start += 1
    return text[start:]


def wrapped(text: str, width: int, *, first: str = INDENT, rest: str | None = None) -> tuple[str, ...]:
    """The text broken at spaces into lines of at most ``width`` cells.

    Parameters
    ----------
    first, rest : str
        What stands before the first and before every other line; ``rest`` is as wide as ``first``
        where it is not given.
    """
    rest = " " * cells(first) if rest is None else rest
    width = min(width, PROSE_WIDTH)
    lines: list[str] = []
    line, empty = first, True
    for word in _BREAK.split(shown(text).strip()):
        room = width - cells(line) - (0 if empty else 1)
        if cells(word) > room and not empty:
            lines.append(line)
            line, empty = rest, True
            room = width - cells(line)
        while cells(word) > max(room, 8):
            piece = _head(word, max(room, 8))
            lines.append(line + piece)
            word, line = word[len(piece) :], rest
            room = width - cells(line)
        line = line + word if empty else f"{line} {word}"
        empty = False
    if not empty or not lines:
        lines.append(line)
    return tuple(lines)


def labelled(pairs: Sequence[tuple[str, str]], width: int) -> tuple[str, ...]:
    """One line a pair, the labels in one column and the texts wrapped in a second."""
    pairs = [(shorten(shown(label), max(LONGEST_LABEL, width // 3)), text) for label, text in pairs]
    column = max((cells(label) for label, _ in pairs), default=0)
    lines: list[str] = []
    for label, text in pairs:
        lines += wrapped(text, width, first=INDENT + pad(label, column) + GAP)
    return tuple(lines)


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    head : str
        Its label; broken at spaces over several lines where the table is tight.
    texts : tuple of str
        One text a row.
    align : {"left", "right"}
    least : int
        Cells below which the column is not narrowed; 0 for one that is never shortened.
    """

    head: str
    texts: tuple[str, ...]
    align: Align = "right"
    least: int = 0


def table(columns: Sequence[Column], width: int, *, shortening: bool = True) -> tuple[str, ...] | None:
    """The columns side by side, or None where they do not fit in ``width`` cells.

    Heads are broken first, then the gaps give way, then, with ``shortening``, the widest column that
    may be shortened.
    """
    for broken, gap in ((False, GAP), (True, GAP), (True, NARROW_GAP)):
        heads = [_head_lines(column, broken) for column in columns]
        widths = [
            max([cells(text) for text in (*lines, *column.texts)], default=0)
            for lines, column in zip(heads, columns, strict=True)
        ]
        spare = width - len(INDENT) - len(gap) * (len(columns) - 1) - sum(widths)
        if spare >= 0:
            return _drawn(columns, heads, widths, gap)
    for place in sorted(range(len(columns)), key=lambda place: -widths[place]) if shortening else ():
        least = columns[place].least
        if least and spare < 0:
            given = min(-spare, max(0, widths[place] - least))
            widths[place] -= given
            spare += given
    return _drawn(columns, heads, widths, NARROW_GAP) if spare >= 0 else None


def _head_lines(column: Column, broken: bool) -> tuple[str, ...]:
    """The label on one line, or on as few lines as the texts beneath are wide."""
    if not broken:
        return (column.head,)
    longest = max((cells(word) for word in column.head.split()), default=0)
    room = max(longest, *(cells(text) for text in column.texts), 1)
    return wrapped(column.head, max(room, 1), first="") if column.head else ("",)


def _drawn(
    columns: Sequence[Column], heads: Sequence[tuple[str, ...]], widths: Sequence[int], gap: str
) -> tuple[str, ...]:
    """The table's lines: labels, then one line a row."""
    depth = max(len(lines) for lines in heads)
    rows = [tuple(("",) * (depth - len(lines)) + lines)[line] for line in range(depth) for lines in heads]
    grid = [rows[start : start + len(columns)] for start in range(0, len(rows), len(columns))]
    grid += [list(row) for row in zip(*(column.texts for column in columns), strict=True)]
    return tuple(
        (
            INDENT
            + gap.join(
                pad(shorten(text, wide), wide, column.align)
                for text, wide, column in zip(row, widths, columns, strict=True)
            )
        ).rstrip()
        for row in grid
    )


def on_point(texts: Sequence[str], widest: int = 14) -> tuple[str, ...]:
    """Numbers filled on the right so that their decimal points stand under each other.

    Left as they are where that would take more than ``widest`` cells, and where one has an exponent.
    """
    if any("e-" in text or "e+" in text for text in texts):
        return tuple(texts)
    after = [len(text) - text.index(".") if "." in text else 0 for text in texts]
    most = max(after, default=0)
    filled = tuple(text + " " * (most - own) for text, own in zip(texts, after, strict=True))
    return filled if max(map(len, filled), default=0) <= widest else tuple(texts)
