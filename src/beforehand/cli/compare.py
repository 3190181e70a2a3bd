"""``beforehand compare``: what a change of a plan, or of a record, amounts to."""

from __future__ import annotations

from enum import StrEnum
from typing import TYPE_CHECKING, Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import DataFile, ShowProgress
from beforehand.cli.progress import Progress
from beforehand.faults import EXIT_DIFFERS

if TYPE_CHECKING:
    from beforehand.comparing import Comparison

SIDE = "A plan or a lockfile; REVISION:path reads it from git."


class Form(StrEnum):
    """How a comparison is printed."""

    text = "text"
    markdown = "markdown"
    json = "json"


class Failing(StrEnum):
    """Grades of change that can end the command with 3."""

    looser = "looser"
    stricter = "stricter"
    different = "different"


def compare(
    old: Annotated[str, typer.Argument(metavar="OLD", help=SIDE, show_default=False)],
    new: Annotated[
        str | None,
        typer.Argument(metavar="NEW", help="The same; without it OLD is printed with every default."),
    ] = None,
    data: DataFile = None,
    form: Annotated[
        Form, typer.Option("--as", help="Text for a terminal, Markdown for a comment, JSON for programs.")
    ] = Form.text,
    fail_on: Annotated[
        list[Failing] | None,
        typer.Option(
            "--fail-on",
            metavar="looser|stricter|different",
            help="End with 3 only for a change of this grade; may be given several times.",
        ),
    ] = None,
    progress: ShowProgress = False,
) -> None:
    """Say what changed between two plans or two lockfiles.

    A change of a plan leans one way: looser, stricter, different or wording. Defaults, comments and the
    order of keys are no change. With --data the two plans are run, and their records are compared
    too; each run counts as a look. Ends with 0 when nothing differs and with 3 when something does.
    """
    from beforehand import api

    if new is None:
        from beforehand.comparing.sides import read_side, written

        terminal.document(written(read_side(old)))
        return
    with Progress(f"comparing {new}", plain=progress) as told:
        compared = api.compare(old, new, data, progress=told)
    _print(compared, form)
    if compared.fails(fail_on or ()):
        raise typer.Exit(EXIT_DIFFERS)


def _print(compared: Comparison, form: Form) -> None:
    """Print a comparison in one of its forms."""
    if form is Form.text:
        from beforehand.screen.comparison import comparison_text

        terminal.say(comparison_text(compared, width=terminal.width(), colour=terminal.colour()))
        return
    from beforehand.comparing.forms import mapping, markdown

    if form is Form.markdown:
        terminal.document(markdown(compared))
        return
    from beforehand.cli.machine import json_text

    terminal.document(json_text(mapping(compared)))
