"""Pages of the guide on a terminal: prose wrapped, commands and examples as they are written."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import TYPE_CHECKING

from beforehand.screen.layout import INDENT, Section, labelled, page, wrapped

if TYPE_CHECKING:
    from beforehand.guide import Page

_HEADING = re.compile(r"^#+ +")
_ITEM = re.compile(r"^(\s*)([-*]|\d+\.) +")
_FENCE = "```"


def page_list_text(pages: Sequence[Page], *, width: int = 100, colour: bool = False) -> str:
    """The list of pages with their summaries."""
    lines = labelled([(one.name, one.summary) for one in pages], width)
    ask = wrapped("beforehand guide PAGE shows one of them.", width)
    return page(
        [Section(title="Pages of the guide", lines=lines), Section(title="", lines=ask, close=True)],
        colour=colour,
    )


def page_text(source: str, *, width: int = 100, colour: bool = False) -> str:
    """One page, from its Markdown.

    Parameters
    ----------
    source : str
        Headings, paragraphs, lists and examples (indented by four or fenced); nothing else.
    width : int
        Cells of a line; examples are never broken.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    sections: list[Section] = []
    title, lines = "", []
    fenced = False
    for line in source.rstrip("\n").split("\n"):
        if line.startswith(_FENCE):
            fenced = not fenced
        elif fenced or line.startswith("    "):
            lines.append(line if line.startswith("    ") else INDENT * 2 + line)
        elif _HEADING.match(line):
            sections.append(Section(title=title, lines=_trimmed(lines)))
            title, lines = _HEADING.sub("", line), []
        else:
            lines += _prose(line, width)
    sections.append(Section(title=title, lines=_trimmed(lines)))
    return page([section for section in sections if section.title or section.lines], colour=colour)


def _prose(line: str, width: int) -> tuple[str, ...]:
    """A paragraph or an item of a list, which stand on one line of the source each."""
    if not line.strip():
        return ("",)
    item = _ITEM.match(line)
    if item is None:
        return wrapped(line.replace("`", ""), width)
    first = f"{INDENT}{item[1]}{item[2]} "
    return wrapped(line[item.end() :].replace("`", ""), width, first=first)


def _trimmed(lines: Sequence[str]) -> tuple[str, ...]:
    """The lines without empty ones at both ends."""
    kept = list(lines)
    while kept and not kept[0]:
        kept.pop(0)
    while kept and not kept[-1]:
        kept.pop()
    return tuple(kept)
