"""``beforehand schema``: the JSON Schemas, for editors and other programs."""

from __future__ import annotations

from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.targets import refuse_to_replace


class Described(StrEnum):
    """What there is a schema of."""

    plan = "plan"
    lock = "lock"
    rehearsal = "rehearsal"


def schema(
    what: Annotated[
        Described,
        typer.Argument(metavar="plan|lock|rehearsal", help="Which kind of file.", show_default=False),
    ],
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            help="Write it to FILE and not to standard output.",
            show_default=False,
        ),
    ] = None,
) -> None:
    """Print the JSON Schema of plans, of lockfiles or of rehearsals.

    An editor that knows it completes the keys of a plan and checks them as they are typed.
    """
    from beforehand.cli.machine import json_text

    if what is Described.plan:
        from beforehand.plan import plan_schema as described
    elif what is Described.lock:
        from beforehand.lock import lock_schema as described
    else:
        from beforehand.rehearsing.text import rehearsal_schema as described
    text = json_text(described())
    if output is None:
        terminal.document(text)
        return
    from beforehand.lock.files import write_whole

    refuse_to_replace(output, '"$schema"', "a JSON Schema")
    write_whole(output, text.encode("utf-8"))
    terminal.note(f"{output} written")
