"""``beforehand seal``: fix a plan before its results are seen."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, PlanFile


def seal(
    plan: PlanFile,
    by: Annotated[str, typer.Option("--by", metavar="WHO", help="Who seals the plan.", show_default=False)],
    seen: Annotated[
        str,
        typer.Option(
            "--seen",
            metavar="WHAT",
            help="What has been seen of the data: nothing, predictors or everything.",
            show_default=False,
        ),
    ],
    amend: Annotated[
        str | None,
        typer.Option("--amend", metavar="WHY", help="Seal a changed plan as an amendment, with the reason."),
    ] = None,
    kind: Annotated[
        str | None,
        typer.Option(
            "--kind",
            metavar="KIND",
            help="Of an amendment: unforeseen, mistake, gap or assumption_failed.",
        ),
    ] = None,
    expected_effect: Annotated[
        str | None,
        typer.Option(
            "--expected-effect", metavar="TEXT", help="What the amendment is expected to do to the answer."
        ),
    ] = None,
    data: Annotated[
        Path | None,
        typer.Option("--data", metavar="FILE", help="The table, if it is not the one that the plan names."),
    ] = None,
    as_json: AsJson = False,
) -> None:
    """Seal a plan: fix it, and be able to show that it came first.

    A seal is appended to NAME.seal.yaml: the plan's digests and the plan itself, the time, who, what
    had been seen, and the digest of the seal before. A changed plan is sealed again with --amend;
    from then on a run shows the answer of the first seal beside the amended one.
    """
    from beforehand import api
    from beforehand.sealing import seal_path

    found, new = api.seal(
        plan, by=by, seen=seen, data=data, amend=amend, kind=kind, expected_effect=expected_effect
    )
    where = str(seal_path(plan))
    if as_json:
        from beforehand.cli.machine import json_text
        from beforehand.cli.results import seal_result

        terminal.document(json_text(seal_result(found, where, new)))
        return
    from beforehand.screen.seals import seal_text

    terminal.say(
        seal_text(found, where, str(plan), new=new, width=terminal.width(), colour=terminal.colour())
    )
