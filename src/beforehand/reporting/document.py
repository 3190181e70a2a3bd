"""A report before it has a form: sections of sentences, tables and pictures, the same for every form."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

Align = Literal["left", "right"]


@dataclass(frozen=True, slots=True)
class Said:
    """One sentence, and the rulings, fits or checks of the lock that it rests on."""

    text: str
    rests_on: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Paragraph:
    """Sentences that follow each other."""

    sentences: tuple[Said, ...]


@dataclass(frozen=True, slots=True)
class Listing:
    """Sentences one below the other."""

    items: tuple[Said, ...]


@dataclass(frozen=True, slots=True)
class Equation:
    """An equation in words."""

    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column of a table: its head, its cells, which way they lean."""

    head: str
    cells: tuple[str, ...]
    align: Align = "right"


@dataclass(frozen=True, slots=True, kw_only=True)
class Grid:
    """A table; the cells of its first column name the rows."""

    caption: str
    columns: tuple[Column, ...]
    note: str = ""


@dataclass(frozen=True, slots=True)
class Heading:
    """A small heading within a section."""

    text: str


@dataclass(frozen=True, slots=True)
class Picture:
    """A picture by its name in the table of pictures."""

    name: str


Block = Paragraph | Listing | Equation | Heading | Grid | Picture


@dataclass(frozen=True, slots=True, kw_only=True)
class Section:
    """A part of the report under a heading.

    Attributes
    ----------
    key : str
        A stable name, by which others refer to it.
    title : str
    blocks : tuple of Block
    appendix : bool
        Whether it stands behind the key finding and the text to paste.
    """

    key: str
    title: str
    blocks: tuple[Block, ...]
    appendix: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Document:
    """The whole report.

    Attributes
    ----------
    title, question : str
    sections : tuple of Section
    foot : str
        What the report was made from.
    """

    title: str
    question: str
    sections: tuple[Section, ...]
    foot: str


def paragraph(*sentences: Said | None) -> Paragraph:
    """A paragraph of the sentences that there are."""
    return Paragraph(tuple(said for said in sentences if said is not None and said.text))


def section(key: str, title: str, blocks: Sequence[Block | None], *, appendix: bool = True) -> Section | None:
    """A section of the blocks that there are; None where there is none."""
    kept = tuple(block for block in blocks if block is not None and not _empty(block))
    return Section(key=key, title=title, blocks=kept, appendix=appendix) if kept else None


def _empty(block: Block) -> bool:
    """Whether a block has nothing to show."""
    if isinstance(block, Paragraph):
        return not block.sentences
    if isinstance(block, Listing):
        return not block.items
    return isinstance(block, Grid) and not (block.columns and block.columns[0].cells)
