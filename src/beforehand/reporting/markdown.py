"""The report as Markdown: headings, lists and pipe tables, without markup of its own in any text."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from beforehand.reporting import words
from beforehand.reporting.document import (
    Block,
    Document,
    Equation,
    Grid,
    Heading,
    Listing,
    Paragraph,
    Picture,
    Said,
    Section,
)
from beforehand.reporting.drawn import Drawn

SIGN = "<!-- Written by beforehand. -->"

_SPECIAL = re.compile(r"([\\`*_{}\[\]<>#|~$])")
# What would begin a list, a quotation or a heading at the start of a line.
_STARTS = re.compile(r"^(\d*)([-+>=.)])(?=\s|$)")


def markdown_of(document: Document, pictures: Mapping[str, Sequence[Drawn]]) -> str:
    """The whole report as text; of each picture its title and text alternative."""
    parts = [SIGN, f"# {plain(document.title)}", f"*{plain(document.question)}*"]
    for one in document.sections:
        if not one.appendix:
            parts += _section(one, pictures, "##")
    parts += [f"## {plain(words.APPENDIX)}", plain(words.TRACED)]
    for one in document.sections:
        if one.appendix:
            parts += _section(one, pictures, "###")
    parts.append(f"---\n\n{plain(document.foot)}")
    return "\n\n".join(parts) + "\n"


def plain(text: str) -> str:
    """Text in which nothing is markup, on one line."""
    one_line = " ".join(text.split())
    return _STARTS.sub(r"\1\\\2", _SPECIAL.sub(r"\\\1", one_line))


def _section(one: Section, pictures: Mapping[str, Sequence[Drawn]], level: str) -> list[str]:
    return [
        f"{level} {plain(one.title)}",
        *(text for block in one.blocks if (text := _block(block, pictures))),
    ]


def _block(block: Block, pictures: Mapping[str, Sequence[Drawn]]) -> str:
    if isinstance(block, Paragraph):
        return " ".join(_said(said) for said in block.sentences)
    if isinstance(block, Listing):
        return "\n".join(f"- {_said(said)}" for said in block.items)
    if isinstance(block, Heading):
        return f"**{plain(block.text)}**"
    if isinstance(block, Equation):
        return f"> {plain(block.text)}"
    if isinstance(block, Picture):
        return "\n\n".join(f"**{plain(one.title)}** {plain(one.alt)}" for one in pictures.get(block.name, ()))
    return _table(block)


def _said(said: Said) -> str:
    """A sentence, and in brackets what it rests on."""
    return plain(said.text) + (f" \\[{', '.join(said.rests_on)}\\]" if said.rests_on else "")


def _table(grid: Grid) -> str:
    heads = " | ".join(plain(column.head) for column in grid.columns)
    rule = " | ".join("---:" if column.align == "right" else ":---" for column in grid.columns)
    rows = [
        f"| {' | '.join(plain(column.cells[place]) for column in grid.columns)} |"
        for place in range(len(grid.columns[0].cells))
    ]
    table = "\n".join([f"| {heads} |", f"| {rule} |", *rows])
    note = f"\n\n{plain(grid.note)}" if grid.note else ""
    return f"**{plain(grid.caption)}**\n\n{table}{note}"
