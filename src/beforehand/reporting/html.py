"""The report as one page of HTML that needs nothing else: no script, no network, no other file."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from html import escape
from importlib.resources import files

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

# A cell of more characters than this is text, and gets room to wrap in.
LONG_CELL = 40


def html_of(document: Document, pictures: Mapping[str, Sequence[Drawn]]) -> str:
    """One self-contained page.

    Parameters
    ----------
    document : Document
    pictures : mapping of name to drawn pictures
        As SVG.
    """
    anchors = _anchors(document)
    main = [one for one in document.sections if not one.appendix]
    details = [one for one in document.sections if one.appendix]
    parts = [
        "<!doctype html>",
        '<html lang="en">',
        "<head>",
        '<meta charset="utf-8">',
        '<meta name="viewport" content="width=device-width, initial-scale=1">',
        '<meta name="color-scheme" content="light dark">',
        '<meta name="generator" content="beforehand">',
        f"<title>{escape(document.title)}</title>",
        f"<style>{_css()}</style>",
        "</head>",
        "<body>",
        f'<a class="skip" href="#part-key">{escape(words.SKIP)}</a>',
        "<header>",
        f"<h1>{escape(document.title)}</h1>",
        f'<p class="question">{escape(document.question)}</p>',
        "</header>",
        "<main>",
        *(_section(one, pictures, anchors) for one in main),
        f'<h2 class="divider" id="details">{escape(words.APPENDIX)}</h2>',
        f'<p class="note">{escape(words.TRACED)}</p>',
        _contents(details),
        *(_section(one, pictures, anchors) for one in details),
        "</main>",
        f"<footer><p>{escape(document.foot)}</p></footer>",
        "</body>",
        "</html>",
        "",
    ]
    return "\n".join(parts)


def _css() -> str:
    """The style of the page."""
    return files("beforehand.reporting").joinpath("page.css").read_text(encoding="utf-8")


def _contents(sections: Sequence[Section]) -> str:
    """A list of the sections, for a reader who looks for one."""
    items = "".join(f'<li><a href="#part-{one.key}">{escape(one.title)}</a></li>' for one in sections)
    return f'<nav aria-label="{escape(words.CONTENTS)}"><ol>{items}</ol></nav>'


def _anchors(document: Document) -> frozenset[str]:
    """Rulings and checks that have a row of their own in a table, to which a number can lead."""
    found: set[str] = set()
    for one in document.sections:
        for block in one.blocks:
            if isinstance(block, Grid) and block.columns[0].head in ("Ruling", "Check"):
                found |= set(block.columns[0].cells)
    return frozenset(found)


def _section(one: Section, pictures: Mapping[str, Sequence[Drawn]], anchors: frozenset[str]) -> str:
    """A section with its heading; details stand one level lower."""
    level = "h3" if one.appendix else "h2"
    inner = "\n".join(_block(block, pictures, anchors) for block in one.blocks)
    return (
        f'<section id="part-{one.key}" aria-labelledby="part-{one.key}-title">\n'
        f'<{level} id="part-{one.key}-title">{escape(one.title)}</{level}>\n{inner}\n</section>'
    )


def _block(block: Block, pictures: Mapping[str, Sequence[Drawn]], anchors: frozenset[str]) -> str:
    if isinstance(block, Paragraph):
        return f"<p>{' '.join(_said(said, anchors) for said in block.sentences)}</p>"
    if isinstance(block, Listing):
        items = "".join(f"<li>{_said(said, anchors)}</li>" for said in block.items)
        return f"<ul>{items}</ul>"
    if isinstance(block, Heading):
        return f"<h4>{escape(block.text)}</h4>"
    if isinstance(block, Equation):
        return f'<p class="equation">{escape(block.text)}</p>'
    if isinstance(block, Picture):
        return "\n".join(_picture(one) for one in pictures.get(block.name, ()))
    return _table(block)


def _said(said: Said, anchors: frozenset[str]) -> str:
    """A sentence with the numbers of what it rests on."""
    text = escape(said.text)
    if not said.rests_on:
        return text
    numbers = ", ".join(
        f'<a href="#{escape(one)}">{escape(one)}</a>' if one in anchors else escape(one)
        for one in said.rests_on
    )
    return f'{text} <span class="ref">[{numbers}]</span>'


def _picture(one: Drawn) -> str:
    """A picture in the page itself, with its text alternative."""
    # In the page itself, so that its text has the colour of the page's, on light and on dark.
    # It names itself to a screen reader.
    svg = one.svg.decode()
    note = f" {escape(one.note)}" if one.note else ""
    return (
        f"<figure><figcaption><strong>{escape(one.title)}</strong>{note}</figcaption>\n"
        f'<div class="drawn">{svg}</div>'
        "</figure>"
    )


def _table(grid: Grid) -> str:
    """A table that can be scrolled by keyboard where it is wider than the screen."""
    head = "".join(
        f'<th scope="col"{_class(column.align, "")}>{escape(column.head)}</th>' for column in grid.columns
    )
    rows = []
    keyed = grid.columns[0].head in ("Ruling", "Check")
    for place, first in enumerate(grid.columns[0].cells):
        cells = [f'<th scope="row"{_class(grid.columns[0].align, first)}>{escape(first)}</th>']
        for column in grid.columns[1:]:
            cell = column.cells[place]
            kind = _kind(column.align, cell)
            cells.append(f"<td{f' class={chr(34)}{kind}{chr(34)}' if kind else ''}>{escape(cell)}</td>")
        anchor = f' id="{escape(first)}"' if keyed else ""
        rows.append(f"<tr{anchor}>{''.join(cells)}</tr>")
    note = f'<p class="note">{escape(grid.note)}</p>' if grid.note else ""
    label = escape(grid.caption, quote=True)
    return (
        f'<div class="wide" role="region" tabindex="0" aria-label="{label}"><table>'
        f"<caption>{escape(grid.caption)}</caption><thead><tr>{head}</tr></thead>"
        f"<tbody>{''.join(rows)}</tbody></table></div>{note}"
    )


def _kind(align: str, cell: str) -> str:
    if align == "right":
        return "right"
    return "text" if len(cell) > LONG_CELL else ""


def _class(align: str, cell: str) -> str:
    kind = _kind(align, cell)
    return f' class="{kind}"' if kind else ""
