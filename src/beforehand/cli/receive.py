"""``beforehand receive``: a bundle from someone else, checked and unpacked."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, ShowProgress
from beforehand.cli.progress import Progress
from beforehand.faults import EXIT_DIFFERS


def receive(
    bundle: Annotated[
        Path, typer.Argument(metavar="BUNDLE", help="The bundle, a zip file.", show_default=False)
    ],
    folder: Annotated[
        Path,
        typer.Option(
            "-d",
            "--folder",
            metavar="FOLDER",
            help="Unpack into this folder; nothing in it is overwritten.",
            show_default=False,
        ),
    ],
    data: Annotated[
        Path | None,
        typer.Option("--data", metavar="TABLE", help="Compute the lockfile again on this table of yours."),
    ] = None,
    columns: Annotated[
        Path | None,
        typer.Option(
            "--columns",
            metavar="FILE",
            help="A YAML mapping of the plan's column names to those of your table.",
        ),
    ] = None,
    as_json: AsJson = False,
    progress: ShowProgress = False,
) -> None:
    """Check a bundle, unpack it, and compute its lockfile again.

    Every name, size and checksum is checked before anything is written; a bundle with a fault leaves
    nothing behind. Then the plan is read, the seals and looks are followed link by link, and where a
    table is at hand the record is computed again. Ends with 0 when nothing differs and with 3 when
    something does.
    """
    from beforehand import api

    with Progress(f"receiving {bundle.name}", plain=progress) as told:
        done = api.receive(bundle, folder, data=data, columns=columns, progress=told)
    if as_json:
        from beforehand.cli.machine import json_text
        from beforehand.cli.results import received_result

        terminal.document(json_text(received_result(done)))
    else:
        from beforehand.screen.handover import received_text

        terminal.say(received_text(done, width=terminal.width(), colour=terminal.colour()))
    if done.replay is not None and done.replay.differences:
        raise typer.Exit(EXIT_DIFFERS)
