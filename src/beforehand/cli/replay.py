"""``beforehand replay``: whether a record comes out the same again."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, DataFile, LockFile, ShowProgress
from beforehand.cli.progress import Progress
from beforehand.faults import EXIT_DIFFERS


def replay(
    lock: LockFile,
    plan: Annotated[
        Path | None,
        typer.Option("--plan", metavar="FILE", help="Use this plan and not the one that the record carries."),
    ] = None,
    data: DataFile = None,
    as_json: AsJson = False,
    progress: ShowProgress = False,
) -> None:
    """Compute a record again and say what differs.

    A lockfile, or the record of a rehearsal. Bytes are compared first, then every number and
    ruling; each difference is told with its place. Ends with 0 when nothing differs and with 3
    when something does.
    """
    from beforehand import api

    with Progress(f"replaying {lock.name}", plain=progress) as told:
        again = api.replay(lock, plan, data, progress=told)
    if as_json:
        from beforehand.cli.machine import json_text
        from beforehand.cli.results import replay_result

        terminal.document(json_text(replay_result(again)))
    else:
        from beforehand.screen.replay import replay_text

        terminal.say(replay_text(again, str(lock), width=terminal.width(), colour=terminal.colour()))
    if again.differences:
        raise typer.Exit(EXIT_DIFFERS)
