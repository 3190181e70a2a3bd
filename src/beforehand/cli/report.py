"""``beforehand report``: the write-up of a lock."""

from __future__ import annotations

from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import LockFile, ShowProgress
from beforehand.cli.progress import Progress
from beforehand.cli.targets import refuse_to_replace, require_folder


class Form(StrEnum):
    """A form of the report."""

    html = "html"
    docx = "docx"
    md = "md"


# What stands near the start of a report that the program wrote, by its form.
SIGNS = {
    Form.html: '<meta name="generator" content="beforehand">',
    Form.docx: "beforehand</dc:creator>",
    Form.md: "<!-- Written by beforehand. -->",
}


def report(
    lock: LockFile,
    to: Annotated[
        list[Form] | None,
        typer.Option(
            "--to",
            metavar="FORM",
            help="html, a page that needs nothing else; docx, a Word document; md, Markdown. May be given "
            "several times. Without it: html.",
            show_default=False,
        ),
    ] = None,
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            help="Write it here. Without it: NAME.report.html, .docx or .md beside the lockfile.",
            show_default=False,
        ),
    ] = None,
    progress: ShowProgress = False,
) -> None:
    """Write the report of a lockfile, the key finding first.

    Straight from the lock and the records that stand beside it, with nothing typed again. Every
    sentence names the ruling, fit or check that it rests on.
    """
    from beforehand.reporting.writing import report as write_report
    from beforehand.reporting.writing import report_path

    forms = tuple(dict.fromkeys(to or [Form.html]))
    if output is not None and len(forms) > 1:
        raise typer.BadParameter("takes one form; several are written beside the lockfile", param_hint="-o")
    for form in forms:
        target = output or report_path(lock, form.value)
        require_folder(target)
        refuse_to_replace(target, SIGNS[form], "a report")
    with Progress(f"reporting {lock.name}", plain=progress) as told:
        written = write_report(lock, [form.value for form in forms], output=output, progress=told)
    for path in written:
        terminal.say(f"{path}\n")
