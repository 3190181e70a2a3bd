"""``beforehand run``: follow a plan, leave the record, print the answer."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.names import lock_beside
from beforehand.cli.options import AsJson, DataFile, PlanFile, ShowProgress
from beforehand.cli.progress import Progress
from beforehand.cli.targets import refuse_to_replace, require_folder


def run(
    plan: PlanFile,
    data: DataFile = None,
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="LOCK",
            help="Write the lockfile here. Without it: NAME.lock.yaml beside the plan.",
            show_default=False,
        ),
    ] = None,
    as_json: AsJson = False,
    quiet: Annotated[
        bool,
        typer.Option("--quiet", "-q", help="Write the lockfile and print nothing.", show_default=False),
    ] = False,
    progress: ShowProgress = False,
) -> None:
    """Run a plan, write the lockfile, print the answer.

    Every rule acts in its order, one change at a time. The lockfile holds every fit and every
    ruling; it is written whole or not at all. The answer is printed on one screen.
    """
    from beforehand import api

    if output == Path("-"):
        raise typer.BadParameter("the record needs a file; standard output gets the answer", param_hint="-o")
    record = output or lock_beside(plan)
    require_folder(record)
    refuse_to_replace(record, "\nlock: ", "a lockfile")
    with Progress(f"running {plan.name}", plain=progress, quiet=quiet) as told:
        done = api.run(plan, data, progress=told)
        lock = done.lock
        told("writing the record")
        api.write_lock(lock, record)
    if quiet:
        return
    from beforehand.rehearsing.reading import rehearsal_beside

    rehearsal = rehearsal_beside(lock, plan)
    if as_json:
        from beforehand.cli.machine import json_text
        from beforehand.cli.results import run_result
        from beforehand.screen.planned import planned
        from beforehand.screen.quoted import quoted

        rehearsed = () if rehearsal is None else quoted(rehearsal, selects=planned(lock).selects)
        terminal.document(json_text(run_result(lock, str(record), done.looks, rehearsed)))
        return
    from beforehand.screen.answer import answer_text

    terminal.say(
        answer_text(
            lock, str(record), looks=done.looks, rehearsal=rehearsal, width=terminal.width(),
            colour=terminal.colour(),
        )
    )  # fmt: skip
