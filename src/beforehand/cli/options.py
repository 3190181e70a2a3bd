"""Options that several commands share, so that they read the same everywhere."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

PlanFile = Annotated[
    Path, typer.Argument(metavar="PLAN", help="The plan, a NAME.plan.yaml.", show_default=False)
]
LockFile = Annotated[
    Path, typer.Argument(metavar="LOCK", help="The lockfile, a NAME.lock.yaml.", show_default=False)
]
DataFile = Annotated[
    Path | None,
    typer.Option("--data", metavar="FILE", help="Read this table and not the one that the plan names."),
]
AsJson = Annotated[
    bool, typer.Option("--json", help="Print the result as JSON, for programs.", show_default=False)
]
ShowProgress = Annotated[
    bool,
    typer.Option(
        "--progress",
        help="Write every stage as a line to standard error, also without a terminal.",
        show_default=False,
    ),
]
