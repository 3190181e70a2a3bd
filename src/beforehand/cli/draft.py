"""``beforehand draft``: a commented plan from a table."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.names import plan_beside
from beforehand.faults import WriteError

STANDARD_OUTPUT = Path("-")


def draft(
    table: Annotated[
        Path, typer.Argument(metavar="TABLE", help="The table, one row a line.", show_default=False)
    ],
    outcome: Annotated[
        str,
        typer.Option("--outcome", metavar="COL", help="Column of the outcome.", show_default=False),
    ],
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            help="Write the plan here; - is standard output. Without it: NAME.plan.yaml beside the table.",
            show_default=False,
        ),
    ] = None,
    separator: Annotated[
        str | None,
        typer.Option(
            "--separator",
            metavar="SIGN",
            help="What stands between two fields. Without it, it is seen from the first lines.",
            show_default=False,
        ),
    ] = None,
    force: Annotated[
        bool, typer.Option("--force", help="Overwrite a plan that is there already.", show_default=False)
    ] = False,
) -> None:
    """Draft a plan for a table.

    Every rule stands in it with its default and a comment. Kinds and ranges are read off the
    predictors. The values of the outcome are not looked at.
    """
    from beforehand import api

    plan = output or plan_beside(table)
    if plan != STANDARD_OUTPUT:
        _refuse(plan, table, force)
    text = api.draft(table, outcome, separator=separator)
    if plan == STANDARD_OUTPUT:
        terminal.document(text)
        return
    from beforehand.lock.files import write_whole

    write_whole(plan, text.encode("utf-8"))
    terminal.note(f"{plan} written; read it from the top, then: beforehand check {plan}")


def _refuse(plan: Path, table: Path, force: bool) -> None:
    """Keep what is there: a plan unless it is given up by --force, the table in any case."""
    if plan.exists() and table.exists() and plan.samefile(table):
        raise WriteError(f"{plan}: is the table itself and is left as it is; name another file")
    if plan.exists() and not force:
        raise WriteError(f"{plan}: exists already and is left as it is; --force overwrites it")
