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

    read = api.read_lock(lock)
    story = api.trace(read, subject)
    if as_json:
        from beforehand.cli.machine import json_text

        terminal.document(json_text(story))
        return
    from beforehand.rehearsing.reading import rehearsal_beside
    from beforehand.screen.quoted import quoted_of
    from beforehand.screen.story import story_text

    beside = [] if read.scrambled is None else [read.scrambled.says]
    rehearsal = rehearsal_beside(read, lock.with_name(read.plan.file))
    if rehearsal is not None and story.kind != "row":
        beside += quoted_of(rehearsal, story.subject)
    terminal.say(story_text(story, beside=beside, width=terminal.width(), colour=terminal.colour()))
