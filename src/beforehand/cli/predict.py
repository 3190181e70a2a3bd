"""``beforehand predict``: what the answer says of new cases."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, LockFile
from beforehand.cli.targets import refuse_to_replace, require_folder


def predict(
    lock: LockFile,
    data: Annotated[
        Path,
        typer.Argument(metavar="NEW", help="A table of new cases, without an outcome.", show_default=False),
    ],
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            help="Write the predictions here, as CSV. Without it: to standard output.",
        ),
    ] = None,
    as_json: AsJson = False,
) -> None:
    """Predict new cases by the answer in a lockfile.

    For each case the mean of its like, an interval for that mean and one for a single case, at the
    plan's level and in units of the outcome. Where a case is not one of those that the fit has seen,
    the last column says why.
    """
    from beforehand import api
    from beforehand.lock.files import write_whole
    from beforehand.predicting import COLUMNS, as_mapping, csv_text

    if output is not None:
        require_folder(output)
        refuse_to_replace(output, f",{','.join(COLUMNS)}\n", "a table of predictions")
    found = api.predict(lock, data)
    if output is not None:
        write_whole(output, csv_text(found).encode())
    if as_json:
        from beforehand.cli.machine import json_text

        terminal.document(json_text(as_mapping(found)))
    elif output is None:
        terminal.document(csv_text(found))
        for caution in found.cautions:
            terminal.note(caution)
    else:
        from beforehand.screen.predictions import predictions_text

        terminal.say(predictions_text(found, str(output), width=terminal.width(), colour=terminal.colour()))
