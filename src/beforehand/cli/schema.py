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


def schema(
    what: Annotated[
        Described,
        typer.Argument(metavar="plan|lock", help="Which of the two file kinds.", show_default=False),
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
    """Print the JSON Schema of plans or of lockfiles.

    An editor that knows it completes the keys of a plan and checks them as they are typed.
    """
    from beforehand.cli.machine import json_text

    if what is Described.plan:
        from beforehand.plan import plan_schema as described
    else:
        from beforehand.lock import lock_schema as described
    text = json_text(described())
    if output is None:
        terminal.document(text)
        return
    from beforehand.lock.files import write_whole

    refuse_to_replace(output, '"$schema"', "a JSON Schema")
    write_whole(output, text.encode("utf-8"))
    terminal.note(f"{output} written")
