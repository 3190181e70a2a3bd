"""``beforehand refresh``: whether the answer still holds on refreshed data."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, PlanFile, ShowProgress
from beforehand.cli.progress import Progress
from beforehand.cli.targets import refuse_to_replace, require_folder
from beforehand.faults import EXIT_DIFFERS


def refresh(
    plan: PlanFile,
    data: Annotated[
        Path, typer.Option("--data", metavar="NEW", help="The refreshed table.", show_default=False)
    ],
    against: Annotated[
        Path | None,
        typer.Option(
            "--against",
            metavar="OLD",
            help="The lockfile of the run before. Without it: NAME.lock.yaml beside the plan.",
        ),
    ] = None,
    old: Annotated[
        Path | None,
        typer.Option(
            "--old",
            metavar="FILE",
            help="The table of that lockfile, if it is not the one that the plan names.",
        ),
    ] = None,
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="LOCK",
            help="Write the new lockfile here. Without it: NAME.refreshed.lock.yaml beside the plan.",
        ),
    ] = None,
    as_json: AsJson = False,
    progress: ShowProgress = False,
) -> None:
    """Run a plan on refreshed data and say whether the answer holds.

    Writes the new lockfile and NAME.refresh.yaml: which rows are new, gone or revised, what has
    drifted, which rulings fell otherwise, and what moved each coefficient. Ends with 0 when the
    answer holds and with 3 when it moved or broke.
    """
    from beforehand import api
    from beforehand.lock.files import write_whole
    from beforehand.refreshing import as_mapping, refresh_text
    from beforehand.sealing import beside

    record, lock = beside(plan, ".refresh.yaml"), output or beside(plan, ".refreshed.lock.yaml")
    for path in (record, lock):
        require_folder(path)
    refuse_to_replace(lock, "\nlock: ", "a lockfile")
    refuse_to_replace(record, "\nrefresh: ", "a refresh record")
    with Progress(f"refreshing {plan.name}", plain=progress) as told:
        found = api.refresh(plan, data, against=against, old_data=old, progress=told)
        told("writing the record")
        if found.lock is not None:
            api.write_lock(found.lock, lock)
        write_whole(record, refresh_text(found).encode())
    if as_json:
        from beforehand.cli.machine import json_text

        terminal.document(json_text(as_mapping(found)))
    else:
        from beforehand.screen.refresh import refreshed_text

        terminal.say(
            refreshed_text(found, str(record), str(lock), width=terminal.width(), colour=terminal.colour())
        )
    if found.verdict != "holds":
        raise typer.Exit(EXIT_DIFFERS)
