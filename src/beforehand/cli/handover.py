"""``beforehand handover``: a plan and its record, packed for someone else."""

from __future__ import annotations

from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, DataFile, PlanFile


class Labels(StrEnum):
    """How row labels stand in a table that goes along."""

    hashed = "hashed"
    shown = "shown"


def handover(
    plan: PlanFile,
    output: Annotated[
        Path,
        typer.Option("-o", "--output", metavar="BUNDLE", help="Write the bundle here.", show_default=False),
    ],
    with_data: Annotated[
        bool,
        typer.Option(
            "--with-data", help="Pack the columns that the plan names, all rows.", show_default=False
        ),
    ] = False,
    labels: Annotated[
        Labels,
        typer.Option(
            "--labels",
            metavar="hashed|shown",
            help="How row labels stand in that table: as keyed hashes, unless they are to be shown.",
            show_default=False,
        ),
    ] = Labels.hashed,
    share_safe: Annotated[
        bool,
        typer.Option(
            "--share-safe",
            help="Pack, instead of the lockfile, a copy that gives no row away.",
            show_default=False,
        ),
    ] = False,
    data: DataFile = None,
    as_json: AsJson = False,
) -> None:
    """Pack a plan and its record, to be checked by someone else.

    The bundle is a zip file: the plan, its seals and looks, its lockfile, rehearsals, refreshes and
    reports as far as they stand beside it, the schemas, a data dictionary without rows, and a manifest
    with a checksum of each. The key of row labels never goes along.
    """
    from beforehand import api
    from beforehand.screen.handover import handover_text

    done = api.handover(
        plan, output, data=data, with_data=with_data, labels=labels.value, share_safe=share_safe
    )
    if as_json:
        from beforehand.cli.machine import json_text
        from beforehand.cli.results import handover_result

        terminal.document(json_text(handover_result(done)))
    else:
        terminal.say(handover_text(done, width=terminal.width(), colour=terminal.colour()))
