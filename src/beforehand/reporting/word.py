"""The report as a Word document: real headings, real tables, captions, pictures with text alternatives."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Mapping, Sequence
from datetime import UTC, datetime
from importlib.util import find_spec
from typing import Any

from beforehand.faults import Fault, InputError
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

# Every file of the package carries this date, so that the same report has the same bytes.
FIXED_DATE = (1980, 1, 1, 0, 0, 0)
CORE = "docProps/core.xml"
FIXED_TIME = datetime(2020, 1, 1, tzinfo=UTC)

# Tables with more columns than this have smaller letters.
FEW_COLUMNS = 8
TEXT_WIDTH_MM = 170.0

# Room for a letter of one point, and on both sides of a cell.
LETTER_MM = 0.27
PADDING_MM = 4.2

# A column that says more than this, or in longer words, is given no more room for it.
LONGEST_COLUMN = 90
LONGEST_WORD = 22


def word_of(document: Document, pictures: Mapping[str, Sequence[Drawn]]) -> bytes:
    """The whole report as the bytes of a ``.docx``.

    Parameters
    ----------
    document : Document
    pictures : mapping of name to drawn pictures
        As PNG.
    """
    if find_spec("docx") is None:
        what = "a Word document needs the package python-docx: pip install 'beforehand[report]'"
        raise InputError([Fault(file="report", line=None, place="", what=what, code="no_docx")])
    import docx
    from docx.shared import Mm, Pt

    made: Any = docx.Document()
    for part in made.sections:
        part.page_width, part.page_height = Mm(210), Mm(297)
        part.left_margin = part.right_margin = Mm(20)
        part.top_margin = part.bottom_margin = Mm(18)
    normal = made.styles["Normal"]
    normal.font.name, normal.font.size = "Cambria", Pt(10.5)
    made.core_properties.title = _clean(document.title)
    made.core_properties.author = "beforehand"
    made.core_properties.comments = ""
    made.core_properties.created = made.core_properties.modified = FIXED_TIME
    made.core_properties.last_modified_by = ""
    made.core_properties.language = "en"
    made.add_heading(_clean(document.title), level=0)
    made.add_paragraph(_clean(document.question), style="Subtitle")
    for one in document.sections:
        if not one.appendix:
            _section(made, one, pictures, 1)
    made.add_heading(words.APPENDIX, level=1)
    made.add_paragraph(words.TRACED)
    for one in document.sections:
        if one.appendix:
            _section(made, one, pictures, 2)
    made.add_paragraph(_clean(document.foot))
    raw = io.BytesIO()
    made.save(raw)
    return _fixed(raw.getvalue())


def _clean(text: str) -> str:
    """Text without the control characters that XML cannot hold."""
    return "".join(
        sign for sign in text if sign in "\t\n" or (ord(sign) >= 32 and not 0xFFFE <= ord(sign) <= 0xFFFF)
    )


def _section(made: Any, one: Section, pictures: Mapping[str, Sequence[Drawn]], level: int) -> None:
    made.add_heading(_clean(one.title), level=level)
    for block in one.blocks:
        _block(made, block, pictures)


def _block(made: Any, block: Block, pictures: Mapping[str, Sequence[Drawn]]) -> None:
    if isinstance(block, Paragraph):
        own = made.add_paragraph()
        for place, said in enumerate(block.sentences):
            _said(own, said, " " if place else "")
    elif isinstance(block, Listing):
        for said in block.items:
            _said(made.add_paragraph(style="List Bullet"), said, "")
    elif isinstance(block, Heading):
        made.add_heading(_clean(block.text), level=3)
    elif isinstance(block, Equation):
        made.add_paragraph(_clean(block.text), style="Intense Quote")
    elif isinstance(block, Picture):
        for one in pictures.get(block.name, ()):
            _picture(made, one)
    else:
        _table(made, block)


def _said(paragraph: Any, said: Said, before: str) -> None:
    """A sentence, and in brackets what it rests on."""
    paragraph.add_run(before + _clean(said.text))
    if said.rests_on:
        from docx.shared import Pt

        paragraph.add_run(f" [{', '.join(said.rests_on)}]").font.size = Pt(8)


def _picture(made: Any, one: Drawn) -> None:
    """A picture with its title as caption and its text alternative."""
    from docx.shared import Mm

    made.add_picture(io.BytesIO(one.png), width=Mm(TEXT_WIDTH_MM))
    shape = made.inline_shapes[-1]._inline.docPr
    shape.set("descr", _clean(one.alt))
    shape.set("title", _clean(one.title))
    made.add_paragraph(_clean(f"{one.title} {one.note}".strip()), style="Caption")


def _table(made: Any, grid: Grid) -> None:
    """A table with a header row that comes again on every page."""
    from docx.enum.text import WD_ALIGN_PARAGRAPH
    from docx.oxml import OxmlElement
    from docx.oxml.ns import qn
    from docx.shared import Mm, Pt

    made.add_paragraph(_clean(grid.caption), style="Caption").paragraph_format.keep_with_next = True
    rows, width = len(grid.columns[0].cells), len(grid.columns)
    table = made.add_table(rows=rows + 1, cols=width, style="Table Grid")
    table.autofit = False
    points = 8.0 if width <= FEW_COLUMNS else 6.0
    cells, small = table._cells, Pt(points)
    for at, (column, share) in enumerate(zip(grid.columns, _shares(grid, points * LETTER_MM), strict=True)):
        room = Mm(share * TEXT_WIDTH_MM)
        table.columns[at].width = room
        for place, text in enumerate((column.head, *column.cells)):
            cell = cells[place * width + at]
            cell.width = room
            paragraph = cell.paragraphs[0]
            run = paragraph.add_run(_clean(text))
            run.font.size, run.font.bold = small, place == 0
            paragraph.paragraph_format.space_after = Pt(0)
            if column.align == "right":
                paragraph.alignment = WD_ALIGN_PARAGRAPH.RIGHT
    first = table.rows[0]._tr.get_or_add_trPr()
    repeated = OxmlElement("w:tblHeader")
    repeated.set(qn("w:val"), "true")
    first.append(repeated)
    if grid.note:
        made.add_paragraph().add_run(_clean(grid.note)).font.size = Pt(8)
    made.add_paragraph().paragraph_format.space_after = Pt(2)


def _shares(grid: Grid, letter_mm: float) -> list[float]:
    """Share of the width that each column gets: its longest word first, what is left by how much it says."""
    least, more = [], []
    for column in grid.columns:
        texts = (column.head, *column.cells)
        longest = max((len(word) for text in texts for word in text.split()), default=1)
        whole = max((len(text) for text in texts), default=1)
        least.append(min(longest, LONGEST_WORD) * letter_mm + PADDING_MM)
        more.append(max(0, min(whole, LONGEST_COLUMN) - longest))
    left = max(0.0, TEXT_WIDTH_MM - sum(least))
    whole_more = sum(more)
    shares = [one / whole_more if whole_more else 1.0 / len(more) for one in more]
    room = [one + left * share for one, share in zip(least, shares, strict=True)]
    return [one / sum(room) for one in room]


def _fixed(content: bytes) -> bytes:
    """The package with fixed dates, its parts in order of their names."""
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new:
        # The part with the author stands first and as it is, so that a report can be told from any other
        # document by its first bytes.
        for name in sorted(old.namelist(), key=lambda name: (name != CORE, name)):
            entry = zipfile.ZipInfo(name, date_time=FIXED_DATE)
            entry.compress_type = zipfile.ZIP_STORED if name == CORE else zipfile.ZIP_DEFLATED
            entry.external_attr = 0o644 << 16
            new.writestr(entry, old.read(name))
    return out.getvalue()
