"""``beforehand trace``: the story of one predictor or one row."""

from __future__ import annotations

from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, LockFile


def trace(
    lock: LockFile,
    subject: Annotated[
        str,
        typer.Argument(
            metavar="SUBJECT",
            help="A predictor, or the label of a row. row:LABEL is a row that is named like a predictor.",
            show_default=False,
        ),
    ],
    as_json: AsJson = False,
) -> None:
    """Tell the story of one predictor or one row.

    Ruling by ruling, with the fits in which it stood, from the lockfile alone: the table is not
    needed.
    """
    from beforehand import api

    story = api.trace(api.read_lock(lock), subject)
    if as_json:
        from beforehand.cli.machine import json_text

        terminal.document(json_text(story))
        return
    from beforehand.screen.story import story_text

    terminal.say(story_text(story, width=terminal.width(), colour=terminal.colour()))
