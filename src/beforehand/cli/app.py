"""The program as a group of commands: one module a command, one line here."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli.check import check
from beforehand.cli.compare import compare
from beforehand.cli.draft import draft
from beforehand.cli.guard import TRACEBACK_VARIABLE, Guarded, Plain
from beforehand.cli.guide import guide
from beforehand.cli.handover import handover
from beforehand.cli.predict import predict
from beforehand.cli.receive import receive
from beforehand.cli.refresh import refresh
from beforehand.cli.rehearse import rehearse
from beforehand.cli.replay import replay
from beforehand.cli.report import report
from beforehand.cli.run import run
from beforehand.cli.schema import schema
from beforehand.cli.seal import seal
from beforehand.cli.trace import trace

app = typer.Typer(
    name="beforehand",
    cls=Guarded,
    add_completion=False,
    no_args_is_help=True,
    # Plain help: it can be read in a pipe, in a log and by a screen reader, and costs no import.
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
    epilog="Exit codes: 0 done, 2 unusable input, 3 it comes out differently.",
)

COMMANDS = (
    draft, check, rehearse, seal, run, replay, trace, report, predict, compare, refresh, handover, receive,
    schema, guide,
)  # fmt: skip

for command in COMMANDS:
    app.command(cls=Plain)(command)


def _show_version(wanted: bool) -> None:
    """Print the version and leave."""
    if wanted:
        from beforehand.version import __version__

        typer.echo(f"beforehand {__version__}")
        raise typer.Exit


@app.callback()
def beforehand(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_show_version, is_eager=True, help="Print the version and leave."),
    ] = False,
    report_bug: Annotated[
        Path | None,
        typer.Option(
            "--report-bug",
            metavar="FILE",
            help="Where the program itself fails, write the traceback to FILE. "
            f"{TRACEBACK_VARIABLE}=1 in the environment shows it at once.",
        ),
    ] = None,
) -> None:
    """Write every decision of a multiple regression as a rule, then run it.

    A plan holds the decisions, written before the results are seen. A run follows it and leaves a
    lockfile: every fit and every ruling, on the record, to be traced and replayed.
    """
