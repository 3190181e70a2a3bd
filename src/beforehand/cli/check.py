"""``beforehand check``: whether a plan can be run, and what should be known before it is."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, DataFile
from beforehand.faults import Fault, InputError


def check(
    plans: Annotated[
        list[Path],
        typer.Argument(
            metavar="PLAN", help="The plan, a NAME.plan.yaml; there may be several.", show_default=False
        ),
    ],
    data: DataFile = None,
    full: Annotated[
        bool,
        typer.Option("--full", help="Print the plan with every default written out.", show_default=False),
    ] = False,
    as_json: AsJson = False,
) -> None:
    """Check a plan, and its table against it.

    Faults are listed all at once, one a line, with their place. Without a fault follow decisions
    left open, rules that never act, and what the size of the table allows. The values of the
    outcome are not used.
    """
    if len(plans) > 1 and (full or as_json):
        option = "--full" if full else "--json"
        raise InputError(
            [Fault(file=option, line=None, place="", what="is for one plan at a time", code="one_plan")]
        )
    faults: list[Fault] = []
    for plan in plans:
        try:
            _check(plan, data, full=full, as_json=as_json)
        except InputError as error:
            # The faults of one plan do not hide those of the next.
            faults += error.faults
    if faults:
        raise InputError(faults)


def _check(plan: Path, data: Path | None, *, full: bool, as_json: bool) -> None:
    """Check one plan and print what there is to know."""
    from beforehand import api

    if full and not as_json:
        from beforehand.plan import canonical_text

        terminal.document(canonical_text(api.read_plan(plan)))
    reviewed = api.check(plan, data)
    if as_json:
        from beforehand.cli.machine import json_text
        from beforehand.cli.results import check_result

        terminal.document(json_text(check_result(reviewed, api.read_plan(plan) if full else None)))
    elif not full:
        from beforehand.screen.review import review_text

        terminal.say(review_text(reviewed, plan.name, width=terminal.width(), colour=terminal.colour()))
