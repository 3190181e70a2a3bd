"""``beforehand guide``: short pages about the plan, the rules and the record."""

from __future__ import annotations

from typing import Annotated

import typer

from beforehand.cli import terminal


def guide(
    name: Annotated[
        str | None,
        typer.Argument(metavar="PAGE", help="A page; without it, the list of pages.", show_default=False),
    ] = None,
) -> None:
    """Explain the plan block by block, the rules, the record.

    Without a page it lists them all. The name of any block of a plan is a page.
    """
    from beforehand.guide import page, pages
    from beforehand.screen.guide import page_list_text, page_text

    if name is None:
        terminal.say(page_list_text(pages(), width=terminal.width(), colour=terminal.colour()))
    else:
        terminal.say(page_text(page(name), width=terminal.width(), colour=terminal.colour()))
